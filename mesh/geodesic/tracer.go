package geodesic

import "math"

// A tracer draws a line from its target back to the source.
type tracer struct {
	*wave
	total     float64 // length of the whole line
	eps       float64 // what counts as beside a place
	several   bool
	source    int       // the datum where it ended
	points    []float64 // from the target on
	triangles []int32   // that holds the stretch before each point; -1 at the first

	// Where descend has been: vertices, and halfedges by which the line enters a triangle.
	passed, entered map[int32]bool
}

const (
	// A vertex nearer to a straight line than this (of its length, but not less than an
	// ulp or so of the mesh), by way of which the distance is the same, is taken for a
	// point of the line; and a source nearer to the line's calculated end is taken for it.
	beside = 1e-9
	// maxForks bounds how often a line tries another way at a doubtful place.
	maxForks = 4096
)

// trace follows the line from its arrival; ok is false if it goes astray.
func (t *tracer) trace(a *arrival) (ok bool) {
	t.add(a.place, -1)
	switch {
	case a.hit != nil:
		vertex, ok := t.fromHit(a.hit)
		return ok && (vertex < 0 || t.fromVertex(vertex))
	case a.vertex >= 0:
		if a.triangle >= 0 {
			t.add(t.position(a.vertex), a.triangle)
		}
		return t.fromVertex(a.vertex)
	}
	t.add(a.source, a.triangle)
	t.source = int(a.datum)
	return true
}

// fromVertex follows the line from a vertex, from bend to bend.
func (t *tracer) fromVertex(vertex int32) bool {
	for range 2 * len(t.parents) { // more vertices than that are a circle
		p := &t.parents[vertex]
		t.several = t.several || p.several
		switch {
		case p.h >= 0:
			l := t.lay(p.h)
			next, ok := t.fromHit(&hit{h: p.h, window: p.window, x: l.x, y: l.y})
			if !ok {
				return false
			}
			if next < 0 {
				return true
			}
			vertex = next
		case p.from >= 0:
			t.add(t.position(p.from), t.along(vertex, p.from))
			vertex = p.from
		case p.from <= firstPoint:
			source := &t.pointList[firstPoint-p.from]
			t.add(t.mesh.Position(source.Point), source.Triangle)
			t.source = int(source.datum)
			return true
		default:
			t.source = int(t.sourceVertices[vertex])
			return true
		}
	}
	return false
}

// along is a triangle with the edge from a to b.
func (s *Solver) along(a, b int32) int32 {
	for _, out := range s.corners(a) {
		if s.mesh.Triangles[following(out)] == b || s.mesh.Triangles[preceding(out)] == b {
			return out / 3
		}
	}
	return -1
}

// A sight is a place in the course of a straight line: it stands on halfedge h at t and
// looks into h's triangle towards the point (x, y) in its layout.
type sight struct {
	h      int32
	t      float64
	x, y   float64
	points int // how many points the line has here
	side   int // take this edge whatever the apex says: -1 the one at A, 1 the one at B
}

// fromHit follows the straight line of a hit to where its rays come from: a vertex, or
// a source that is none (vertex is -1).
func (t *tracer) fromHit(h *hit) (vertex int32, ok bool) {
	w := h.window
	x, y := w.x, -w.y // the point the rays come from
	far := w.far
	if h.leaves {
		y = w.y
	}
	if w.flags&parallel != 0 {
		// The foot of this ray on the source edge.
		d := w.to(h.x, h.y)
		if h.leaves {
			d = w.at(h.x)
		}
		gy := w.y
		if h.leaves {
			gy = -gy
		}
		x, y, far = h.x-d*w.x, h.y-d*gy, 0
	}
	l := t.lay(h.h)
	var open []sight
	if h.leaves {
		open = append(open, sight{h: h.h, t: h.x, x: x, y: max(y, 0), points: len(t.triangles)})
	} else {
		y = min(y, 0)
		foot := h.x
		if dy := h.y - y; dy > 0 {
			foot = x + (h.x-x)*(-y/dy)
		}
		foot = min(max(foot, 0), l.length)
		t.add(t.inSpace(&l, foot, 0), h.h/3)
		if v, ok := t.endOnEdge(h.h, foot, l.length, math.Hypot(foot-x, y), far); ok {
			return v, true
		}
		open = t.across(open, h.h, l.a, l.length, foot, x, -y)
	}
	for forks := 0; len(open) > 0 && forks < maxForks; forks++ {
		s := open[len(open)-1]
		open = open[:len(open)-1]
		t.points, t.triangles = t.points[:3*s.points], t.triangles[:s.points]
		for steps := 0; ; steps++ {
			end, vertex, more := t.step(&s, far, &open)
			if end {
				return vertex, true
			}
			if !more || steps > 3*len(t.mesh.Triangles) {
				break
			}
		}
	}
	return -1, false
}

