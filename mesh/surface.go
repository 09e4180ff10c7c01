package mesh

import (
	"fmt"
	"math"
	"slices"

	"heatskin/internal/parallel"
)

// A Surface is a triangulation known by its edge lengths: connectivity and a flat
// metric on each triangle, which is all that heat and distance depend on. Halfedge
// h = 3f+k runs from corner k of face f to the next corner. After flips two edges
// may join the same pair of vertices, and an edge may be a loop (a Δ-complex).
//
// Vertices 0 to NumOriginal-1 are those of the mesh, under their numbers; those
// that Place and Delaunay add follow.
type Surface struct {
	NumVertices int
	NumOriginal int
	Vert        []int32   // tail of halfedge h; length 3·faces
	Length      []float64 // length of halfedge h, the same all around its edge but where diffusion tensors jump
	Glue        []int32   // the next halfedge around the edge: h itself on a boundary, a cycle otherwise
	Positions   []float64 // x, y, z by vertex: to order unknowns and to show results, never to measure
	Density     []float64 // by face, what the stiffness is multiplied by; nil: 1. See NewTensorMetric
	NoValue     []bool    // by vertex: in no triangle of positive area, so no field has a value there

	Guard     LengthGuard // what was done to degenerate triangles
	Mismatch  float64     // the largest relative difference between an edge and what the metric of one of its faces gives it
	Flips     int         // edge flips made by Delaunay
	Splits    int         // edges split by Delaunay
	Unmended  int         // edges left with a negative weight (the budget of splits ran out, or they are too short)
	Duplicate int         // triangles left out: the same corners in the same order as another
	Collapsed int         // triangles left out: a repeated corner, or no area and a corner without value
	mesh      *Mesh       // as it was read
	cot       []float64   // cotangent of the angle opposite halfedge h
	mark      []int32     // 0: may be flipped; seam: orientation cannot be continued; k>0: edge of a datum, see tags
	tags      [][]int32   // data that an edge with mark k belongs to
	sites     []int32     // by datum, after Place: its vertex, or -1 where it is a set of edges
	parent    []int32     // by face: the mesh triangle it came from; -1 once flips have mixed them
}

const seam = -1 // mark of an edge across which orientation does not continue

// LengthGuard tells how far edges had to be lengthened so that every triangle
// inequality holds strictly.
type LengthGuard struct {
	Edges    int     // number of edges lengthened
	Largest  float64 // the largest lengthening, in the file's unit
	Relative float64 // the same over the longest edge of its triangle
}

// slackFloor is how far, relative to its longest edge, a triangle must be from
// flat: lengths carry a relative error of 1e-16, so the slack a+b-c then keeps four
// digits, and distances move by 1e-12 at most.
const slackFloor = 1e-12

// roomFloor is what a triangle is given where the lengths of a metric make none: they are
// off by far more than rounding, and a triangle that is all but flat would spoil what is
// split and flipped beside it.
const roomFloor = 1e-2

// flatArea is the area, relative to the square of the longest edge, up to which a
// triangle counts as having none: rounded coordinates give no better.
const flatArea = 1e-15

// An EmptyError is a mesh without a triangle of positive area.
type EmptyError struct{ Triangles int }

func (e *EmptyError) Error() string {
	return fmt.Sprintf("no triangle of positive area among %d; nothing can be computed on it", e.Triangles)
}

// A RangeError is a mesh whose size cannot be squared in double precision.
type RangeError struct{ Size float64 }

func (e *RangeError) Error() string {
	return fmt.Sprintf("the part measures %g in its own unit; want 1e-140 to 1e140 (change the unit)", e.Size)
}

