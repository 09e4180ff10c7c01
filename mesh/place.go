package mesh

import (
	"fmt"
	"math"
	"slices"

	"heatskin/internal/parallel"
)

// snap is the weight below which a point counts as lying on the rim of its triangle:
// it moves the point by that part of an edge, and spares the mesh a needle.
const snap = 1e-10

// A DatumError is a datum that does not fit the surface.
type DatumError struct {
	Name   string // the datum
	Reason string
}

func (e *DatumError) Error() string { return fmt.Sprintf("%s: %s", e.Name, e.Reason) }

// Place makes every datum part of the triangulation: points inside triangles become
// vertices, and the edges of a loop or crease are kept from being flipped. Call it
// once, before Delaunay. The error is a *DatumError.
func (s *Surface) Place(data []Datum) error {
	s.sites = make([]int32, len(data))
	if err := s.markEdges(data); err != nil {
		return err
	}
	pieces := map[int32][]int32{} // faces that a mesh triangle has been cut into
	faceOf := s.facesOf(data)
	for i, d := range data {
		switch {
		case d.Point != nil:
			v, err := s.placePoint(*d.Point, d.Name, faceOf, pieces)
			if err != nil {
				return err
			}
			s.sites[i] = v
		case d.Edges != nil:
			s.sites[i] = -1
		default:
			s.sites[i] = d.Vertex
		}
		if v := s.sites[i]; v >= 0 {
			if int(v) >= s.NumVertices {
				return &DatumError{d.Name, fmt.Sprintf("there is no such vertex; want 0 to %d", s.NumOriginal-1)}
			}
			if s.NoValue[v] {
				return &DatumError{d.Name, "the vertex is in no triangle of positive area; choose another"}
			}
		} else if d.Edges == nil {
			return &DatumError{d.Name, fmt.Sprintf("there is no vertex %d", v)}
		}
	}
	return nil
}

// facesOf finds the faces of the mesh triangles that points lie in.
func (s *Surface) facesOf(data []Datum) map[int32]int32 {
	faceOf := map[int32]int32{}
	for _, d := range data {
		if d.Point != nil {
			faceOf[d.Point.Triangle] = -1
		}
	}
	if len(faceOf) > 0 {
		for f, t := range s.parent {
			if _, asked := faceOf[t]; asked {
				faceOf[t] = int32(f)
			}
		}
	}
	for t, f := range faceOf {
		if f < 0 {
			delete(faceOf, t)
		}
	}
	return faceOf
}

// NumData is the number of data that Place was given.
func (s *Surface) NumData() int { return len(s.sites) }

// Site is the vertex of datum i after Place, or -1 where the datum is made of edges.
func (s *Surface) Site(i int) int32 { return s.sites[i] }

// OnDatum tells whether halfedge h lies on an edge of datum i.
func (s *Surface) OnDatum(h int32, i int) bool {
	return s.mark[h] > 0 && slices.Contains(s.tags[s.mark[h]], int32(i))
}

// markEdges gives each edge of a datum a mark that stands for the data it is in.
func (s *Surface) markEdges(data []Datum) error {
	wanted := map[[2]int32][]int32{}
	for i, d := range data {
		for _, e := range d.Edges {
			key := [2]int32{min(e[0], e[1]), max(e[0], e[1])}
			if in := wanted[key]; len(in) == 0 || in[len(in)-1] != int32(i) {
				wanted[key] = append(in, int32(i))
			}
		}
	}
	s.tags = [][]int32{nil}
	if len(wanted) == 0 {
		return nil
	}
	end := make([]bool, s.NumVertices) // of an edge that is wanted: most are passed over quickly
	for e := range wanted {
		for _, v := range e {
			if v >= 0 && int(v) < len(end) {
				end[v] = true
			}
		}
	}
	numbers := map[string]int32{}
	found := make([]int, len(data))
	for _, h := range parallel.Gather(len(s.Vert), func(h int32) bool { return end[s.Vert[h]] && end[s.head(h)] }) {
		a, b := s.Vert[h], s.head(h)
		in := wanted[[2]int32{min(a, b), max(a, b)}]
		if len(in) == 0 {
			continue
		}
		key := fmt.Sprint(in)
		if numbers[key] == 0 {
			numbers[key] = int32(len(s.tags))
			s.tags = append(s.tags, in)
		}
		s.mark[h] = numbers[key]
		for _, i := range in {
			found[i]++
		}
	}
	for i, d := range data {
		if d.Edges != nil && found[i] == 0 {
			return &DatumError{d.Name, "none of its edges belongs to a triangle of positive area"}
		}
	}
	return nil
}

