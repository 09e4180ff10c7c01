package geodesic

import (
	"fmt"
	"math"

	"heatskin/mesh"
)

// A sourcePoint is a source inside a triangle or on its rim.
type sourcePoint struct {
	mesh.Point
	datum int32
}

// atCorner is the weight from which a point counts as the corner itself.
const atCorner = 1 - 1e-14

// source starts the wave: vertices and points send rays, edges parallel rays.
func (v *wave) source(data []mesh.Datum) error {
	v.points = map[int32][]sourcePoint{}
	for i, d := range data {
		place, err := v.place(d)
		if err != nil {
			return err
		}
		if place.vertex >= 0 {
			v.sourceVertex(place.vertex, int32(i))
		}
		if place.triangle >= 0 {
			v.sourcePoint(mesh.Point{Triangle: place.triangle, Weights: place.weights}, int32(i))
		}
		for _, h := range place.edges {
			v.sourceEdge(h, int32(i))
		}
	}
	return nil
}

// A place is a checked datum: a vertex, a point of a triangle, or halfedges.
type place struct {
	vertex   int32 // or -1
	triangle int32 // or -1
	weights  [3]float64
	edges    []int32 // for each edge one halfedge
}

// place checks a datum against the mesh.
func (s *Solver) place(d mesh.Datum) (place, error) {
	n := int32(s.mesh.NumVertices())
	none := place{vertex: -1, triangle: -1}
	isVertex := func(v int32) error {
		if v < 0 || v >= n {
			return &DatumError{d.Name, fmt.Sprintf("a vertex from 0 to %d", n-1), fmt.Sprint(v)}
		}
		if !s.hasArea(v) {
			return &DatumError{d.Name, "a vertex of a triangle of positive area", fmt.Sprintf("vertex %d, which has none", v)}
		}
		return nil
	}
	switch {
	case d.Edges != nil && len(d.Edges) == 0:
		return none, &DatumError{d.Name, "at least one edge", "none"}
	case d.Edges != nil:
		p := none
		for _, e := range d.Edges {
			for _, v := range e {
				if err := isVertex(v); err != nil {
					return none, err
				}
			}
			h := s.halfedge(e[0], e[1])
			if h < 0 {
				return none, &DatumError{d.Name, "edges of the mesh", fmt.Sprintf("vertices %d and %d, which no edge joins", e[0], e[1])}
			}
			p.edges = append(p.edges, h)
		}
		return p, nil
	case d.Point != nil:
		t := d.Point.Triangle
		if t < 0 || int(t) >= s.mesh.NumTriangles() {
			return none, &DatumError{d.Name, fmt.Sprintf("a triangle from 0 to %d", s.mesh.NumTriangles()-1), fmt.Sprint(t)}
		}
		p := none
		sum := 0.0
		for k, w := range d.Point.Weights {
			if !(w > -1e-9 && w < 1+1e-9) {
				return none, &DatumError{d.Name, "weights from 0 to 1", fmt.Sprint(d.Point.Weights)}
			}
			p.weights[k] = max(w, 0)
			sum += p.weights[k]
		}
		if math.Abs(sum-1) > 1e-6 {
			return none, &DatumError{d.Name, "weights that add up to 1", fmt.Sprint(d.Point.Weights)}
		}
		corners := s.mesh.Triangles[3*t : 3*t+3]
		for k := range p.weights {
			p.weights[k] /= sum
			if p.weights[k] >= atCorner {
				p = none
				p.vertex = corners[k]
				return p, isVertex(p.vertex)
			}
		}
		if repeated(corners) {
			return none, &DatumError{d.Name, "a triangle with three different corners", fmt.Sprintf("triangle %d", t)}
		}
		if err := isVertex(corners[0]); err != nil {
			return none, err
		}
		p.triangle = t
		return p, nil
	}
	p := none
	p.vertex = d.Vertex
	return p, isVertex(d.Vertex)
}

// halfedge is one that joins a and b either way, or -1.
func (s *Solver) halfedge(a, b int32) int32 {
	for _, out := range s.corners(a) {
		if s.mesh.Triangles[following(out)] == b {
			return out
		}
		if in := preceding(out); s.mesh.Triangles[in] == b {
			return in
		}
	}
	return -1
}

func (v *wave) sourceVertex(vertex, datum int32) {
	if v.distance[vertex] == 0 {
		return
	}
	v.distance[vertex] = 0
	v.sends[vertex] = sendsOn
	v.touchVertex(vertex)
	v.events.push(event{0, int32(len(v.waits)) + vertex})
	if v.lines {
		v.parents[vertex] = parent{h: -1, from: -1}
		v.sourceVertices[vertex] = datum
	}
}

// sourcePoint sends rays out of the point's triangle across its three edges.
func (v *wave) sourcePoint(p mesh.Point, datum int32) {
	t := p.Triangle
	number := int32(len(v.pointList))
	v.pointList = append(v.pointList, sourcePoint{p, datum})
	v.points[t] = append(v.points[t], sourcePoint{p, datum})
	for k := range int32(3) {
		vertex, d := v.mesh.Triangles[3*t+k], v.toCorner(t, p.Weights, k)
		if v.lines {
			v.offer(vertex, d, parent{h: -1, from: firstPoint - number})
		} else {
			v.lower(vertex, d)
		}
	}
	for h := 3 * t; h < 3*t+3; h++ {
		if l := v.lay(h); !l.degenerate {
			x, y := l.point(h, p.Weights)
			v.emitWhole(h, &l, window{b1: l.length, x: x, y: y})
		}
	}
}

// point is where the point of the given weights (by corner of the triangle) lies in
// the layout from halfedge h.
func (l *layout) point(h int32, weights [3]float64) (x, y float64) {
	b, c := weights[(h+1)%3], weights[(h+2)%3]
	return b*l.length + c*l.x, c * l.y
}

// sourceEdge sends parallel rays into all triangles at the edge of halfedge h, and
// rays from its ends.
func (v *wave) sourceEdge(h int32, datum int32) {
	t := v.mesh.Triangles
	v.sourceVertex(t[h], datum)
	v.sourceVertex(t[following(h)], datum)
	length := v.edgeLength(h)
	if length == 0 {
		return
	}
	for p := h; ; {
		v.receive(p, envelope{{b1: length, y: 1, flags: parallel}}, narrow*length)
		if v.waits[p] > 0 {
			v.waits[p] = 0
			v.events.push(event{0, p})
		}
		if v.lines {
			v.sourceHalfedges[p] = datum
		}
		if p = v.glue[p]; p == h {
			return
		}
	}
}