// NewSurface measures the edges of m, by its metric if it has one, and glues its triangles. Triangles with a
// repeated corner, exact duplicates, and flat triangles that alone hold a vertex are
// left out; faces are turned so that neighbours agree wherever the surface allows.
// Faces are in no order that the mesh knows: see alongCurve. The error is an
// *EmptyError or a *RangeError. O(n).
func NewSurface(m *Mesh) (*Surface, error) {
	if err := m.checkRange(); err != nil {
		return nil, err
	}
	// Until the end, vertices are numbered as they come along the curve, too.
	local, triangle, vertex := m.alongCurve()
	s := &Surface{mesh: m, NumOriginal: m.NumVertices(), NumVertices: len(vertex), Positions: local.Positions, parent: triangle}
	s.keepFaces(local.Triangles)
	if len(s.Vert) == 0 {
		return nil, &EmptyError{Triangles: m.NumTriangles()}
	}
	s.orient()
	s.Length, s.cot = make([]float64, len(s.Vert)), make([]float64, len(s.Vert))
	if m.Metric != nil {
		if err := s.measure(vertex); err != nil {
			return nil, err
		}
	} else {
		parallel.EachBlock(s.NumFaces(), func(_, lo, hi int) {
			for h := int32(3 * lo); h < int32(3*hi); h++ {
				s.Length[h] = dist(s.Positions, s.Vert[h], s.head(h))
			}
		})
	}
	s.guardLengths()
	parallel.EachBlock(s.NumFaces(), func(_, lo, hi int) {
		for f := lo; f < hi; f++ {
			s.setCotangents(int32(f))
		}
	})
	s.numberAsMesh(vertex)
	return s, nil
}

// numberAsMesh gives vertices the numbers that the mesh has for them.
func (s *Surface) numberAsMesh(vertex []int32) {
	renumber(s.Vert, s.Vert, vertex)
	noValue := make([]bool, s.NumOriginal)
	for v := range noValue {
		noValue[v] = true
	}
	for v, none := range s.NoValue {
		noValue[vertex[v]] = none
	}
	s.NoValue, s.NumVertices = noValue, s.NumOriginal
	s.Positions = slices.Clip(s.mesh.Positions) // the mesh's own: a vertex that is added makes a copy
}

// Renumbered is s with its vertices numbered as its faces come, so that what is near on
// the surface is near in memory, and the vertex of s that each one is. Vertices of the
// mesh still come before added ones. Of either surface nothing may be changed from then
// on: they share what does not name vertices. O(n).
func (s *Surface) Renumbered() (r *Surface, vertex []int32) {
	number := make([]int32, s.NumVertices)
	for v := range number {
		number[v] = -1
	}
	vertex = make([]int32, s.NumVertices)
	original, added := int32(0), int32(s.NumOriginal)
	take := func(v int32) {
		if v < int32(s.NumOriginal) {
			number[v], vertex[original] = original, v
			original++
		} else {
			number[v], vertex[added] = added, v
			added++
		}
	}
	for _, v := range s.Vert {
		if number[v] < 0 {
			take(v)
		}
	}
	for v := range number { // in no face
		if number[v] < 0 {
			take(int32(v))
		}
	}
	c := *s
	c.Vert, c.NoValue, c.Positions = make([]int32, len(s.Vert)), make([]bool, len(s.NoValue)), make([]float64, len(s.Positions))
	renumber(c.Vert, s.Vert, number)
	parallel.EachBlock(s.NumVertices, func(_, lo, hi int) {
		for v := lo; v < hi; v++ {
			c.NoValue[v] = s.NoValue[vertex[v]]
			copy(c.Positions[3*v:3*v+3], s.Positions[3*vertex[v]:])
		}
	})
	c.sites = slices.Clone(s.sites)
	for i, v := range s.sites {
		if v >= 0 {
			c.sites[i] = number[v]
		}
	}
	return &c, vertex
}

func (m *Mesh) checkRange() error {
	// In sane files the first corner off the origin and a look at all vertices, in their
	// order, will do; vertices in no triangle do not count.
	for _, v := range m.Triangles {
		if p := point3(m.Positions, v); max(math.Abs(p[0]), math.Abs(p[1]), math.Abs(p[2])) >= 1e-140 {
			box := m.box()
			if min(box.lo[0], box.lo[1], box.lo[2]) >= -0.5e140 && max(box.hi[0], box.hi[1], box.hi[2]) <= 0.5e140 {
				return nil
			}
			break
		}
	}
	box := noBox()
	for _, v := range m.Triangles {
		box.add(point3(m.Positions, v))
	}
	size := box.size()
	for axis := range box.lo {
		size = max(size, math.Abs(box.lo[axis]), math.Abs(box.hi[axis]))
	}
	if len(m.Triangles) > 0 && size > 0 && !(size >= 1e-140 && size <= 1e140) {
		return &RangeError{Size: size}
	}
	return nil
}