func (s *Surface) placePoint(p Point, name string, faceOf map[int32]int32, pieces map[int32][]int32) (int32, error) {
	f, ok := faceOf[p.Triangle]
	if !ok {
		return -1, &DatumError{name, fmt.Sprintf("triangle %d has no area or is not there; choose another point", p.Triangle)}
	}
	if pieces[p.Triangle] == nil {
		pieces[p.Triangle] = []int32{f}
	}
	// The weights refer to the corners as the mesh names them; pieces and turned faces
	// are told by their positions.
	target := s.mesh.Position(p)
	best, weights := int32(-1), [3]float64{math.Inf(-1)}
	for _, g := range pieces[p.Triangle] {
		w := s.weightsIn(g, target)
		if best < 0 || min(w[0], w[1], w[2]) > min(weights[0], weights[1], weights[2]) {
			best, weights = g, w
		}
	}
	k := int32(0) // the corner that weighs most
	for i := int32(1); i < 3; i++ {
		if weights[i] > weights[k] {
			k = i
		}
	}
	h := 3*best + k
	i, j := weights[(k+1)%3], weights[(k+2)%3]
	grown := int32(len(s.Vert))
	var v int32
	switch {
	case i <= snap && j <= snap:
		return s.Vert[h], nil
	case j <= snap: // on the edge of h
		v = s.splitEdge(h, s.Length[h]*i/(i+weights[k]))
	case i <= snap: // on the edge before h
		v = s.splitEdge(prev(h), s.Length[prev(h)]*weights[k]/(j+weights[k]))
	default:
		v = s.splitFace(best, weights)
	}
	for g := grown / 3; g < int32(len(s.Vert)/3); g++ {
		t := s.parent[g]
		if pieces[t] == nil {
			pieces[t] = []int32{faceOf[t]}
		}
		pieces[t] = append(pieces[t], g)
	}
	return v, nil
}

// weightsIn are the weights of position x on the corners of face f, by areas in the
// face's plane.
func (s *Surface) weightsIn(f int32, x [3]float64) (w [3]float64) {
	var p [3][3]float64
	for k := range p {
		copy(p[k][:], s.Positions[3*s.Vert[3*f+int32(k)]:])
	}
	n := cross3(minus3(p[1], p[0]), minus3(p[2], p[0]))
	total := dot3(n, n)
	if total == 0 {
		return [3]float64{1, 0, 0}
	}
	for k := range w {
		w[k] = dot3(n, cross3(minus3(p[(k+1)%3], x), minus3(p[(k+2)%3], x))) / total
	}
	return w
}

// splitFace puts a new vertex inside face f and joins it to the three corners.
func (s *Surface) splitFace(f int32, w [3]float64) int32 {
	sum := w[0] + w[1] + w[2]
	for k := range w {
		w[k] /= sum
	}
	i, j, k := s.Vert[3*f], s.Vert[3*f+1], s.Vert[3*f+2]
	a, b, c := s.Length[3*f], s.Length[3*f+1], s.Length[3*f+2] // ij, jk, ki
	// Distance from a corner with displacement u along one side and v along the other.
	spoke := func(u, v, first, second, third float64) float64 {
		return math.Sqrt(max(0, u*u*first*first+v*v*second*second+u*v*(first*first+second*second-third*third)))
	}
	toI, toJ, toK := spoke(w[1], w[2], a, c, b), spoke(w[2], w[0], b, a, c), spoke(w[0], w[1], c, b, a)
	p := s.addVertex()
	for axis := range int32(3) {
		s.Positions[3*p+axis] = w[0]*s.Positions[3*i+axis] + w[1]*s.Positions[3*j+axis] + w[2]*s.Positions[3*k+axis]
	}
	// Face f keeps i→j and becomes (i, j, p); two new faces take j→k and k→i.
	f1, f2 := int32(len(s.Vert)), int32(len(s.Vert))+3
	s.Vert = append(s.Vert, j, k, p, k, i, p)
	s.Length = append(s.Length, b, toK, toJ, c, toI, toK)
	s.mark = append(s.mark, s.mark[3*f+1], 0, 0, s.mark[3*f+2], 0, 0)
	s.Glue = append(s.Glue, f1, f2+2, 3*f+1, f2, 3*f+2, f1+1)
	s.cot = append(s.cot, 0, 0, 0, 0, 0, 0)
	s.parent = append(s.parent, s.parent[f], s.parent[f])
	s.inheritDensity(f)
	s.inheritDensity(f)
	s.moveGlue(3*f+1, f1)
	s.moveGlue(3*f+2, f2)
	s.Vert[3*f+2] = p
	s.Length[3*f+1], s.Length[3*f+2] = toJ, toI
	s.mark[3*f+1], s.mark[3*f+2] = 0, 0
	s.Glue[3*f+1], s.Glue[3*f+2] = f1+2, f2+1
	for _, g := range [3]int32{f, f1 / 3, f2 / 3} {
		s.setCotangents(g)
	}
	return p
}

// moveGlue lets the halfedge to take the place of from in the cycle of its edge.
func (s *Surface) moveGlue(from, to int32) {
	if after := s.Glue[from]; after != from {
		s.Glue[s.before(from)] = to
		s.Glue[to] = after
		return
	}
	s.Glue[to] = to
}
