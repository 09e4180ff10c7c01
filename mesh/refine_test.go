package mesh_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// pillow is two squares that lie on each other and share their rim, cut along
// different diagonals: closed, without thickness.
func pillow() *mesh.Mesh {
	return &mesh.Mesh{
		Positions: []float64{0, 0, 0, 1, 0, 0, 1, 1, 0, 0, 1, 0},
		Triangles: []int32{0, 1, 2, 0, 2, 3, 1, 0, 3, 1, 3, 2},
	}
}

// The refined mesh is the same surface: area, Euler characteristic, boundary, creases
// and what meets at them stay; new vertices lie on the old surface; edges are short.
func TestRefineKeepsTheSurface(t *testing.T) {
	bracket, _ := meshtest.Bracket(12, 8)
	for _, tc := range []struct {
		name string
		m    *mesh.Mesh
		h    float64
	}{
		{"box", meshtest.Box(2, 1, 0.5, [3]int{1, 1, 1}, 0, 0), 0.07},
		{"box-rotated", meshtest.Rotate(meshtest.Box(2, 1, 0.5, [3]int{1, 1, 1}, 0, 0), [3]float64{1, 2, 3}, 1), 0.07},
		{"box-reversed", meshtest.Reverse(meshtest.Box(2, 1, 0.5, [3]int{2, 2, 2}, 0, 0), 0.5, 1), 0.07},
		{"bracket", bracket, 2},
		{"bracket-single", single(meshtest.Rotate(bracket, [3]float64{1, 2, 3}, 1)), 2},
		{"sphere", meshtest.ShakenSphere(2, 1), 0.05},
		{"slit", meshtest.SlitPlate(2, 1, 2, 0, 0), 0.1},
		{"L-plate", meshtest.LPlate(1, 0, 0), 0.1},
		{"prism", meshtest.Cylinder(1, 10, 12, 1, 0, 0), 0.3},
		{"moebius", meshtest.MoebiusBand(12, 1), 0.1},
		{"book", meshtest.Book(3, 1), 0.1},
		{"pillow", pillow(), 0.1},
		{"one-edge", meshtest.Plate(1, 1, 1, 1, 0, 0), 1.2}, // the diagonal alone is too long
		{"two-components", meshtest.Join(meshtest.Tetrahedron(0), pillow()), 0.15},
	} {
		t.Run(tc.name, func(t *testing.T) {
			fine, err := mesh.Refine(context.Background(), tc.m, tc.h, 100_000)
			if err != nil {
				t.Fatal(err)
			}
			sameSurface(t, tc.m, fine)
			if r := mesh.Check(fine); r.EdgeLength.Max > tc.h*(1+1e-11) {
				t.Errorf("an edge of %v, want at most %v", r.EdgeLength.Max, tc.h)
			}
			l := mesh.NewLocator(tc.m)
			for v := tc.m.NumVertices(); v < fine.NumVertices(); v++ {
				// Points of edges are rounded: an ulp of the largest coordinate, here below 64.
				if _, gap := l.Nearest([3]float64(fine.Positions[3*v : 3*v+3])); gap > noiseOf(tc.name) {
					t.Fatalf("vertex %d lies %v off the surface", v, gap)
				}
			}
		})
	}
}

// noiseOf is how far off the surface a new vertex may lie: rounding, and where the
// file is in single precision a flip may use the thickness that this gives a plane.
func noiseOf(name string) float64 {
	if name == "bracket-single" {
		return 4e-6
	}
	return 2e-14
}

// single is m rounded as an STL file rounds it.
func single(m *mesh.Mesh) *mesh.Mesh {
	return meshtest.Map(m, func(p [3]float64) [3]float64 {
		return [3]float64{float64(float32(p[0])), float64(float32(p[1])), float64(float32(p[2]))}
	})
}

// sameSurface compares what does not depend on how a surface is cut up.
func sameSurface(t *testing.T, m, fine *mesh.Mesh) {
	t.Helper()
	if !slices.Equal(fine.Positions[:len(m.Positions)], m.Positions) {
		t.Error("original vertices moved")
	}
	a, b := mesh.Check(m), mesh.Check(fine)
	if a.EulerCharacteristic != b.EulerCharacteristic || a.Components != b.Components || a.Orientable != b.Orientable ||
		len(a.BoundaryLoops) != len(b.BoundaryLoops) || a.IsolatedVertices != b.IsolatedVertices ||
		a.RepeatedCorners != b.RepeatedCorners || a.NonManifoldVertices > b.NonManifoldVertices {
		t.Errorf("the refined surface is another:\n%+v\n%+v", *a, *b)
	}
	const tol = 1e-11 // relative: a hundred thousand areas and lengths, each rounded
	near := func(what string, x, y float64) {
		if math.Abs(x-y) > tol*(math.Abs(x)+math.Abs(y)) {
			t.Errorf("%s: %.15g became %.15g", what, x, y)
		}
	}
	near("area", a.Area, b.Area)
	for i := range min(len(a.BoundaryLoops), len(b.BoundaryLoops)) {
		near("boundary", a.BoundaryLoops[i].Length, b.BoundaryLoops[i].Length)
	}
	near("creases", totalLength(m, mesh.Creases(m, 20)), totalLength(fine, mesh.Creases(fine, 20)))
	near("edges with many faces", manyFaced(m), manyFaced(fine))
}