// box is that of all vertices.
func (m *Mesh) box() box3 {
	blocks := make([]box3, parallel.NumBlocks(m.NumVertices()))
	parallel.EachBlock(m.NumVertices(), func(block, lo, hi int) {
		b := noBox()
		for v := lo; v < hi; v++ {
			b.add(point3(m.Positions, int32(v)))
		}
		blocks[block] = b
	})
	box := noBox()
	for _, b := range blocks {
		box.add(b.lo)
		box.add(b.hi)
	}
	return box
}

// keepFaces chooses the triangles that make up the surface, given the corners of all,
// and glues them.
func (s *Surface) keepFaces(corners []int32) {
	const flat, kept, crowded, collapsed, duplicate = 0, 1, 2, 3, 4
	state := make([]uint8, len(corners)/3)
	parallel.EachBlock(len(state), func(_, lo, hi int) {
		for f := lo; f < hi; f++ {
			if hasArea(s.Positions, corners[3*f], corners[3*f+1], corners[3*f+2]) {
				state[f] = kept
			}
		}
	})
	s.NoValue = make([]bool, s.NumVertices)
	for v := range s.NoValue {
		s.NoValue[v] = true
	}
	for f, st := range state {
		if st == kept {
			for _, v := range corners[3*f : 3*f+3] {
				s.NoValue[v] = false
			}
		}
	}
	s.Glue = glue(corners, s.NumVertices)
	parallel.EachBlock(len(state), func(_, lo, hi int) {
		for f := lo; f < hi; f++ {
			a, b, c := corners[3*f], corners[3*f+1], corners[3*f+2]
			if a == b || b == c || c == a || s.NoValue[a] || s.NoValue[b] || s.NoValue[c] {
				state[f] = collapsed
				continue
			}
			state[f] = kept
			h := int32(3 * f)
			switch g := s.Glue[h]; {
			case g == h:
			case s.Glue[g] != h:
				state[f] = crowded
			case g < h && corners[g] == corners[h] && corners[prev(g)] == corners[prev(h)]:
				state[f] = duplicate
			}
		}
	})
	// Where an edge has two faces one look has sufficed; elsewhere a table keeps the cost
	// linear however many faces share an edge.
	seen := map[[3]int32]struct{}{}
	left := 0
	for f, st := range state {
		if st == crowded {
			key := cyclic(corners[3*f : 3*f+3])
			st = kept
			if _, twice := seen[key]; twice {
				st = duplicate
			}
			seen[key] = struct{}{}
		}
		switch st {
		case kept:
			if left < f {
				copy(corners[3*left:3*left+3], corners[3*f:])
				s.parent[left] = s.parent[f]
			}
			left++
		case collapsed:
			s.Collapsed++
		case duplicate:
			s.Duplicate++
		}
	}
	s.Vert, s.parent = corners[:3*left], s.parent[:left]
	if left < len(state) {
		s.Glue = glue(s.Vert, s.NumVertices)
	}
}

// cyclic is a triangle turned so that its least corner comes first.
func cyclic(t []int32) [3]int32 {
	key := [3]int32(t)
	for key[0] > key[1] || key[0] > key[2] {
		key[0], key[1], key[2] = key[1], key[2], key[0]
	}
	return key
}

// orient turns faces so that two faces of one edge run along it in opposite
// directions, as far as the surface allows, and marks the edges where it does not
// (a Möbius band has some). Edges with more than two faces pass nothing on.
func (s *Surface) orient() {
	s.mark = make([]int32, len(s.Vert))
	disagree := func(h int32) bool {
		g := s.Glue[h]
		return g != h && s.Glue[g] == h && s.Vert[g] == s.Vert[h]
	}
	if len(parallel.Gather(len(s.Vert), disagree)) == 0 {
		return
	}
	if turned, any := s.facesToTurn(); any {
		// Halfedges ab, bc, ca of a turned face become ac, cb, ba.
		moved := func(h int32) int32 {
			if turned[h/3] {
				return h - h%3 + 2 - h%3
			}
			return h
		}
		after := make([]int32, len(s.Glue))
		for h, g := range s.Glue {
			after[moved(int32(h))] = moved(g)
		}
		s.Glue = after
		for f, is := range turned {
			if is {
				s.Vert[3*f+1], s.Vert[3*f+2] = s.Vert[3*f+2], s.Vert[3*f+1]
			}
		}
	}
	for _, h := range parallel.Gather(len(s.Vert), disagree) {
		s.mark[h] = seam
	}
}

