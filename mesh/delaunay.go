package mesh

import (
	"math"
	"slices"

	"heatskin/internal/parallel"
)

// weightFloor is how far below zero, against the size of its cotangents, an edge
// weight may lie before it counts as negative: a right angle built by splitting an
// edge at the foot of a height rounds to either side.
const weightFloor = 1e-10

// Delaunay flips edges until the triangulation is intrinsic Delaunay (A. Bobenko and
// B. Springborn, Discrete Comput. Geom. 38, 2007), so that every cotangent weight is
// at least 0. Edges that may not be flipped (boundary, more than two faces, a datum,
// faces of different tensors) and whose weight is negative are split at the foot of a height. Both leave the
// metric as it is. At most budget edges are split; what is left is in Unmended.
func (s *Surface) Delaunay(budget int) {
	l := s.newLegaliser(budget)
	// One halfedge of each edge with two faces; more of stranger ones do no harm.
	wrong := parallel.Gather(len(s.Vert), func(h int32) bool { return s.Glue[h] >= h && s.negative(h) })
	for _, h := range slices.Backward(wrong) {
		l.push(h)
	}
	s.Unmended = 0
	l.run()
	for f := range s.parent {
		s.parent[f] = -1
	}
}

// A legaliser makes edges Delaunay, and whatever edges that upsets.
type legaliser struct {
	s         *Surface
	queue     []int32
	queued    []bool  // by halfedge
	faces     []int32 // around an edge that is split
	least     float64 // shorter edges are not split: heights between flat triangles can run into a corner
	mostFlips int
	budget    int // edges that may be split
}

func (s *Surface) newLegaliser(budget int) *legaliser {
	return &legaliser{
		s: s, queued: make([]bool, len(s.Vert)),
		// Each flip lowers the Dirichlet energy of every function, so flips end; rounding
		// could undo that on a face without area: the bound makes sure.
		mostFlips: s.Flips + 200*(len(s.Vert)+1000),
		budget:    budget,
		least:     1e-10 * slices.Max(s.Length),
	}
}

func (l *legaliser) push(h int32) {
	for int(h) >= len(l.queued) {
		l.queued = append(l.queued, false)
	}
	if !l.queued[h] {
		l.queued[h] = true
		l.queue = append(l.queue, h)
	}
}

func (l *legaliser) run() {
	s := l.s
	for len(l.queue) > 0 {
		h := l.queue[len(l.queue)-1]
		l.queue = l.queue[:len(l.queue)-1]
		l.queued[h] = false
		if !s.negative(h) {
			continue
		}
		if g := s.Opposite(h); g >= 0 && s.mark[h] == 0 && s.alike(h, g) && s.Flips < l.mostFlips {
			s.flip(h, g)
			s.Flips++
			for _, k := range [4]int32{h, prev(h), g, prev(g)} {
				l.push(k)
			}
			continue
		}
		if s.Splits >= l.budget || s.Length[h] < l.least {
			s.Unmended++
			continue
		}
		obtuse := h
		for g := s.Glue[h]; g != h; g = s.Glue[g] {
			if s.cot[g] < s.cot[obtuse] {
				obtuse = g
			}
		}
		foot, _ := s.apex(obtuse)
		l.split(obtuse, foot)
		s.Splits++
	}
}

// split puts a vertex on the edge of h and has all edges around it looked at.
func (l *legaliser) split(h int32, at float64) {
	s := l.s
	e := s.Length[h]
	at = min(max(at, 1e-3*e), 0.999*e) // a needle would only beget more
	grown := int32(len(s.Vert))
	l.faces = append(l.faces[:0], h/3)
	for g := s.Glue[h]; g != h; g = s.Glue[g] {
		l.faces = append(l.faces, g/3)
	}
	s.splitEdge(h, at)
	for f := grown / 3; f < int32(len(s.Vert)/3); f++ {
		l.faces = append(l.faces, f)
	}
	for _, f := range l.faces {
		for k := 3 * f; k < 3*f+3; k++ {
			l.push(k)
		}
	}
}

// Weight is the cotangent weight of the edge of h: half the sum, over its faces, of
// the cotangents of the opposite angles.
func (s *Surface) Weight(h int32) float64 {
	sum := s.pull(h)
	for g := s.Glue[h]; g != h; g = s.Glue[g] {
		sum += s.pull(g)
	}
	return sum / 2
}

// alike tells whether the faces of h and g, two of one edge, have the same density and
// agree on its length: a flip would mix them.
func (s *Surface) alike(h, g int32) bool {
	return s.Density == nil || s.Density[h/3] == s.Density[g/3] && s.Length[h] == s.Length[g]
}

func (s *Surface) negative(h int32) bool {
	if s.Density != nil {
		return s.negativeWith(s.Density, h)
	}
	sum, size := s.cot[h], math.Abs(s.cot[h])
	for g := s.Glue[h]; g != h; g = s.Glue[g] {
		sum += s.cot[g]
		size += math.Abs(s.cot[g])
	}
	return sum < -weightFloor*(1+size)
}

func (s *Surface) negativeWith(density []float64, h int32) bool {
	sum, size := s.pull(h), density[h/3]+math.Abs(s.pull(h))
	for g := s.Glue[h]; g != h; g = s.Glue[g] {
		sum += s.pull(g)
		size += math.Abs(s.pull(g))
	}
	return sum < -weightFloor*size
}

// apex places the corner opposite h in the frame whose origin is the tail of h and
// whose first axis runs along h.
func (s *Surface) apex(h int32) (x, y float64) {
	e, a, b := s.Length[h], s.Length[next(h)], s.Length[prev(h)]
	x = (e + (b-a)*(b+a)/e) / 2
	return x, 2 * triangleArea(e, a, b) / e
}

