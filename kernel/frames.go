package kernel

import (
	"math"

	"heatskin/internal/parallel"
	"heatskin/mesh"
)

// frames give each vertex of a surface its own polar angle: 0 along one of its
// edges, growing counter-clockwise through its triangles up to the total angle there.
type frames struct {
	start     []int32   // halfedges out of v are corner[start[v]:start[v+1]]
	corner    []int32   // in order of angle where the vertex has a frame
	at        []float64 // by halfedge: its angle in the frame of its tail
	wide      []float64 // by halfedge: the face's angle at its tail
	total     []float64 // by vertex: sum of its angles
	kind      []uint8   // by vertex: smooth, cone, rimmed or odd
	curvature []float64 // by vertex: Gaussian curvature, averaged over the ring
	turning   []float64 // by vertex: |K|·h², how far its frame turns against the next
	edge      []float64 // by vertex: mean length of the edges there
	longest   []float64 // by vertex: the longest
	area      []float64 // by vertex: a third of its faces'
}

const (
	smooth = iota // total angle about 2π: angles are scaled so that it is
	cone          // an angle of its own: corners of a part, kept as they are
	rimmed        // on the boundary: angles do not go round
	odd           // branching edges, several fans, or no orientation: no common frame
)

// apart is how far the angles of one face and the next lie apart at an odd vertex,
// where each face counts on its own: more than any angle.
const apart = 8

// coneBend is how far a geodesic may turn along the longest edge at a vertex, in
// radians, for the skin there to count as curved and smooth: K·L², with the Gaussian
// curvature K as the angle defect over the vertex's area. Where more is lost between
// one vertex and the next (a corner of the part, noise of a scan beyond reason) the
// vertex is a cone, and treated as exactly that. So it is from flatBend on if a
// neighbour is exactly flat: curvature that stops short lies on an edge of the part,
// such as the rim of a bore. Chosen on a can, noisy spheres and perforated brackets.
const (
	coneBend = 0.4
	flatBend = 0.06
)

// mostTurning bounds the turn that is taken for discretisation. On meshes that bend more
// from one vertex to the next, fronts that differ by more are different fronts.
const mostTurning = 0.012

func newFrames(s *mesh.Surface, area []float64) frames {
	n := s.NumVertices
	f := frames{
		start: make([]int32, n+1), corner: make([]int32, len(s.Vert)),
		at: make([]float64, len(s.Vert)), wide: make([]float64, len(s.Vert)),
		total: make([]float64, n), kind: make([]uint8, n),
		curvature: make([]float64, n), turning: make([]float64, n), edge: make([]float64, n),
		longest: make([]float64, n), area: area,
	}
	for _, v := range s.Vert {
		f.start[v+1]++
	}
	for v := range n {
		f.start[v+1] += f.start[v]
	}
	fill := append([]int32(nil), f.start[:n]...)
	for h, v := range s.Vert {
		f.corner[fill[v]] = int32(h)
		fill[v]++
	}
	each := func(do func(v int32)) {
		parallel.EachBlock(n, func(_, lo, hi int) {
			for v := int32(lo); v < int32(hi); v++ {
				do(v)
			}
		})
	}
	each(func(v int32) { f.measure(s, v) })
	each(func(v int32) { f.walk(s, v) })
	defect := make([]float64, n)
	each(func(v int32) {
		if f.kind[v] != smooth {
			return
		}
		if d := 2*math.Pi - f.total[v]; math.Abs(d) >= 1e-9 { // else it is rounding
			defect[v] = d
		}
	})
	each(func(v int32) { f.measureCurvature(s, v, defect) })
	return f
}

// measure adds up the angles at v, and looks at the edges there.
func (f *frames) measure(s *mesh.Surface, v int32) {
	out := f.out(v)
	for _, h := range out {
		f.wide[h] = s.Angle(h)
		f.total[v] += f.wide[h]
		l, k := s.Length[h], s.Length[prev(h)]
		f.edge[v] += (l + k) / 2 / float64(len(out))
		f.longest[v] = max(f.longest[v], l, k)
	}
}

// walk orders the halfedges out of v counter-clockwise and measures their angles.
func (f *frames) walk(s *mesh.Surface, v int32) {
	f.kind[v] = f.order(s, v)
	if f.kind[v] == odd {
		for i, h := range f.out(v) {
			f.at[h] = apart * float64(i)
		}
	}
}