// manyFaced is the length of edges with more than two faces (of three different
// corners), each as often as it has faces.
func manyFaced(m *mesh.Mesh) (sum float64) {
	faces := map[[2]int32]int{}
	each := func(do func(e [2]int32)) {
		for f := 0; f < len(m.Triangles); f += 3 {
			u, v, w := m.Triangles[f], m.Triangles[f+1], m.Triangles[f+2]
			if u != v && v != w && w != u {
				for _, e := range [3][2]int32{{u, v}, {v, w}, {w, u}} {
					do([2]int32{min(e[0], e[1]), max(e[0], e[1])})
				}
			}
		}
	}
	each(func(e [2]int32) { faces[e]++ })
	each(func(e [2]int32) { // in order, so that the sum repeats
		if faces[e] > 2 {
			sum += totalLength(m, [][2]int32{e})
		}
	})
	return sum
}

// Random triangles on a few points meet in every way there is: folded, doubled, flat,
// many at an edge. What they cover must stay as it is.
func TestRefineAnything(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 12))
	for trial := range 400 {
		n := 3 + rng.IntN(6)
		m := &mesh.Mesh{}
		for i := range 3 * n {
			x := float64(rng.IntN(3))
			if i%3 == 2 && trial%2 == 0 { // all in one plane
				x = 0
			}
			m.Positions = append(m.Positions, x)
		}
		for range 3 * (1 + rng.IntN(8)) {
			m.Triangles = append(m.Triangles, int32(rng.IntN(n)))
		}
		fine, err := mesh.Refine(context.Background(), m, 0.4, 100_000)
		if err != nil {
			t.Fatalf("trial %d: %v", trial, err)
		}
		a, b := mesh.Check(m), mesh.Check(fine)
		if math.Abs(a.Area-b.Area) > 1e-12*(1+a.Area) ||
			a.DuplicateFaces == 0 && a.EulerCharacteristic != b.EulerCharacteristic ||
			a.Components != b.Components || a.DuplicateFaces == 0 && math.Abs(manyFaced(m)-manyFaced(fine)) > 1e-12*(1+manyFaced(m)) {
			t.Fatalf("trial %d: %v %v\narea %v became %v, chi %d became %d, components %d became %d, many-faced %v became %v",
				trial, m.Positions, m.Triangles, a.Area, b.Area, a.EulerCharacteristic, b.EulerCharacteristic,
				a.Components, b.Components, manyFaced(m), manyFaced(fine))
		}
	}
}