// across opens the sights from a place at u (counted from vertex tail) on halfedge h
// into the triangles on its other side, towards (x, y) counted alike.
func (t *tracer) across(open []sight, h, tail int32, length, u, x, y float64) []sight {
	for p := t.glue[h]; p != h; p = t.glue[p] {
		s := sight{h: p, t: u, x: x, y: max(y, 0), points: len(t.triangles)}
		if t.mesh.Triangles[p] != tail {
			s.t, s.x = length-u, length-x
		}
		open = append(open, s)
	}
	return open
}

// step carries a sight across its triangle. It ends at a vertex or (vertex -1) at a
// source; more is false if it came to nothing. Doubtful choices are added to open.
func (t *tracer) step(s *sight, far float64, open *[]sight) (end bool, vertex int32, more bool) {
	l := t.lay(s.h)
	if l.degenerate {
		return false, -1, false
	}
	eps := t.eps
	dx, dy := s.x-s.t, s.y
	left := math.Hypot(dx, dy)
	toVertex := func(v int32) (bool, int32, bool) {
		t.add(t.position(v), s.h/3)
		return true, v, true
	}
	// At the apex, or past it so closely that the line may as well go through it?
	cx, cy := l.x-s.t, l.y
	reach := math.Hypot(cx, cy)
	if math.Abs(t.distance[l.c]+reach-far-left) <= 0.1*eps {
		if beyond := math.Hypot(l.x-s.x, l.y-s.y); beyond <= eps {
			return toVertex(l.c)
		}
		if left > 0 && math.Abs(dx*cy-dy*cx) <= eps*left && dx*cx+dy*cy > 0 && reach <= left {
			return toVertex(l.c)
		}
	}
	// In the triangle?
	outA := s.y*l.uax - s.x*l.uay
	outB := s.y*l.ubx - (l.length-s.x)*l.uby
	if outA <= eps && outB <= eps && far == 0 {
		if d, ok := t.sourceIn(s.h, &l, s.x, s.y, eps); ok {
			t.add(t.inSpace(&l, s.x, s.y), s.h/3)
			t.source = d
			return true, -1, true
		}
	}
	if left <= eps {
		return false, -1, false // arrived, but there is no source here
	}
	// On through AC or BC.
	turn := dx*cy - dy*cx // > 0: C lies to the left, the line goes out through BC
	side := s.side
	if side == 0 {
		side = -1
		if turn > 0 {
			side = 1
		}
		if math.Abs(turn) <= eps*left {
			other := *s
			other.side, other.points = -side, len(t.triangles)
			*open = append(*open, other)
		}
	}
	var u, length, x, y float64
	var h, tail int32
	if side < 0 {
		u, length, h, tail = edgeCross(s.t, dx, dy, l.uax, -l.uay, l.toA), l.toA, l.gateA, l.a
		x, y = s.x*l.uax+s.y*l.uay, outA
	} else {
		u, length, h, tail = edgeCross(l.length-s.t, dx, dy, l.ubx, l.uby, l.toB), l.toB, l.gateB, l.b
		x, y = (l.length-s.x)*l.ubx+s.y*l.uby, outB
	}
	if length == 0 || y < -eps {
		return false, -1, false
	}
	g := t.lay(h)
	across := u
	if g.a != tail {
		across = length - u
	}
	t.add(t.inSpace(&g, across, 0), s.h/3)
	if v, ok := t.endOnEdge(h, across, length, math.Hypot(u-x, y), far); ok {
		return true, v, true
	}
	// Where more than two triangles meet the line may have taken the wrong one. Then it
	// comes to places that are farther from the source than it believes.
	here := far + math.Hypot(u-x, y)
	head := l.c
	if d := min(t.distance[tail], t.total); here+u+eps < d {
		return false, -1, false
	}
	if d := min(t.distance[head], t.total); here+length-u+eps < d {
		return false, -1, false
	}
	before := len(*open)
	*open = t.across(*open, h, tail, length, u, x, y)
	if len(*open) == before {
		return false, -1, false
	}
	*s = (*open)[len(*open)-1]
	*open = (*open)[:len(*open)-1]
	return false, -1, true
}

