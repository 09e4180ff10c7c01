package geodesic

import "math"

// A parent tells how the shortest way comes to a vertex: straight through a window,
// along an edge, from a source point in a triangle at the vertex, or not at all
// because the vertex is a source.
type parent struct {
	h       int32 // through h into the triangle that has the vertex as its apex, or -1
	from    int32 // if h is -1: the vertex, or firstPoint minus the number of the source point, or -1
	several bool  // another way is equally short
	window  window
}

const firstPoint = -2

// throughWindow offers the apex of h's triangle the straight way through w.
func (v *wave) throughWindow(h int32, l *layout, w *window) {
	d := max(w.to(l.x, l.y), 0)
	if !v.lines {
		v.lower(l.c, d)
	} else {
		v.offer(l.c, d, parent{h: h, from: -1, window: *w})
	}
}

// fromCorner offers b the distance d by way of the edge from a.
func (v *wave) fromCorner(a, b int32, d float64) {
	if !v.lines {
		v.lower(b, d)
	} else {
		v.offer(b, d, parent{h: -1, from: a})
	}
}

// offer gives vertex the distance d by the way of p if it is shorter, and notes whether
// ways that differ are equally short.
func (v *wave) offer(vertex int32, d float64, p parent) {
	old := v.distance[vertex]
	switch {
	case d < old*(1-equally):
		if v.lower(vertex, d) {
			v.parents[vertex] = p
		}
	case d <= old*(1+equally) && d > 0:
		p.several = v.parents[vertex].several ||
			!alike(v.direction(vertex, &v.parents[vertex]), v.direction(vertex, &p))
		if v.lower(vertex, d) {
			v.parents[vertex] = p
		}
		v.parents[vertex].several = p.several
	}
}

// alike tells whether two unit vectors are one direction. Ways that part by less are
// one way: to first order a bend of a makes a line longer by the share a^2/8, which at
// 1e-4 is what counts as equally short.
func alike(a, b [3]float64) bool {
	x, y, z := a[0]-b[0], a[1]-b[1], a[2]-b[2]
	return x*x+y*y+z*z < 4e-8
}

// direction is the unit vector in space from vertex back along the way of p.
func (v *wave) direction(vertex int32, p *parent) [3]float64 {
	if math.IsInf(v.distance[vertex], 1) {
		return [3]float64{} // p is of an earlier wave
	}
	if p.h >= 0 {
		l := v.lay(p.h)
		return v.backwards(&l, &p.window, l.x, l.y)
	}
	if p.from >= 0 {
		return unit(v.position(vertex), v.position(p.from))
	}
	if p.from <= firstPoint {
		return unit(v.position(vertex), v.mesh.Position(v.pointList[firstPoint-p.from].Point))
	}
	return [3]float64{}
}

// backwards is the unit vector in space from (x, y) in layout l to where w's rays come
// from.
func (v *wave) backwards(l *layout, w *window, x, y float64) [3]float64 {
	if w.flags&parallel != 0 {
		return v.lift(l, -w.x, -w.y)
	}
	return v.lift(l, w.x-x, -w.y-y)
}

// lift is the vector (x, y) of layout l as a unit vector in space.
func (s *Solver) lift(l *layout, x, y float64) (d [3]float64) {
	r := math.Hypot(x, y)
	if r == 0 {
		return d
	}
	a, b, c := s.position(l.a), s.position(l.b), s.position(l.c)
	for k := range d {
		ex := (b[k] - a[k]) / l.length
		d[k] = x / r * ex
		if l.y > 0 {
			d[k] += y / r * (c[k] - a[k] - l.x*ex) / l.y
		}
	}
	return d
}

// position is where vertex i lies in space.
func (s *Solver) position(i int32) [3]float64 { return [3]float64(s.mesh.Positions[3*i : 3*i+3]) }

// unit is the unit vector from a to b, 0 if they coincide.
func unit(a, b [3]float64) (d [3]float64) {
	r := 0.0
	for k := range d {
		d[k] = b[k] - a[k]
		r += d[k] * d[k]
	}
	if r = math.Sqrt(r); r > 0 {
		for k := range d {
			d[k] /= r
		}
	}
	return d
}
