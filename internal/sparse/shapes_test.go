package sparse

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// shape is a graph that ordering or factorisation might trip over.
type shape struct {
	name   string
	n      int
	edges  [][2]int32
	coords []float64
}

func shapes() []shape {
	rng := rand.New(rand.NewPCG(21, 22))
	path := func(n int) (e [][2]int32) {
		for i := range n - 1 {
			e = append(e, [2]int32{int32(i), int32(i + 1)})
		}
		return e
	}
	star := func(n int) (e [][2]int32) {
		for i := 1; i < n; i++ {
			e = append(e, [2]int32{0, int32(i)})
		}
		return e
	}
	complete := func(n int) (e [][2]int32) {
		for i := range n {
			for j := range i {
				e = append(e, [2]int32{int32(i), int32(j)})
			}
		}
		return e
	}
	random := func(n, count int) (e [][2]int32) {
		for len(e) < count {
			if a, b := rng.IntN(n), rng.IntN(n); a != b {
				e = append(e, [2]int32{int32(a), int32(b)})
			}
		}
		return e
	}
	line := func(n int, f func(i int) [3]float64) []float64 {
		c := make([]float64, 0, 3*n)
		for i := range n {
			p := f(i)
			c = append(c, p[:]...)
		}
		return c
	}
	wheel := append(star(3000), path(3000)...) // the apex of a cone
	var copies [][2]int32
	sphere, edges := icosphere(1)
	for k := range 500 {
		for _, e := range edges {
			copies = append(copies, [2]int32{e[0] + int32(42*k), e[1] + int32(42*k)})
		}
	}
	spheres := make([]float64, 0, 500*len(sphere))
	for range 500 {
		spheres = append(spheres, sphere...) // all in one place: coordinates are no help
	}
	tree := make([][2]int32, 0, 5000)
	for i := 1; i < 5000; i++ {
		tree = append(tree, [2]int32{int32(i), int32(rng.IntN(i))})
	}
	nan := line(900, func(i int) [3]float64 { return [3]float64{float64(i), math.NaN(), 0} })
	huge := line(900, func(i int) [3]float64 {
		return [3]float64{1e308 * float64(i%30-15) / 15, -1e308 * float64(i/30-15) / 15, 0}
	})
	flat := line(900, func(i int) [3]float64 { return [3]float64{1, 2, 3} })
	tiny := line(900, func(i int) [3]float64 { return [3]float64{float64(i%30) * 5e-324, float64(i/30) * 5e-324, 0} })
	plate := gridEdges(30, 30)
	return []shape{
		{name: "nothing"},
		{name: "one vertex", n: 1},
		{name: "one edge", n: 2, edges: path(2)},
		{name: "no edges", n: 5000},
		{name: "path", n: 5000, edges: path(5000)},
		{name: "star", n: 5000, edges: star(5000)},
		{name: "wheel", n: 3000, edges: wheel},
		{name: "complete", n: 300, edges: complete(300)},
		{name: "tree", n: 5000, edges: tree},
		{name: "random, sparse", n: 2000, edges: random(2000, 2100)},
		{name: "random, without good separators", n: 1500, edges: random(1500, 6000)},
		{name: "500 components in one place", n: 21000, edges: copies, coords: spheres},
		{name: "grid", n: 900, edges: plate},
		{name: "grid, coordinates not numbers", n: 900, edges: plate, coords: nan},
		{name: "grid, coordinates at the end of the range", n: 900, edges: plate, coords: huge},
		{name: "grid, coordinates all equal", n: 900, edges: plate, coords: flat},
		{name: "grid, coordinates below the range", n: 900, edges: plate, coords: tiny},
		{name: "strip", n: 6000, edges: gridEdges(3, 2000)},
	}
}

func gridEdges(nx, ny int) (e [][2]int32) {
	for y := range ny {
		for x := range nx {
			v := int32(y*nx + x)
			if x+1 < nx {
				e = append(e, [2]int32{v, v + 1})
			}
			if y+1 < ny {
				e = append(e, [2]int32{v, v + int32(nx)})
			}
		}
	}
	return e
}

// The order has to be a permutation, the solution right. Row sums of these matrices are 0.01, so the solution for a
// constant right side is constant: 100 times as large. The condition number is at most 2·(largest
// degree)/0.01; times 2^-53 it bounds the error after a refinement with exact residuals, which is the case
// where the backward error was not below 2^-52 already: hence four times as much.
func TestShapes(t *testing.T) {
	for _, s := range shapes() {
		t.Run(s.name, func(t *testing.T) {
			m := fromEdges(s.n, s.edges, unit, 0.01)
			a := mustAnalyze(t, m.Pattern, Options{Coords: s.coords})
			sorted := slices.Clone(a.perm)
			slices.Sort(sorted)
			for i, v := range sorted {
				if int(v) != i {
					t.Fatalf("the order is not a permutation: %d in place of %d", v, i)
				}
			}
			f := a.NewFactor()
			mustFactorize(t, f, m, nil)
			b, x := make([]float64, s.n), make([]float64, s.n)
			for i := range b {
				b[i] = 1
			}
			if e := f.SolveRefinedTo(x, b); e > 1e-15 {
				t.Errorf("backward error %g", e)
			}
			degree := 0.0
			for i := range m.Diag {
				degree = max(degree, m.Diag[i])
			}
			for i, v := range x {
				if math.Abs(v-100) > 4*100*2*degree/0.01*0x1p-53 {
					t.Fatalf("x[%d] = %v, want 100", i, v)
				}
			}
		})
	}
}
