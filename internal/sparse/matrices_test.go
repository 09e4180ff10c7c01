package sparse

import (
	"math"
	"math/rand/v2"
	"slices"
)

// fromEdges makes the matrix of a weighted graph: minus each weight off the diagonal, and the sum of
// its weights plus extra on it.
func fromEdges(n int, edges [][2]int32, weight func(e int) float64, extra float64) *Matrix {
	type entry struct {
		row, col int32
		value    float64
	}
	entries := make([]entry, 0, 2*len(edges))
	m := &Matrix{Pattern: &Pattern{Ptr: make([]int64, n+1)}, Diag: make([]float64, n)}
	for i := range m.Diag {
		m.Diag[i] = extra
	}
	for e, v := range edges {
		w := weight(e)
		entries = append(entries, entry{v[0], v[1], -w}, entry{v[1], v[0], -w})
		m.Diag[v[0]] += w
		m.Diag[v[1]] += w
	}
	slices.SortFunc(entries, func(a, b entry) int {
		if a.row != b.row {
			return int(a.row - b.row)
		}
		return int(a.col - b.col)
	})
	for k, e := range entries {
		if k > 0 && entries[k-1].row == e.row && entries[k-1].col == e.col {
			m.Off[len(m.Off)-1] += e.value
			continue
		}
		m.Adj = append(m.Adj, e.col)
		m.Off = append(m.Off, e.value)
		m.Ptr[e.row+1]++
	}
	for i := range n {
		m.Ptr[i+1] += m.Ptr[i]
	}
	return m
}

func unit(int) float64 { return 1 }

// icosphere subdivides an icosahedron, shakes the points by a quarter of an edge, and numbers them at random. It
// returns the coordinates and the edges.
func icosphere(levels int) (coords []float64, edges [][2]int32) {
	rng := rand.New(rand.NewPCG(1, uint64(levels)))
	g := (1 + math.Sqrt(5)) / 2
	points := [][3]float64{{-1, g, 0}, {1, g, 0}, {-1, -g, 0}, {1, -g, 0}, {0, -1, g}, {0, 1, g},
		{0, -1, -g}, {0, 1, -g}, {g, 0, -1}, {g, 0, 1}, {-g, 0, -1}, {-g, 0, 1}}
	faces := [][3]int32{{0, 11, 5}, {0, 5, 1}, {0, 1, 7}, {0, 7, 10}, {0, 10, 11}, {1, 5, 9}, {5, 11, 4}, {11, 10, 2}, {10, 7, 6}, {7, 1, 8},
		{3, 9, 4}, {3, 4, 2}, {3, 2, 6}, {3, 6, 8}, {3, 8, 9}, {4, 9, 5}, {2, 4, 11}, {6, 2, 10}, {8, 6, 7}, {9, 8, 1}}
	unitLength := func(p [3]float64) [3]float64 {
		l := math.Sqrt(p[0]*p[0] + p[1]*p[1] + p[2]*p[2])
		return [3]float64{p[0] / l, p[1] / l, p[2] / l}
	}
	for i := range points {
		points[i] = unitLength(points[i])
	}
	for range levels {
		middle := make(map[[2]int32]int32, 3*len(faces)/2)
		mid := func(a, b int32) int32 {
			if a > b {
				a, b = b, a
			}
			k, ok := middle[[2]int32{a, b}]
			if !ok {
				p, q := points[a], points[b]
				k = int32(len(points))
				points = append(points, unitLength([3]float64{p[0] + q[0], p[1] + q[1], p[2] + q[2]}))
				middle[[2]int32{a, b}] = k
			}
			return k
		}
		finer := make([][3]int32, 0, 4*len(faces))
		for _, f := range faces {
			a, b, c := mid(f[0], f[1]), mid(f[1], f[2]), mid(f[2], f[0])
			finer = append(finer, [3]int32{f[0], a, c}, [3]int32{f[1], b, a}, [3]int32{f[2], c, b}, [3]int32{a, b, c})
		}
		faces = finer
	}
	number := make([]int32, len(points))
	for i, k := range rng.Perm(len(points)) {
		number[i] = int32(k)
	}
	h := 1.1 / math.Pow(2, float64(levels))
	coords = make([]float64, 3*len(points))
	for i, p := range points {
		for d := range 3 {
			p[d] += 0.25 * h * (2*rng.Float64() - 1)
		}
		p = unitLength(p)
		copy(coords[3*number[i]:], p[:])
	}
	for _, f := range faces {
		for k := range 3 {
			if a, b := number[f[k]], number[f[(k+1)%3]]; a < b {
				edges = append(edges, [2]int32{a, b})
			}
		}
	}
	return coords, edges
}