// Exact distances do not see how a face is cut up: to 1e-10, as a flip may use a
// plane's rounding.
func TestRefineKeepsDistances(t *testing.T) {
	bracket, _ := meshtest.Bracket(4, 6)
	for name, m := range map[string]*mesh.Mesh{
		"box":     meshtest.Box(2, 1, 0.5, [3]int{2, 2, 2}, 0.2, 1),
		"bracket": meshtest.Rotate(bracket, [3]float64{1, 2, 3}, 1),
		"slit":    meshtest.SlitPlate(2, 0.5, 1.5, 0, 0),
		"saddle":  meshtest.Fan(8, math.Pi/3, []float64{1, 2}),
		"book":    meshtest.Book(3, 2),
		"sphere":  meshtest.ShakenSphere(2, 1),
	} {
		r := mesh.Check(m)
		fine, err := mesh.Refine(context.Background(), m, r.EdgeLength.Max/7, 100_000)
		if err != nil {
			t.Fatal(err)
		}
		from := []mesh.Datum{mesh.AtVertex(0)}
		want, err := geodesic.Field(context.Background(), m, from, geodesic.Options{})
		if err != nil {
			t.Fatal(err)
		}
		got, err := geodesic.Field(context.Background(), fine, from, geodesic.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for v := range want {
			if math.Abs(got[v]-want[v]) > 1e-10*want[v] {
				t.Fatalf("%s: vertex %d at %.15g, refined at %.15g", name, v, want[v], got[v])
			}
		}
	}
}

// A face written twice, in either order, is after refinement still twice the same
// faces, which share their new edges.
func TestRefineKeepsDoubledFacesDoubled(t *testing.T) {
	for _, second := range [][]int32{{0, 1, 2}, {2, 1, 0}, {1, 2, 0}} {
		m := &mesh.Mesh{Positions: []float64{0, 0, 0, 3, 0, 0, 0, 2, 0}, Triangles: append([]int32{0, 1, 2}, second...)}
		fine, err := mesh.Refine(context.Background(), m, 0.3, 1000)
		if err != nil {
			t.Fatal(err)
		}
		if r := mesh.Check(fine); 2*r.DuplicateFaces != r.Faces || r.Faces < 50 {
			t.Errorf("%v: %d faces, %d of them doubles", second, r.Faces, r.DuplicateFaces)
		}
	}
}

// Bisection halves a triangle's least angle at worst (I. Rosenberg, F. Stenger, Math.
// Comp. 29, 1975), and Delaunay flips do not lessen it: a box's faces cut along their diagonals
// have atan(1/4) at least, whatever the fineness; so have the fans and slivers
// of a flat face no claim to be inherited.
func TestRefineMakesNoSlivers(t *testing.T) {
	m := meshtest.Box(2, 1, 0.5, [3]int{1, 1, 1}, 0, 0)
	for _, h := range []float64{1, 0.5, 0.3, 0.1, 0.03} {
		fine, err := mesh.Refine(context.Background(), m, h, 100_000)
		if err != nil {
			t.Fatal(err)
		}
		if least := math.Atan(0.25) / 2 * 180 / math.Pi; mesh.Check(fine).Angle.Min < least {
			t.Errorf("edges below %v: least angle %v, want %v at least", h, mesh.Check(fine).Angle.Min, least)
		}
	}
	// A fan of needles in a plane: 200 points on one side of a square see one corner.
	needles := &mesh.Mesh{Positions: []float64{0, 0, 0, 1, 0, 0}}
	for i := 1; i <= 200; i++ {
		needles.Positions = append(needles.Positions, 1, float64(i)/200, 0)
		needles.Triangles = append(needles.Triangles, 0, int32(i), int32(i+1))
	}
	fine, err := mesh.Refine(context.Background(), needles, 0.005, 1_000_000)
	if err != nil {
		t.Fatal(err)
	}
	// An even mesh of edges up to h has two thirds of a vertex for each square of h, and more is waste.
	if most := int(4 * 0.5 / (0.005 * 0.005)); fine.NumVertices() > most {
		t.Errorf("%d vertices, want %d at most", fine.NumVertices(), most)
	}
	if p1 := mesh.Check(fine).Angle.P1; p1 < 20 {
		t.Errorf("one angle in a hundred is below %v, want 20", p1)
	}
}

func TestRefineBudget(t *testing.T) {
	m := meshtest.Box(2, 1, 0.5, [3]int{1, 1, 1}, 0, 0)
	ctx := context.Background()
	for _, h := range []float64{0.3, 0.05, 0.02} {
		fine, err := mesh.Refine(ctx, m, h, 1_000_000)
		if err != nil {
			t.Fatal(err)
		}
		added := fine.NumVertices() - m.NumVertices()
		if _, err := mesh.Refine(ctx, m, h, added); err != nil {
			t.Errorf("h = %v: the %d vertices it needs are refused: %v", h, added, err)
		}
		for _, budget := range []int{0, added / 10, added - 1} {
			var short *mesh.BudgetError
			if _, err := mesh.Refine(ctx, m, h, budget); !errors.As(err, &short) || short.Budget != budget ||
				short.Needed <= budget || float64(short.Needed) < 0.8*float64(added) || float64(short.Needed) > 1.5*float64(added) {
				t.Errorf("h = %v, budget %d: %v; it needs %d", h, budget, err, added)
			}
		}
	}
	var short *mesh.BudgetError
	if _, err := mesh.Refine(ctx, m, 1e-300, 1000); !errors.As(err, &short) {
		t.Errorf("hopelessly fine: %v", err)
	}
	if fine, err := mesh.Refine(ctx, m, 10, 0); err != nil || fine != m {
		t.Errorf("nothing to do: %v, %v", fine, err)
	}
	over, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := mesh.Refine(over, m, 0.01, 1_000_000); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func BenchmarkRefine(b *testing.B) {
	m := meshtest.Box(2, 1, 0.5, [3]int{1, 1, 1}, 0, 0)
	added := 0
	for b.Loop() {
		fine, err := mesh.Refine(context.Background(), m, 0.01, 1_000_000)
		if err != nil {
			b.Fatal(err)
		}
		added = fine.NumVertices()
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(added), "ns/vertex")
}
