package mesh

import (
	"slices"

	"heatskin/internal/parallel"
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
	l := s.assemble(func(h int32) float64 { return -s.pull(h) / 2 })
	rounding := 1e-6
	if s.Density != nil {
		rounding *= slices.Max(s.Density)
	}
	parallel.EachBlock(s.NumVertices, func(_, lo, hi int) {
		for i := lo; i < hi; i++ {
			row := l.Off[l.Ptr[i]:l.Ptr[i+1]]
			for k, w := range row {
				if w > 0 && w <= rounding && s.Unmended == 0 {
					row[k] = 0
				}
			}
			for _, w := range row {
				l.Diag[i] -= w
			}
		}
	})
	return l
}

// LumpedMass gives each vertex a third of the area of its triangles (by corner).
func (s *Surface) LumpedMass() []float64 {
	m := make([]float64, s.NumVertices)
	for f, area := range s.areas() {
		for _, v := range s.Vert[3*f : 3*f+3] {
			m[v] += area / 3
		}
	}
	return m
}

// areas are those of the faces.
func (s *Surface) areas() []float64 {
	areas := make([]float64, s.NumFaces())
	parallel.EachBlock(len(areas), func(_, lo, hi int) {
		for f := lo; f < hi; f++ {
			areas[f] = s.Area(int32(f))
		}
	})
	return areas
}

// ConsistentMass is the mass matrix of piecewise linear functions on the pattern of
// Laplacian: a triangle of area A adds A/6 for each of its corners and A/12 for each
// pair.
func (s *Surface) ConsistentMass() *sparse.Matrix {
	areas := s.areas()
	m := s.assemble(func(h int32) float64 { return areas[h/3] / 12 })
	for h := range int32(len(s.Vert)) {
		v := s.Vert[h]
		m.Diag[v] += areas[h/3] / 6
		if v == s.head(h) {
			m.Diag[v] += areas[h/3] / 6 // a loop: both ends are this vertex
		}
	}
	return m
}

// assemble is the matrix whose entry (i, j) is the sum of share(h) over the halfedges
// between i and j, either way; its diagonal is 0. Each row is summed on its own, but in
// the order of halfedges, which is why the matrix is symmetric to the last bit.
func (s *Surface) assemble(share func(h int32) float64) *sparse.Matrix {
	n := s.NumVertices
	start, leaving := s.leaving()
	ptr := make([]int64, n+1)
	type block struct {
		adj []int32
		off []float64
	}
	blocks := make([]block, parallel.NumBlocks(n))
	parallel.EachBlock(n, func(number, lo, hi int) {
		b := block{make([]int32, 0, 7*(hi-lo)), make([]float64, 0, 7*(hi-lo))}
		var keys []uint64 // other end << 32 | halfedge
		for v := int32(lo); v < int32(hi); v++ {
			keys = keys[:0]
			for _, h := range leaving[start[v]:start[v+1]] {
				g := prev(h)
				if to := s.head(h); to != v {
					keys = append(keys, uint64(to)<<32|uint64(h))
				}
				if from := s.Vert[g]; from != v {
					keys = append(keys, uint64(from)<<32|uint64(g))
				}
			}
			sortShort(keys)
			for i, key := range keys {
				if i == 0 || key>>32 != keys[i-1]>>32 {
					b.adj, b.off = append(b.adj, int32(key>>32)), append(b.off, 0)
					ptr[v+1]++
				}
				b.off[len(b.off)-1] += share(int32(uint32(key)))
			}
		}
		blocks[number] = b
	})
	for v := range n {
		ptr[v+1] += ptr[v]
	}
	a := &sparse.Matrix{
		Pattern: &sparse.Pattern{Ptr: ptr, Adj: make([]int32, ptr[n])},
		Diag:    make([]float64, n),
		Off:     make([]float64, ptr[n]),
	}
	parallel.EachBlock(n, func(number, lo, _ int) {
		copy(a.Adj[ptr[lo]:], blocks[number].adj)
		copy(a.Off[ptr[lo]:], blocks[number].off)
		blocks[number] = block{}
	})
	return a
}

// leaving lists the halfedges that leave each vertex v, in rising order, as
// halfedges[start[v]:start[v+1]].
func (s *Surface) leaving() (start, halfedges []int32) {
	start = make([]int32, s.NumVertices+1)
	for _, v := range s.Vert {
		start[v+1]++
	}
	for v := range s.NumVertices {
		start[v+1] += start[v]
	}
	halfedges = make([]int32, len(s.Vert))
	fill := slices.Clone(start)
	for h, v := range s.Vert {
		halfedges[fill[v]] = int32(h)
		fill[v]++
	}
	return start, halfedges
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
			do(h, s.LengthInSpace(h))
		}
	}
}
