package geodesic

import (
	"math"
	"slices"
	"sort"
)

// lower sets the distance of a vertex to d, if that is less, and says so.
func (v *wave) lower(vertex int32, d float64) bool {
	if !(d < v.distance[vertex]) || d > v.radius {
		return false
	}
	old := v.distance[vertex]
	v.distance[vertex] = d
	if v.sends[vertex] == 0 {
		v.touchVertex(vertex)
		v.sends[vertex] = sendsNot
		if v.sendsOn(vertex) {
			v.sends[vertex] = sendsOn
		}
	}
	if v.sends[vertex] == sendsOn || v.sends[vertex] == sent && d < old*(1-tie) {
		v.sends[vertex] = sendsOn
		v.events.push(event{d, int32(len(v.waits)) + vertex})
	}
	return true
}

// send lets the wave out of a vertex into all its triangles.
func (v *wave) send(vertex int32) {
	d := v.distance[vertex]
	for _, out := range v.corners(vertex) {
		h := following(out) // opposite the vertex
		l := v.lay(h)
		v.fromCorner(vertex, l.a, d+v.between(vertex, l.a))
		v.fromCorner(vertex, l.b, d+v.between(vertex, l.b))
		if !l.degenerate {
			v.emitWhole(h, &l, window{b1: l.length, x: l.x, y: l.y, far: d})
		}
	}
}

// emitWhole sends one window out of the triangle of layout l through halfedge h itself.
func (v *wave) emitWhole(h int32, l *layout, w window) {
	g := v.gate(h, l.a, l.b, l.length, &v.left)
	v.emit(&g, &w)
	v.deliver(&g)
}

// A gate is an edge that windows leave a triangle by. They gather in run, in order
// from tail to head, before the envelopes across take them in together.
type gate struct {
	h          int32 // halfedge of the triangle left
	tail, head int32
	length     float64
	thin       float64
	noise      float64 // what round-off may do to distances on the edge near a source
	dt, dh     float64 // distances of tail and head
	bound      float64 // no point of the edge is farther
	least      float64 // least distance of the windows in run
	run        *envelope
	hasTargets bool
}

func (v *wave) gate(h, tail, head int32, length float64, run *envelope) gate {
	g := gate{h: h, tail: tail, head: head, length: length, thin: narrow * length, noise: blur * length,
		least: math.Inf(1), run: run}
	*run = (*run)[:0]
	v.rate(&g)
	g.hasTargets = v.targets.edges != nil && v.targets.edges[h] != nil
	return g
}

// rate brings the gate's distances up to date.
func (v *wave) rate(g *gate) {
	g.dt, g.dh = v.distance[g.tail], v.distance[g.head]
	g.bound = min((g.dt+g.dh+g.length)/2, v.radius)
}

// emit lets a window into the gate's run, unless it is plain that no shortest path
// goes through it: a way along the edge from one of its ends to the window's far end
// is as short, or all of the edge is as near.
func (v *wave) emit(g *gate, w *window) {
	if w.reaches(w.b1, (g.dt+w.b1)*(1-blur)-g.noise) || w.reaches(w.b0, (g.dh+(g.length-w.b0))*(1-blur)-g.noise) {
		return
	}
	t := w.nearest()
	if w.reaches(t, g.bound) {
		return
	}
	if !w.reaches(t, g.least) {
		g.least = w.at(t)
	}
	if g.hasTargets {
		v.hitEdge(g, w)
	}
	g.run.add(*w, g.thin, &v.spare)
}

// deliver gives the run of a gate to the halfedges across.
func (v *wave) deliver(g *gate) {
	if len(*g.run) == 0 {
		return
	}
	ahead := true // the run is in order from tail to head
	for p := v.glue[g.h]; p != g.h; p = v.glue[p] {
		if (v.mesh.Triangles[p] == g.tail) != ahead {
			ahead = !ahead
			slices.Reverse(*g.run)
			for i, w := range *g.run {
				(*g.run)[i] = w.turned(g.length)
			}
		}
		v.receive(p, *g.run, g.thin)
		if g.least < v.waits[p] {
			v.waits[p] = g.least
			v.events.push(event{g.least, p})
		}
	}
}

// receive merges a run into the envelope of h.
func (v *wave) receive(h int32, run envelope, thin float64) {
	i := v.list[h] - 1
	if i < 0 {
		v.touchHalfedge(h)
		v.list[h] = v.pool.add(run) + 1
		v.old = append(v.old, h)
		return
	}
	// Only what the run overlaps or touches has a part in it.
	have := v.pool.lists[i].windows
	begin, end := run[0].b0-beyond*thin, run[len(run)-1].b1+beyond*thin
	lo := sort.Search(len(have), func(k int) bool { return have[k].b1 >= begin })
	hi := lo + sort.Search(len(have)-lo, func(k int) bool { return have[lo+k].b0 > end })
	have = have[lo:hi]
	merged := v.merged[:0]
	for len(have) > 0 || len(run) > 0 {
		if len(run) == 0 || len(have) > 0 && have[0].b0 <= run[0].b0 {
			merged.add(have[0], thin, &v.spare)
			have = have[1:]
		} else {
			merged.add(run[0], thin, &v.spare)
			run = run[1:]
		}
	}
	v.merged = merged
	v.pool.splice(i, lo, hi, merged)
}