// edgeCross is land for a ray in direction (p, q).
func edgeCross(arm, p, q, ux, uy, length float64) float64 {
	if arm <= 0 || q == 0 {
		return 0
	}
	if d := q*ux + p*uy; d > 0 {
		return min(arm*(q/d), length)
	}
	return length
}

// endOnEdge tells whether a line that stands on h at u with left still to go has
// arrived: at an end of h, or at a source on it.
func (t *tracer) endOnEdge(h int32, u, length, left, far float64) (vertex int32, ok bool) {
	eps := t.eps
	ends := [2]int32{t.mesh.Triangles[h], t.mesh.Triangles[following(h)]}
	for k, v := range ends {
		gap := u
		if k == 1 {
			gap = length - u
		}
		if gap <= eps && math.Abs(t.distance[v]+gap-far-left) <= 0.1*eps {
			t.add(t.position(v), h/3)
			return v, true
		}
	}
	if left > eps || far > 0 {
		return -1, false
	}
	for p := h; ; {
		l := t.lay(p)
		x := u
		if l.a != ends[0] {
			x = length - u
		}
		if d, ok := t.sourceIn(p, &l, x, 0, eps); ok {
			t.source = d
			return -1, true
		}
		if p = t.glue[p]; p == h {
			return -1, false
		}
	}
}

// sourceIn finds the source at (x, y) in the triangle of h, or on its edges.
func (t *tracer) sourceIn(h int32, l *layout, x, y, eps float64) (datum int, ok bool) {
	for _, p := range t.wave.points[h/3] {
		px, py := l.point(h, p.Weights)
		if math.Hypot(px-x, py-y) <= eps {
			return int(p.datum), true
		}
	}
	for _, e := range [3]struct {
		h   int32
		gap float64
	}{
		{h, y},
		{l.gateA, math.Abs(y*l.uax - x*l.uay)},
		{l.gateB, math.Abs(y*l.ubx - (l.length-x)*l.uby)},
	} {
		if d, found := t.sourceHalfedges[e.h]; found && e.gap <= eps {
			return int(d), true
		}
		// A source point on the edge may be given in the triangle across.
		for p := t.glue[e.h]; e.gap <= eps && p != e.h; p = t.glue[p] {
			for _, q := range t.wave.points[p/3] {
				if q.Weights[(p+2)%3] == 0 {
					return int(q.datum), true
				}
			}
		}
	}
	return 0, false
}

// add puts a point at the line's end, reached through a triangle.
func (t *tracer) add(p [3]float64, triangle int32) {
	t.points = append(t.points, p[:]...)
	t.triangles = append(t.triangles, triangle)
}

// line turns what was drawn round, source first, and leaves out stretches of no length.
func (t *tracer) line() *Line {
	line := &Line{Length: t.total, Several: t.several}
	for i := len(t.triangles) - 1; i >= 0; i-- {
		p := [3]float64(t.points[3*i : 3*i+3])
		k, s := len(line.S), 0.0
		if k > 0 {
			s = line.S[k-1] + distance(line.Points[3*k-3:], p[:])
			switch {
			case s-line.S[k-1] > 1e-3*t.eps: // a stretch
			case i > 0 || k == 1:
				line.Triangles[k-1] = t.triangles[i]
				continue
			default: // the last point stays the target's own place
				k--
				line.Points, line.S, line.Triangles = line.Points[:3*k], line.S[:k], line.Triangles[:k]
				s = line.S[k-1] + distance(line.Points[3*k-3:], p[:])
			}
		}
		line.append(p, s, t.triangles[i])
	}
	if k := len(line.Triangles); k > 1 {
		line.Triangles[k-1] = line.Triangles[k-2]
	}
	return line
}

func (l *Line) append(p [3]float64, s float64, triangle int32) {
	l.Points = append(l.Points, p[:]...)
	l.S = append(l.S, s)
	l.Triangles = append(l.Triangles, triangle)
}

// distance is that of two points in space.
func distance(p, q []float64) float64 {
	x, y, z := p[0]-q[0], p[1]-q[1], p[2]-q[2]
	return math.Sqrt(x*x + y*y + z*z)
}