// facesToTurn walks over each part from its first face, which stays as it is.
func (s *Surface) facesToTurn() (turned []bool, any bool) {
	turned = make([]bool, s.NumFaces())
	seen := make([]bool, s.NumFaces())
	var stack []int32
	for f := range int32(s.NumFaces()) {
		if seen[f] {
			continue
		}
		seen[f] = true
		stack = append(stack[:0], f)
		for len(stack) > 0 {
			f := stack[len(stack)-1]
			stack = stack[:len(stack)-1]
			for h := 3 * f; h < 3*f+3; h++ {
				g := s.Glue[h]
				if g == h || s.Glue[g] != h || seen[g/3] {
					continue
				}
				seen[g/3] = true
				turned[g/3] = turned[f] != (s.Vert[g] == s.Vert[h])
				any = any || turned[g/3]
				stack = append(stack, g/3)
			}
		}
	}
	return turned, any
}

// guardLengths lengthens edges until every triangle has a slack of slackFloor. An
// edge that grows may spoil a neighbour, which is then looked at again; the growth
// dies out, since each triangle needs a part of its own length only once.
func (s *Surface) guardLengths() {
	room := 1.25 * slackFloor
	if s.mesh.Metric != nil {
		room = roomFloor
	}
	original := map[int32]float64{} // by smallest halfedge of the edge
	first := func(h int32) int32 {
		lo := h
		for g := s.Glue[h]; g != h; g = s.Glue[g] {
			lo = min(lo, g)
		}
		return lo
	}
	work := parallel.Gather(s.NumFaces(), func(f int32) bool { return s.slack(f) < slackFloor })
	for rounds := 0; len(work) > 0 && rounds < 60; rounds++ {
		var again []int32
		for _, f := range work {
			h := s.longest(f)
			missing := (room - s.slack(f)) * s.Length[h]
			if s.slack(f) >= slackFloor {
				continue
			}
			for _, g := range [2]int32{next(h), prev(h)} {
				lo := first(g)
				if _, known := original[lo]; !known {
					original[lo] = s.Length[g]
				}
				s.Length[g] += missing / 2
				for k := s.Glue[g]; k != g; k = s.Glue[k] {
					s.Length[k] += missing / 2
					again = append(again, k/3)
				}
			}
			again = append(again, f)
		}
		work = work[:0]
		for _, f := range again {
			if s.slack(f) < slackFloor {
				work = append(work, f)
			}
		}
	}
	for lo, before := range original {
		grown := s.Length[lo] - before
		s.Guard.Largest = max(s.Guard.Largest, grown)
		s.Guard.Relative = max(s.Guard.Relative, grown/s.Length[s.longest(lo/3)])
	}
	s.Guard.Edges = len(original)
}

// slack is how far face f is from flat: the two shorter edges' excess over the
// longest, relative to that.
func (s *Surface) slack(f int32) float64 {
	h := s.longest(f)
	c := s.Length[h]
	a, b := s.Length[next(h)], s.Length[prev(h)]
	return (min(a, b) - (c - max(a, b))) / c
}

// longest is the halfedge of f that is longest.
func (s *Surface) longest(f int32) int32 {
	h := 3 * f
	for k := h + 1; k < 3*f+3; k++ {
		if s.Length[k] > s.Length[h] {
			h = k
		}
	}
	return h
}

// NumFaces is the number of triangles.
func (s *Surface) NumFaces() int { return len(s.Vert) / 3 }

// Cot is the cotangent of the angle opposite halfedge h in its face.
func (s *Surface) Cot(h int32) float64 { return s.cot[h] }

// Area of face f.
func (s *Surface) Area(f int32) float64 {
	return triangleArea(s.Length[3*f], s.Length[3*f+1], s.Length[3*f+2])
}

