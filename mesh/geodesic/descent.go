package geodesic

import "math"

// descend follows the line from its arrival like trace, but asks the windows on the
// way instead of the ruler: wherever it stands it takes the shortest way that leads
// there. That needs a wave with Options.Keep, and bears triangles without area, which
// lead a straight line astray.
func (t *tracer) descend(a *arrival) (ok bool) {
	t.points, t.triangles = t.points[:0], t.triangles[:0]
	t.passed, t.entered = map[int32]bool{}, map[int32]bool{}
	t.add(a.place, -1)
	stand := stance{vertex: a.vertex, h: -1}
	switch {
	case a.hit != nil && a.hit.leaves:
		stand = stance{vertex: -1, h: a.hit.h, at: a.hit.x, inside: true}
	case a.hit != nil:
		stand = t.atFoot(a.hit.h, &a.hit.window, a.hit.x, a.hit.y)
	case a.vertex < 0: // from a source in the same triangle
		t.add(a.source, a.triangle)
		t.source = int(a.datum)
		return true
	case a.triangle >= 0:
		t.add(t.position(a.vertex), a.triangle)
	}
	left := t.total
	for range 2 * len(t.mesh.Triangles) { // the line crosses no edge and no vertex twice
		if t.arrived(&stand) {
			return true
		}
		best := t.nextWay(&stand)
		if math.IsInf(best.length, 1) || best.length > left+t.eps {
			return false
		}
		left = best.length
		switch {
		case best.gate >= 0:
			stand = t.atFoot(best.gate, best.window, best.x, best.y)
		case best.vertex >= 0:
			t.add(t.position(best.vertex), best.triangle)
			stand = stance{vertex: best.vertex, h: -1}
		default:
			t.add(best.place, best.triangle)
			t.source = best.source
			return true
		}
	}
	return false
}

// A stance is a place on the line: a vertex, or at on halfedge h, from where the line
// goes on across h or, if inside is set, in the triangle of h too.
type stance struct {
	vertex, h int32 // the other is -1
	at        float64
	inside    bool
}

// A way leads to a stance through one triangle: straight from a vertex, from a source
// point, or through a window on one of the triangle's other edges.
type way struct {
	length   float64 // all the way from the source
	triangle int32
	vertex   int32 // or -1
	gate     int32 // halfedge of the window, or -1
	window   *window
	x, y     float64 // the stance in the layout from gate
	source   int
	place    [3]float64 // of the source point
}

// atFoot is the stance where w's ray to (x, y) of h's triangle comes through h.
func (t *tracer) atFoot(h int32, w *window, x, y float64) stance {
	t.entered[h] = true
	l := t.lay(h)
	foot, _ := w.hit(x, y)
	foot = min(max(foot, w.b0), w.b1)
	t.add(t.inSpace(&l, foot, 0), h/3)
	return stance{vertex: -1, h: h, at: foot}
}

// arrived tells whether the line stands at its source.
func (t *tracer) arrived(s *stance) bool {
	if s.h < 0 {
		d, ok := t.sourceVertices[s.vertex]
		t.source = int(d)
		return ok
	}
	for p := s.h; ; {
		l := t.lay(p)
		u := s.at
		if t.mesh.Triangles[p] != t.mesh.Triangles[s.h] {
			u = l.length - u
		}
		if d, ok := t.sourceIn(p, &l, u, 0, t.eps); ok {
			t.source = d
			return true
		}
		if p = t.glue[p]; p == s.h {
			return false
		}
	}
}

// nextWay is the shortest way that leads to a stance.
func (t *tracer) nextWay(s *stance) way {
	best := way{length: math.Inf(1)}
	var weights [3]float64
	if s.h < 0 {
		t.passed[s.vertex] = true
		t.several = t.several || t.parents[s.vertex].several
		for _, out := range t.corners(s.vertex) {
			weights = [3]float64{}
			weights[out%3] = 1
			t.ways(&best, out/3, weights, -1)
		}
		return best
	}
	length := t.edgeLength(s.h)
	for p := s.h; ; {
		if p != s.h || s.inside {
			u := s.at / length
			if t.mesh.Triangles[p] != t.mesh.Triangles[s.h] {
				u = 1 - u
			}
			weights = [3]float64{}
			weights[p%3], weights[(p+1)%3] = 1-u, u
			t.ways(&best, p/3, weights, p)
		}
		if p = t.glue[p]; p == s.h {
			return best
		}
	}
}

// ways looks for a shorter way than best to the point of a triangle, through any of
// its halfedges but except. Of equal ways one from a vertex is taken, which surely
// leads on. Where all is in one place only that keeps it from walking in circles, and
// that it goes through no vertex and no edge twice.
func (t *tracer) ways(best *way, triangle int32, weights [3]float64, except int32) {
	even := 1e-4 * t.eps
	for k := range int32(3) {
		v := t.mesh.Triangles[3*triangle+k]
		if d := t.distance[v] + t.toCorner(triangle, weights, k) - even; d < best.length && !t.passed[v] {
			*best = way{length: d, triangle: triangle, vertex: v, gate: -1}
		}
	}
	for _, p := range t.wave.points[triangle] {
		if d := t.apart(triangle, weights, p.Weights) - even; d < best.length {
			*best = way{length: d, triangle: triangle, vertex: -1, gate: -1, source: int(p.datum), place: t.mesh.Position(p.Point)}
		}
	}
	for h := 3 * triangle; h < 3*triangle+3; h++ {
		if h == except || t.list[h] == 0 || t.entered[h] {
			continue
		}
		l := t.lay(h)
		if l.degenerate {
			continue
		}
		x, y := l.point(h, weights)
		windows := t.pool.lists[t.list[h]-1].windows
		for i := range windows {
			w := &windows[i]
			foot, _ := w.hit(x, y)
			foot = min(max(foot, w.b0), w.b1)
			if d := w.at(foot) + math.Hypot(x-foot, y); d < best.length {
				*best = way{length: d, triangle: triangle, vertex: -1, gate: h, window: w, x: x, y: y}
			}
		}
	}
}
