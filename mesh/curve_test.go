package mesh

import (
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"testing"
)

// All triangles, each once, and neighbours in the list near each other on a plane: of
// n points in a square half of a Morton curve's steps, by their count in a grid, are to
// the next of √n cells on a side, a quarter to the next but one, and so on. In a random
// order hardly any step is that short.
func TestCurveKeepsNeighboursTogether(t *testing.T) {
	for _, crowd := range []float64{1, 1e-5} { // all evenly, and one half in a far corner
		x, triangles := randomTriangles(1<<14, crowd)
		order := (&Mesh{Positions: x, Triangles: triangles}).sortedAlongCurve()
		if !slices.Equal(slices.Sorted(slices.Values(order)), ascending(len(order))) {
			t.Fatal("the order is no permutation")
		}
		near := 0
		for i := range order[1:] {
			a, b := 3*3*order[i], 3*3*order[i+1] // first corner's coordinates
			cell := 1.0 / 128
			if x[a] < crowd && x[a+1] < crowd {
				cell *= crowd
			}
			if math.Hypot(x[a]-x[b], x[a+1]-x[b+1]) < 3*cell {
				near++
			}
		}
		if near < len(order)*8/10 {
			t.Errorf("crowd %g: %d of %d steps are short, want 8 of 10", crowd, near, len(order))
		}
	}
}

// randomTriangles are small triangles over the unit square, three corners each; crowd
// is the side of the corner square that half of them lie in.
func randomTriangles(count int, crowd float64) (x []float64, triangles []int32) {
	rng := rand.New(rand.NewPCG(5, 6))
	for i := range count {
		side := 1.0
		if i%2 == 1 {
			side = crowd
		}
		u, v := side*rng.Float64(), side*rng.Float64()
		x = append(x, u, v, 0, u+side/500, v, 0, u, v+side/500, 0)
		triangles = append(triangles, int32(3*i), int32(3*i+1), int32(3*i+2))
	}
	return x, triangles
}

func ascending(n int) []int32 {
	all := make([]int32, n)
	for i := range all {
		all[i] = int32(i)
	}
	return all
}

// glue against its definition, on random triangles: halfedges of one edge are linked in
// order of number, whatever the number of goroutines.
func TestGlueLinksEdges(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	const vertices, corners = 4000, 3 * 20000 // enough for several goroutines, and for edges of many faces
	triangles := make([]int32, corners)
	for f := 0; f < corners; f += 3 {
		a := rng.Int32N(vertices)
		triangles[f], triangles[f+1], triangles[f+2] = a, (a+1+rng.Int32N(8))%vertices, rng.Int32N(vertices)
		if rng.IntN(50) == 0 {
			triangles[f+2] = a // a repeated corner
		}
	}
	groups := map[[2]int32][]int32{}
	for h := range int32(corners) {
		f := h - h%3
		if triangles[f] == triangles[f+1] || triangles[f+1] == triangles[f+2] || triangles[f+2] == triangles[f] {
			continue
		}
		a, b := triangles[h], triangles[next(h)]
		key := [2]int32{min(a, b), max(a, b)}
		groups[key] = append(groups[key], h)
	}
	want := ascending(corners)
	for _, g := range groups {
		for i, h := range g {
			want[h] = g[(i+1)%len(g)]
		}
	}
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	for _, workers := range []int{1, 3, 8} {
		runtime.GOMAXPROCS(workers)
		if got := glue(triangles, vertices); !slices.Equal(got, want) {
			t.Errorf("%d goroutines: another result than the definition's", workers)
		}
	}
}

// A surface and its operators are the same to the last bit for any number of
// goroutines, and renumbering only gives vertices other numbers.
func TestSurfaceDoesNotDependOnGoroutines(t *testing.T) {
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	x, triangles := wavyPlate(90)
	var first *Surface
	for _, workers := range []int{1, 3, 8} {
		runtime.GOMAXPROCS(workers)
		s, err := NewSurface(&Mesh{Positions: x, Triangles: triangles})
		if err != nil {
			t.Fatal(err)
		}
		s.Delaunay(1 << 20)
		if first == nil {
			first = s
		}
		if !slices.Equal(s.Vert, first.Vert) || !slices.Equal(s.Glue, first.Glue) || !slices.Equal(s.Length, first.Length) {
			t.Errorf("%d goroutines: another triangulation", workers)
		}
		a, b := s.Laplacian(), first.Laplacian()
		if !slices.Equal(a.Off, b.Off) || !slices.Equal(a.Adj, b.Adj) || !slices.Equal(a.Diag, b.Diag) {
			t.Errorf("%d goroutines: another Laplacian", workers)
		}
	}
	r, vertex := first.Renumbered()
	for h, v := range r.Vert {
		if vertex[v] != first.Vert[h] {
			t.Fatalf("halfedge %d leaves %d, which was %d, want %d", h, v, vertex[v], first.Vert[h])
		}
	}
	for v, old := range vertex {
		if (v < r.NumOriginal) != (int(old) < first.NumOriginal) {
			t.Fatalf("vertex %d was %d: added ones must stay behind", v, old)
		}
		if r.NoValue[v] != first.NoValue[old] || r.Positions[3*v] != first.Positions[3*old] {
			t.Fatalf("vertex %d has not the data of %d", v, old)
		}
	}
}

// wavyPlate is a grid of n by n quads in random order, folded into steep waves so that
// edges must be flipped, and with a vertex in no triangle.
func wavyPlate(n int) (x []float64, triangles []int32) {
	rng := rand.New(rand.NewPCG(9, 10))
	x = []float64{9, 9, 9}
	for i := range n + 1 {
		for j := range n + 1 {
			u, v := float64(i)+0.6*rng.Float64(), float64(j)+0.6*rng.Float64()
			x = append(x, u, v, 3*math.Sin(u/3))
		}
	}
	at := func(i, j int) int32 { return int32(1 + i*(n+1) + j) }
	for _, k := range rng.Perm(n * n) {
		i, j := k/n, k%n
		triangles = append(triangles, at(i, j), at(i+1, j), at(i+1, j+1), at(i, j), at(i+1, j+1), at(i, j+1))
	}
	return x, triangles
}