// cross carries the windows on h that have not been yet across its triangle.
func (v *wave) cross(h int32) {
	l := v.lay(h)
	if l.degenerate {
		return
	}
	v.fromCorner(l.a, l.c, v.distance[l.a]+l.toA)
	v.fromCorner(l.b, l.c, v.distance[l.b]+l.toB)
	left := v.gate(l.gateA, l.a, l.c, l.toA, &v.left)
	right := v.gate(l.gateB, l.c, l.b, l.toB, &v.right)
	watched := v.targets.faces != nil && v.targets.faces[h/3] != nil
	slack, thin := slackShare*l.length, narrow*l.length
	list := &v.pool.lists[v.list[h]-1]
	windows := list.windows[list.lo:list.hi]
	list.lo, list.hi = 0, 0
	for i := range windows {
		w := &windows[i]
		if w.flags&crossed != 0 {
			continue
		}
		v.crossed++
		if watched {
			v.hitFace(h, &l, w)
		}
		apex, ok := w.hit(l.x, l.y)
		if !ok {
			w.flags |= crossed
			continue
		}
		if apex >= w.b0-slack && apex <= w.b1+slack {
			v.throughWindow(h, &l, w)
			v.rate(&left)
			v.rate(&right)
		}
		b0, b1 := w.b0, w.b1
		if w.y <= thin && w.x >= b0-thin && w.x <= b1+thin && w.flags&parallel == 0 {
			// The source lies on the edge: all its rays leave from one point, which
			// round-off must not put outside.
			b0, b1 = min(b0, max(w.x-thin, 0)), max(b1, min(w.x+thin, l.length))
		}
		if b0 < apex && l.toA > 0 {
			out := window{far: w.far, flags: w.flags}
			if w.flags&parallel != 0 {
				out.x = w.x*l.uax + w.y*l.uay
				out.y = w.y*l.uax - w.x*l.uay
			} else {
				out.x = w.x*l.uax - w.y*l.uay
				out.y = max(w.x*l.uay+w.y*l.uax, 0)
			}
			out.b0 = land(w, b0, b0, l.uax, -l.uay, l.toA)
			out.b1 = l.toA
			if b1 < apex {
				out.b1 = land(w, b1, b1, l.uax, -l.uay, l.toA)
			}
			if out.b1 > out.b0 {
				v.emit(&left, &out)
			}
		}
		if b1 > apex && l.toB > 0 {
			out := window{far: w.far, flags: w.flags}
			if w.flags&parallel != 0 {
				// The axis from C to B is (ubx, -uby).
				out.x = w.x*l.ubx - w.y*l.uby
				out.y = w.y*l.ubx + w.x*l.uby
				out.far += w.x*l.x + w.y*l.y
			} else {
				out.x = l.toB - ((l.length-w.x)*l.ubx - w.y*l.uby)
				out.y = max((l.length-w.x)*l.uby+w.y*l.ubx, 0)
			}
			out.b1 = l.toB - land(w, b1, l.length-b1, l.ubx, l.uby, l.toB)
			if b0 > apex {
				out.b0 = l.toB - land(w, b0, l.length-b0, l.ubx, l.uby, l.toB)
			}
			if out.b1 > out.b0 {
				v.emit(&right, &out)
			}
		}
		w.flags |= crossed
	}
	v.deliver(&left)
	v.deliver(&right)
}

// land is where w's ray through b, at distance arm from a corner, meets the edge that
// leaves the corner in direction (ux, |uy|) from AB, measured from there. uy is
// negative at A, positive at B.
func land(w *window, b, arm, ux, uy, length float64) float64 {
	p, q := w.ray(b)
	switch {
	case arm <= 0:
		return 0
	case uy == 0: // in the line AB
		if ux > 0 {
			return min(arm/ux, length)
		}
		return length
	case q == 0:
		return 0
	}
	if d := q*ux + p*uy; d > 0 {
		return min(arm*(q/d), length)
	}
	return length
}

// slackShare is how far (of the halfedge) a vertex may lie beside a window's rays and
// still be given its distance: windows that end at a vertex may gape there by
// round-off. What is wrong with such a distance is of second order in the gap where
// the vertex bends paths, and loses against a better one where it does not.
const slackShare = 1e-12