// flip replaces the edge of h and g = Opposite(h), the diagonal of a quadrilateral
// i l j k with h: i→j, by the other diagonal. Afterwards
//
//	h: i→l, next(h): l→k, prev(h): k→i    and    g: j→k, next(g): k→l, prev(g): l→j.
func (s *Surface) flip(h, g int32) {
	h1, g1 := next(h), next(g)
	xk, yk := s.apex(h)
	xl, yl := s.apex(g) // from j, against the direction of h
	diagonal := fit(math.Hypot(xk-(s.Length[h]-xl), yk+yl), s.Length[g1], s.Length[prev(h)], s.Length[h1], s.Length[prev(g)])
	k, l := s.Vert[prev(h)], s.Vert[prev(g)]

	// Two outer halfedges change places: g1 (i→l) goes to h, and h1 (j→k) to g.
	moved := func(x int32) int32 {
		switch x {
		case g1:
			return h
		case h1:
			return g
		}
		return x
	}
	beforeG1, afterG1 := s.before(g1), s.Glue[g1]
	beforeH1, afterH1 := s.before(h1), s.Glue[h1]
	s.Length[h], s.Length[g] = s.Length[g1], s.Length[h1]
	s.mark[h], s.mark[g] = s.mark[g1], s.mark[h1]
	s.Glue[moved(beforeG1)], s.Glue[h] = h, moved(afterG1)
	s.Glue[moved(beforeH1)], s.Glue[g] = g, moved(afterH1)
	s.Length[h1], s.Length[g1] = diagonal, diagonal
	s.mark[h1], s.mark[g1] = 0, 0
	s.Glue[h1], s.Glue[g1] = g1, h1
	s.Vert[h1], s.Vert[g1] = l, k
	s.setCotangents(h / 3)
	s.setCotangents(g / 3)
}

// fit moves the length of a new edge by what rounding may have put it off, so that the
// triangles that it makes with the pairs of edges (a, b) and (c, d) keep a slack.
func fit(length, a, b, c, d float64) float64 {
	longest := max(a, b, c, d)
	least := max(math.Abs(a-b), math.Abs(c-d)) + 2*slackFloor*longest
	most := min(a+b, c+d) * (1 - 2*slackFloor)
	return min(max(length, least), max(least, most))
}

// before is the halfedge whose Glue is h.
func (s *Surface) before(h int32) int32 {
	p := h
	for s.Glue[p] != h {
		p = s.Glue[p]
	}
	return p
}

// splitEdge puts a new vertex on the edge of h, at the given length from its tail,
// and joins it to the opposite corner of every face around. Each face keeps the part
// at its halfedge's tail; the other part becomes a new face.
func (s *Surface) splitEdge(h int32, at float64) int32 {
	e := s.Length[h]
	tail, head := s.Vert[h], s.head(h)
	m := s.addVertex()
	t := at / e
	for axis := range int32(3) {
		s.Positions[3*m+axis] = (1-t)*s.Positions[3*tail+axis] + t*s.Positions[3*head+axis]
	}
	around := []int32{h}
	for g := s.Glue[h]; g != h; g = s.Glue[g] {
		around = append(around, g)
	}
	near := make([]int32, len(around)) // in each face, the halfedge of the part tail–m
	far := make([]int32, len(around))  // and of the part m–head
	for i, g := range around {
		along := s.Vert[g] == tail
		own := s.Length[g]
		from := at * (own / e)
		if !along {
			from = own - from
		}
		x, y := s.apex(g)
		spoke := fit(math.Hypot(from-x, y), from, s.Length[prev(g)], own-from, s.Length[next(g)])
		g2 := s.cutFace(g, m, spoke)
		s.Length[g], s.Length[g2] = from, own-from
		s.mark[g2] = s.mark[g]
		s.setCotangents(g / 3)
		s.setCotangents(g2 / 3)
		near[i], far[i] = g, g2
		if !along {
			near[i], far[i] = g2, g
		}
	}
	for i := range around {
		j := (i + 1) % len(around)
		s.Glue[near[i]], s.Glue[far[i]] = near[j], far[j]
	}
	return m
}

// cutFace cuts the face of g: i→j, with apex k, into (i, m, k), which keeps the
// place of the old face, and (m, j, k), whose halfedge m→j it returns.
func (s *Surface) cutFace(g, m int32, spoke float64) int32 {
	j, k := s.head(g), s.Vert[prev(g)]
	jk := next(g)
	f := int32(len(s.Vert))
	s.Vert = append(s.Vert, m, j, k)
	s.Length = append(s.Length, 0, s.Length[jk], spoke)
	s.Glue = append(s.Glue, f, f+1, f+2)
	s.mark = append(s.mark, 0, s.mark[jk], 0)
	s.cot = append(s.cot, 0, 0, 0)
	s.parent = append(s.parent, s.parent[g/3])
	s.inheritDensity(g / 3)
	s.moveGlue(jk, f+1) // the outer halfedge j→k; its place becomes m→k
	s.Vert[jk] = m
	s.Length[jk] = spoke
	s.mark[jk] = 0
	s.Glue[jk], s.Glue[f+2] = f+2, jk
	return f
}

// inheritDensity gives a new face the density of face f, which it is cut from.
func (s *Surface) inheritDensity(f int32) {
	if s.Density != nil {
		s.Density = append(s.Density, s.Density[f])
	}
}

func (s *Surface) addVertex() int32 {
	s.NumVertices++
	s.Positions = append(s.Positions, 0, 0, 0)
	s.NoValue = append(s.NoValue, false)
	return int32(s.NumVertices - 1)
}
