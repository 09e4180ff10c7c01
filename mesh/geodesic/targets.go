package geodesic

import (
	"math"

	"heatskin/mesh"
)

// targets are the places a wave is asked to reach.
type targets struct {
	list  []target
	faces map[int32][]int32 // targets that are points, by triangle
	edges map[int32][]int32 // targets that are edges, by halfedge
	stop  float64           // the wave may end when it has come so far; never too small
	pause int               // turns until stop is found anew
}

type target struct {
	place
	hits []hit // nearest first is not promised; all within equally of the best
	best float64
}

// A hit is a window's straight way to a target.
type hit struct {
	distance float64
	h        int32   // halfedge through which it comes into the target's triangle
	window   window  // on h
	x, y     float64 // the target in the layout from h
	leaves   bool    // the target lies on the edge of h, and the window leaves h's triangle there
}

// equally is how much longer (relative) a line may be and count as equally short.
const equally = 1e-9

// aim takes in the targets.
func (v *wave) aim(data []mesh.Datum) error {
	t := &v.targets
	t.stop = math.Inf(1)
	for i, d := range data {
		place, err := v.place(d)
		if err != nil {
			return err
		}
		t.list = append(t.list, target{place: place, best: math.Inf(1)})
		if place.triangle >= 0 {
			if t.faces == nil {
				t.faces = map[int32][]int32{}
			}
			t.faces[place.triangle] = append(t.faces[place.triangle], int32(i))
		}
		for _, h := range place.edges {
			if t.edges == nil {
				t.edges = map[int32][]int32{}
			}
			for p := h; ; {
				t.edges[p] = append(t.edges[p], int32(i))
				if p = v.glue[p]; p == h {
					break
				}
			}
		}
	}
	return nil
}

// done tells whether all that was asked for is known. Finding the distance of every
// target takes a while when there are many, so it is done once in as many turns.
func (v *wave) done() bool {
	t := &v.targets
	if len(t.list) == 0 {
		return false
	}
	if t.pause > 0 && v.now <= t.stop {
		t.pause--
		return false
	}
	t.pause = len(t.list)
	t.stop = 0
	if v.opt.Any {
		t.stop = math.Inf(1)
	}
	for i := range t.list {
		d := v.targetDistance(i)
		if v.opt.Any {
			t.stop = min(t.stop, d)
		} else {
			t.stop = max(t.stop, d)
		}
	}
	if v.lines {
		t.stop *= 1 + 2*equally // see those that are equally short
	}
	return v.now > t.stop
}

// targetDistance is the shortest way to target i so far.
func (v *wave) targetDistance(i int) float64 {
	t := &v.targets.list[i]
	switch {
	case t.vertex >= 0:
		return v.distance[t.vertex]
	case t.triangle >= 0:
		d := t.best
		for k := range int32(3) {
			d = min(d, v.distance[v.mesh.Triangles[3*t.triangle+k]]+v.toCorner(t.triangle, t.weights, k))
		}
		for _, p := range v.points[t.triangle] {
			d = min(d, v.apart(t.triangle, t.weights, p.Weights))
		}
		return d
	}
	d := t.best
	for _, h := range t.edges {
		d = min(d, v.distance[v.mesh.Triangles[h]], v.distance[v.mesh.Triangles[following(h)]])
	}
	return d
}

// toCorner is how far corner k of a triangle lies from a point of it.
func (s *Solver) toCorner(triangle int32, weights [3]float64, k int32) float64 {
	var corner [3]float64
	corner[k] = 1
	return s.apart(triangle, weights, corner)
}

// apart is how far two points of a triangle lie from each other.
func (s *Solver) apart(triangle int32, v, w [3]float64) float64 {
	var d [3]float64
	for k := range int32(3) {
		i := s.mesh.Triangles[3*triangle+k]
		for axis := range int32(3) {
			d[axis] += (v[k] - w[k]) * (s.mesh.Positions[3*i+axis] - s.mesh.Positions[3*s.mesh.Triangles[3*triangle]+axis])
		}
	}
	return math.Sqrt(d[0]*d[0] + d[1]*d[1] + d[2]*d[2])
}

func (v *wave) targetDistances(reach float64) []float64 {
	var d []float64
	for i := range v.targets.list {
		x := v.targetDistance(i)
		if x > reach {
			x = math.Inf(1)
		}
		d = append(d, x)
	}
	return d
}

// straight is the distance through w at (x, y) of the triangle of layout l, if w's
// rays go there.
func (w *window) straight(x, y, length float64) (float64, bool) {
	slack := slackShare * length
	foot, ok := w.hit(x, y)
	if !ok { // the rays run along the edge, or the place lies where they begin
		if y > slack {
			return 0, false
		}
		foot = x
	}
	return max(w.to(x, y), 0), foot >= w.b0-slack && foot <= w.b1+slack
}

// hitFace notes how near w, which comes in through h, brings the targets in the triangle.
func (v *wave) hitFace(h int32, l *layout, w *window) {
	for _, i := range v.targets.faces[h/3] {
		t := &v.targets.list[i]
		x, y := l.point(h, t.weights)
		if d, ok := w.straight(x, y, l.length); ok {
			v.note(t, hit{distance: d, h: h, window: *w, x: x, y: y})
		}
	}
}

// hitEdge notes how near w, which leaves through the gate, brings targets on it.
func (v *wave) hitEdge(g *gate, w *window) {
	for _, i := range v.targets.edges[g.h] {
		out := *w
		if v.mesh.Triangles[g.h] != g.tail {
			out = w.turned(g.length)
		}
		t := out.nearest()
		v.note(&v.targets.list[i], hit{distance: max(out.at(t), 0), h: g.h, window: out, x: t, leaves: true})
	}
}

// note keeps a hit if it is the best or, where lines are asked for, equally good.
func (v *wave) note(t *target, h hit) {
	if h.distance < t.best {
		t.best = h.distance
		if v.lines {
			kept := t.hits[:0]
			for _, old := range t.hits {
				if old.distance <= t.best*(1+equally) {
					kept = append(kept, old)
				}
			}
			t.hits = append(kept, h)
		}
	} else if v.lines && h.distance <= t.best*(1+equally) {
		t.hits = append(t.hits, h)
	}
}
