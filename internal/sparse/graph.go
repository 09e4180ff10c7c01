package sparse

import (
	"math"
	"slices"
)

// graph is a pattern renumbered so that neighbours have near numbers.
type graph struct {
	ptr []int64
	adj []int32
	xyz []float32 // 3 a vertex, or nil; for choosing cuts only
}

func (g *graph) neighbours(v int32) []int32 { return g.adj[g.ptr[v]:g.ptr[v+1]] }

// renumber makes the graph of p whose vertex k is row near[k].
func renumber(p *Pattern, near []int32, xyz []float32, workers int) *graph {
	n := len(near)
	number := invert(near)
	g := &graph{ptr: make([]int64, n+1), adj: make([]int32, len(p.Adj))}
	for k, v := range near {
		g.ptr[k+1] = g.ptr[k] + p.Ptr[v+1] - p.Ptr[v]
	}
	if xyz != nil {
		g.xyz = make([]float32, 3*n)
	}
	const chunk = 1 << 14
	inParallel(workers, (n+chunk-1)/chunk, func(_, i int) {
		for k := i * chunk; k < min((i+1)*chunk, n); k++ {
			v := near[k]
			out := g.adj[g.ptr[k]:g.ptr[k+1]]
			for q, w := range p.Adj[p.Ptr[v]:p.Ptr[v+1]] {
				out[q] = number[w]
			}
			if xyz != nil {
				copy(g.xyz[3*k:3*k+3], xyz[3*v:3*v+3])
			}
		}
	})
	return g
}

// curveOrder sorts rows along a Morton curve through a cube of 2048³ cells (of 2 of them each; rows of a cell stay in their order. It also returns the coordinates, moved and scaled to lie between 0 and
// 2048. Both are nil if a coordinate is not finite.
func curveOrder(coords []float64) (near []int32, xyz []float32) {
	n := len(coords) / 3
	lo, hi := [3]float64{}, [3]float64{}
	for d := range 3 {
		lo[d], hi[d] = math.Inf(1), math.Inf(-1)
	}
	for i := 0; i < len(coords); i += 3 {
		for d := range 3 {
			c := coords[i+d]
			if math.IsNaN(c) || math.IsInf(c, 0) {
				return nil, nil
			}
			lo[d], hi[d] = min(lo[d], c), max(hi[d], c)
		}
	}
	side := max(hi[0]-lo[0], hi[1]-lo[1], hi[2]-lo[2])
	if math.IsInf(side, 0) {
		return nil, nil
	}
	scale := 0.0
	if side > 0 {
		scale = 2047.99 / side
	}
	if math.IsInf(scale, 0) {
		return nil, nil
	}
	xyz = make([]float32, 3*n)
	type entry struct{ key, row uint32 }
	a, b := make([]entry, n), make([]entry, n)
	for i := range a {
		key := uint64(0)
		for d := range 3 {
			c := (coords[3*i+d] - lo[d]) * scale
			xyz[3*i+d] = float32(c)
			key |= spread(uint32(c)) << d
		}
		a[i] = entry{uint32(key >> 1), uint32(i)}
	}
	for shift := 0; shift < 32; shift += 11 {
		var start [2048]int
		for _, e := range a {
			start[e.key>>shift&2047]++
		}
		sum := 0
		for k, c := range start {
			start[k] = sum
			sum += c
		}
		for _, e := range a {
			k := e.key >> shift & 2047
			b[start[k]] = e
			start[k]++
		}
		a, b = b, a
	}
	near = make([]int32, n)
	for i, e := range a {
		near[i] = int32(e.row)
	}
	return near, xyz
}

// spread puts two zeros after each of the low 11 bits of x.
func spread(x uint32) uint64 {
	v := uint64(x & 2047)
	v = (v | v<<16) & 0x001f0000ff0000ff
	v = (v | v<<8) & 0x100f00f00f00f00f
	v = (v | v<<4) & 0x10c30c30c30c30c3
	v = (v | v<<2) & 0x1249249249249249
	return v
}

// breadthFirstOrder numbers rows by breadth-first search from the first row of each component, a
// numbering that keeps neighbours near when there are no coordinates.
func breadthFirstOrder(p *Pattern) []int32 {
	n := p.Dim()
	near := make([]int32, 0, n)
	seen := make([]bool, n)
	for root := range n {
		if seen[root] {
			continue
		}
		seen[root] = true
		head := len(near)
		near = append(near, int32(root))
		for ; head < len(near); head++ {
			v := near[head]
			for _, w := range p.Adj[p.Ptr[v]:p.Ptr[v+1]] {
				if !seen[w] {
					seen[w] = true
					near = append(near, w)
				}
			}
		}
	}
	return near
}

func sortUnique(list *[]int32) {
	slices.Sort(*list)
	*list = slices.Compact(*list)
}

func search(list []int32, v int32) int {
	i, _ := slices.BinarySearch(list, v)
	return i
}
