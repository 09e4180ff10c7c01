package mesh

import (
	"slices"

	"heatskin/internal/sparse"
)

// Laplacian is the positive semi-definite cotangent matrix L of the surface: with w
// the cotangent weight of an edge, L[i][j] = -w and L[i][i] is the sum of the weights
// at i, so that u·Lu is the Dirichlet energy of the piecewise linear u (R. Duffin, J.
// Math. Mech. 8, 1959; U. Pinkall and K. Polthier, Exp. Math. 2, 1993). Loops add
// nothing, and edges that join the same vertices add up. After Delaunay no weight is
// negative: one that rounding left a hair below 0 is set to 0. Vertices without faces
// have empty rows. O(n).
func (s *Surface) Laplacian() *sparse.Matrix {
	pattern, place := s.pattern()
	l := &sparse.Matrix{Pattern: pattern, Diag: make([]float64, s.NumVertices), Off: make([]float64, len(pattern.Adj))}
	for h := range int32(len(s.Vert)) {
		k := place[h]
		if k < 0 {
			continue
		}
		l.Off[k] -= s.cot[h] / 2
	}
	s.mirror(l, place)
	for k, w := range l.Off {
		if w > 0 && w <= 1e-6 && s.Unmended == 0 {
			l.Off[k] = 0
		}
	}
	for i := range l.Diag {
		for _, w := range l.Off[l.Ptr[i]:l.Ptr[i+1]] {
			l.Diag[i] -= w
		}
	}
	return l
}

// LumpedMass gives each vertex a third of the area of its triangles (by corner).
func (s *Surface) LumpedMass() []float64 {
	m := make([]float64, s.NumVertices)
	for f := range int32(s.NumFaces()) {
		third := s.Area(f) / 3
		for h := 3 * f; h < 3*f+3; h++ {
			m[s.Vert[h]] += third
		}
	}
	return m
}

// ConsistentMass is the mass matrix of piecewise linear functions on the pattern of
// Laplacian: a triangle of area A adds A/6 for each of its corners and A/12 for each
// pair.
func (s *Surface) ConsistentMass() *sparse.Matrix {
	pattern, place := s.pattern()
	m := &sparse.Matrix{Pattern: pattern, Diag: make([]float64, s.NumVertices), Off: make([]float64, len(pattern.Adj))}
	for f := range int32(s.NumFaces()) {
		area := s.Area(f)
		for h := 3 * f; h < 3*f+3; h++ {
			m.Diag[s.Vert[h]] += area / 6
			if k := place[h]; k >= 0 {
				m.Off[k] += area / 12
			} else {
				m.Diag[s.Vert[h]] += area / 6 // a loop: both ends are this vertex
			}
		}
	}
	s.mirror(m, place)
	return m
}

// pattern finds who neighbours whom. place[h] is the entry, in the row of the smaller
// end of halfedge h, that its edge adds to; -1 for a loop.
func (s *Surface) pattern() (p *sparse.Pattern, place []int64) {
	n := s.NumVertices
	// Rows with repetitions first: each face names its edges once from either end.
	start := make([]int64, n+1)
	for h := range int32(len(s.Vert)) {
		if a, b := s.Vert[h], s.head(h); a != b {
			start[a+1]++
			start[b+1]++
		}
	}
	for v := range n {
		start[v+1] += start[v]
	}
	raw := make([]int32, start[n])
	fill := slices.Clone(start[:n])
	for h := range int32(len(s.Vert)) {
		if a, b := s.Vert[h], s.head(h); a != b {
			raw[fill[a]], raw[fill[b]] = b, a
			fill[a]++
			fill[b]++
		}
	}
	p = &sparse.Pattern{Ptr: make([]int64, n+1)}
	used := int64(0)
	for v := range n {
		row := raw[start[v]:start[v+1]]
		slices.Sort(row)
		row = slices.Compact(row)
		p.Ptr[v] = used
		used += int64(copy(raw[used:], row)) // never overtakes the rows still to come
	}
	p.Ptr[n] = used
	p.Adj = slices.Clone(raw[:used]) // lets the longer array go
	place = make([]int64, len(s.Vert))
	for h := range int32(len(s.Vert)) {
		a, b := s.Vert[h], s.head(h)
		place[h] = -1
		if a != b {
			place[h] = p.Find(min(a, b), max(a, b))
		}
	}
	return p, place
}

// mirror copies the entries that were summed in the row of an edge's smaller end to
// the row of its larger end.
func (s *Surface) mirror(a *sparse.Matrix, place []int64) {
	for h := range int32(len(s.Vert)) {
		if k := place[h]; k >= 0 {
			v, w := s.Vert[h], s.head(h)
			a.Off[a.Find(max(v, w), min(v, w))] = a.Off[k]
		}
	}
}

// Components numbers the connected parts of the surface, in the order of their first
// vertex. comp is -1 at vertices that no face touches.
func (s *Surface) Components() (comp []int32, count int) {
	root := make([]int32, s.NumVertices)
	for v := range root {
		root[v] = int32(v)
	}
	find := func(v int32) int32 {
		for root[v] != v {
			root[v] = root[root[v]]
			v = root[v]
		}
		return v
	}
	touched := make([]bool, s.NumVertices)
	for h := range int32(len(s.Vert)) {
		touched[s.Vert[h]] = true
		if a, b := find(s.Vert[h]), find(s.head(h)); a != b {
			root[max(a, b)] = min(a, b)
		}
	}
	comp = make([]int32, s.NumVertices)
	for v := range int32(s.NumVertices) {
		switch r := find(v); {
		case !touched[v]:
			comp[v] = -1
		case r == v:
			comp[v] = int32(count)
			count++
		default:
			comp[v] = comp[r]
		}
	}
	return comp, count
}

// Load spreads one unit of heat over the data and returns the amount at each vertex:
// every datum has an equal share, and edges share theirs in proportion to length.
func (s *Surface) Load(data []Datum) []float64 {
	load := make([]float64, s.NumVertices)
	share := 1 / float64(len(data))
	for i := range data {
		if v := s.sites[i]; v >= 0 {
			load[v] += share
			continue
		}
		total := 0.0
		s.eachDatumEdge(i, func(_ int32, length float64) { total += length })
		s.eachDatumEdge(i, func(h int32, length float64) {
			load[s.Vert[h]] += share * length / (2 * total)
			load[s.head(h)] += share * length / (2 * total)
		})
	}
	return load
}

// eachDatumEdge calls do once for every edge of datum i.
func (s *Surface) eachDatumEdge(i int, do func(h int32, length float64)) {
	for h := range int32(len(s.Vert)) {
		if s.mark[h] <= 0 || !s.OnDatum(h, i) {
			continue
		}
		first := h
		for g := s.Glue[h]; g != h; g = s.Glue[g] {
			first = min(first, g)
		}
		if first == h {
			do(h, s.Length[h])
		}
	}
}