// pull is the cotangent opposite halfedge h, its face's density counted.
func (s *Surface) pull(h int32) float64 {
	if s.Density == nil {
		return s.cot[h]
	}
	return s.Density[h/3] * s.cot[h]
}

// LeastDensity is the least of the faces' densities.
func (s *Surface) LeastDensity() float64 {
	if s.Density == nil {
		return 1
	}
	return slices.Min(s.Density)
}

// Slow is a length in face f over the root of its density: what takes heat as long where
// that is 1.
func (s *Surface) Slow(f int32, length float64) float64 {
	if s.Density == nil {
		return length
	}
	return length / math.Sqrt(s.Density[f])
}

// LengthInSpace is the length of an edge that boundaries and data keep from being
// flipped: what heat along a line goes by. It is Length unless the metric is a tensor's.
func (s *Surface) LengthInSpace(h int32) float64 {
	if s.Density == nil {
		return s.Length[h]
	}
	return dist(s.Positions, s.Vert[h], s.head(h))
}

// Angle is the angle of a face at the tail of halfedge h, in radians.
func (s *Surface) Angle(h int32) float64 {
	return math.Atan2(1, s.cot[next(h)])
}

// setCotangents works out the cotangents of face f from its lengths.
func (s *Surface) setCotangents(f int32) {
	a, b, c := s.Length[3*f], s.Length[3*f+1], s.Length[3*f+2]
	fourArea := 4 * triangleArea(a, b, c)
	s.cot[3*f] = (b*b + (c-a)*(c+a)) / fourArea
	s.cot[3*f+1] = (c*c + (a-b)*(a+b)) / fourArea
	s.cot[3*f+2] = (a*a + (b-c)*(b+c)) / fourArea
}

// Boundary tells whether halfedge h is alone on its edge.
func (s *Surface) Boundary(h int32) bool { return s.Glue[h] == h }

// Opposite is the halfedge that runs the other way along h where exactly two faces
// meet and agree in orientation; -1 otherwise.
func (s *Surface) Opposite(h int32) int32 {
	g := s.Glue[h]
	if g == h || s.Glue[g] != h || s.mark[h] == seam {
		return -1
	}
	return g
}

func (s *Surface) head(h int32) int32 { return s.Vert[next(h)] }

// next and prev are the halfedges after and before h in its face.
func next(h int32) int32 {
	if h%3 == 2 {
		return h - 2
	}
	return h + 1
}

func prev(h int32) int32 {
	if h%3 == 0 {
		return h + 2
	}
	return h - 1
}

func dist(x []float64, a, b int32) float64 {
	d0, d1, d2 := x[3*b]-x[3*a], x[3*b+1]-x[3*a+1], x[3*b+2]-x[3*a+2]
	return math.Sqrt(d0*d0 + d1*d1 + d2*d2)
}

// triangleArea is the area from three lengths, stable for needles and caps (W.
// Kahan, Miscalculating Area and Angles of a Needle-like Triangle, 2014). It is 0
// where the triangle inequality fails.
func triangleArea(a, b, c float64) float64 {
	if a < b {
		a, b = b, a
	}
	if a < c {
		a, c = c, a
	}
	if b < c {
		b, c = c, b
	}
	p := (a + (b + c)) * (c - (a - b)) * (c + (a - b)) * (a + (b - c))
	if !(p > 0) {
		return 0
	}
	return math.Sqrt(p) / 4
}

// hasArea tells whether three positions span a triangle, beyond rounding.
func hasArea(x []float64, a, b, c int32) bool {
	u0, u1, u2 := x[3*b]-x[3*a], x[3*b+1]-x[3*a+1], x[3*b+2]-x[3*a+2]
	w0, w1, w2 := x[3*c]-x[3*a], x[3*c+1]-x[3*a+1], x[3*c+2]-x[3*a+2]
	n0, n1, n2 := u1*w2-u2*w1, u2*w0-u0*w2, u0*w1-u1*w0
	e0, e1, e2 := w0-u0, w1-u1, w2-u2
	longest := max(u0*u0+u1*u1+u2*u2, w0*w0+w1*w1+w2*w2, e0*e0+e1*e1+e2*e2)
	return math.Sqrt(n0*n0+n1*n1+n2*n2) > 2*flatArea*longest
}