func (f *frames) order(s *mesh.Surface, v int32) uint8 {
	out := f.out(v)
	if len(out) == 0 {
		return odd
	}
	first, rims := out[0], 0
	for _, h := range out {
		if s.Boundary(h) {
			first = h
			rims++
		} else if s.Opposite(h) < 0 {
			return odd // a branching edge, or one across which orientation changes
		}
		if g := prev(h); s.Opposite(g) < 0 && !s.Boundary(g) {
			return odd
		}
	}
	angle, h, count := 0.0, first, 0
	for count < len(out) {
		f.at[h] = angle
		angle += f.wide[h]
		count++
		if h = s.Opposite(prev(h)); h < 0 || h == first {
			break
		}
	}
	switch {
	case count < len(out) || rims > 1:
		return odd // several fans meet in one point
	case rims == 1:
		return rimmed
	}
	bend := math.Abs(2*math.Pi-f.total[v]) * f.longest[v] * f.longest[v] / f.area[v]
	if bend > flatBend && (bend > coneBend || f.besideFlat(s, v)) {
		return cone
	}
	return smooth
}

// besideFlat tells whether a neighbour of the inner vertex v is inner and flat.
func (f *frames) besideFlat(s *mesh.Surface, v int32) bool {
	for _, h := range f.out(v) {
		if math.Abs(2*math.Pi-f.total[s.Vert[next(h)]]) < 1e-8 {
			return true
		}
	}
	return false
}

// search is the least angle at an odd vertex q from a direction to an edge there,
// through any of the faces around; with outside, not through the face of the edge's own
// halfedge. +Inf if it is more than a half turn or out of reach.
func (f *frames) search(s *mesh.Surface, q int32, from float64, edge int32, outside bool) float64 {
	if math.IsNaN(from) {
		return math.Inf(1)
	}
	onTarget := func(h int32) bool {
		for g := h; ; {
			if g == edge {
				return true
			}
			if g = s.Glue[g]; g == h {
				return false
			}
		}
	}
	type step struct {
		via   int32 // halfedge, in the face just crossed, of the edge reached
		angle float64
	}
	i := int32(from / apart)
	c := f.out(q)[min(max(i, 0), int32(len(f.out(q)))-1)]
	in := from - f.at[c]
	stack := append(make([]step, 0, 16), step{c, in}, step{prev(c), f.wide[c] - in})
	least := math.Inf(1)
	for budget := 8 * len(f.out(q)); len(stack) > 0 && budget > 0; budget-- {
		e := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		if e.angle > math.Pi+1e-3 || e.angle >= least {
			continue
		}
		if onTarget(e.via) && !(outside && e.via == edge) {
			least = e.angle
			continue
		}
		for g := s.Glue[e.via]; g != e.via; g = s.Glue[g] {
			if s.Vert[g] == q {
				stack = append(stack, step{prev(g), e.angle + f.wide[g]})
			} else {
				stack = append(stack, step{next(g), e.angle + f.wide[next(g)]})
			}
		}
	}
	return least
}

// out lists the halfedges that leave v.
func (f *frames) out(v int32) []int32 { return f.corner[f.start[v]:f.start[v+1]] }

// turn is the angle at v from one direction counter-clockwise to another, both given
// in v's frame: +Inf where the boundary lies between, NaN where there is no frame. A
// hair less than nothing is nothing.
func (f *frames) turn(v int32, from, to float64) float64 {
	const hair = 1e-9
	gap := to - from
	switch f.kind[v] {
	case odd:
		return math.NaN()
	case rimmed:
		if gap < -hair {
			return math.Inf(1)
		}
		return max(gap, 0)
	}
	total := f.total[v]
	for gap < -hair {
		gap += total
	}
	for gap >= total-hair {
		gap -= total
	}
	gap = max(gap, 0)
	if f.kind[v] == smooth {
		gap *= 2 * math.Pi / total
	}
	return gap
}

// measureCurvature spreads the angle defects over the areas around: the Gaussian
// curvature of a curved skin, and 0 near the corners and on the flat faces of a part.
func (f *frames) measureCurvature(s *mesh.Surface, v int32, defect []float64) {
	if f.kind[v] != smooth && f.kind[v] != rimmed {
		return
	}
	sumDefect, sumArea, most := defect[v], f.area[v], math.Abs(defect[v])
	take := func(u int32) {
		sumDefect += defect[u]
		sumArea += f.area[u]
		most = max(most, math.Abs(defect[u]))
	}
	for _, h := range f.out(v) {
		take(s.Vert[next(h)])
		if s.Boundary(prev(h)) {
			take(s.Vert[prev(h)]) // no halfedge leads there
		}
	}
	if sumArea > 0 {
		f.curvature[v] = sumDefect / sumArea
	}
	f.turning[v] = min(most, mostTurning)
}
