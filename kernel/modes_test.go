package kernel

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// checkModes holds a result to what every set of modes must keep.
func checkModes(t *testing.T, s *Solver, r *ModesResult, rounding float64) {
	t.Helper()
	n := len(s.lumped)
	mx := make([]float64, n)
	for i, x := range r.Fields {
		s.massTo(mx, s.inward(x))
		mx = s.outward(mx)
		for j := range i + 1 {
			sum, want := 0.0, 0.0
			for v, y := range r.Fields[j] {
				sum += mx[v] * y
			}
			if i == j {
				want = 1
			}
			if math.Abs(sum-want) > 1e-11 { // n rounded terms, and the basis' own 1e-13
				t.Errorf("modes %d and %d: product %g", i, j, sum)
			}
		}
		if r.Residuals[i] > rounding {
			t.Errorf("mode %d: residual %g", i, r.Residuals[i])
		}
		if i > 0 && r.Values[i] < r.Values[i-1]*(1-1e-12) {
			t.Errorf("mode %d: %g after %g", i, r.Values[i], r.Values[i-1])
		}
	}
}

// Complete spectra of the discrete problem in closed form (table, checked against
// dense solves): flat tori, whose eigenvalues come in fours and eights, a held square,
// and the equilateral triangle with both masses.
func TestModesOfDiscreteMeshes(t *testing.T) {
	torus := func(b float64, n, m int) *Solver {
		s, err := newSolver(context.Background(), nil, torusGrid(1, b, n, m), Options{})
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	square, triangle := meshtest.Plate(1, 1, 7, 7, 0, 0), triangleGrid(7)
	if square.NumVertices() != 64 {
		t.Fatalf("%d vertices", square.NumVertices())
	}
	for _, tc := range []struct {
		mesh, edge, mass string
		solver           *Solver
		held             []int32
	}{
		{"torus 1x1 grid 6x6", "closed", "lumped", torus(1, 6, 6), nil},
		{"torus 1xsqrt2 grid 6x8", "closed", "lumped", torus(math.Sqrt2, 6, 8), nil},
		{"equilateral triangle side 1 split 7", "insulated", "lumped", solverFor(t, triangle, Options{}), nil},
		{"equilateral triangle side 1 split 7", "insulated", "consistent", solverFor(t, triangle, Options{ConsistentMass: true}), nil},
		{"equilateral triangle side 1 split 7", "held", "consistent", solverFor(t, triangle, Options{ConsistentMass: true}), vertices(triangle, func(x, y, _ float64) bool {
			a, b, c := barycentric(x, y)
			return min(a, b, c) < 1e-9
		})},
		{"unit square grid 7x7", "held", "lumped", solverFor(t, square, Options{}), vertices(square, func(x, y, _ float64) bool { return x == 0 || y == 0 || x == 1 || y == 1 })},
	} {
		var want []float64
		for _, row := range readTable(t, "spectrum_discrete_exact.csv").rows {
			if row["mesh"] == tc.mesh && row["mass"] == tc.mass && row["edge"] == tc.edge {
				want = append(want, number(t, row, "value"))
			}
		}
		if len(want) == 0 {
			t.Fatalf("no %s %s %s in the table", tc.mesh, tc.edge, tc.mass)
		}
		for _, count := range []int{1, 2, 7, len(want)} {
			r, err := tc.solver.Modes(context.Background(), count, tc.held)
			if err != nil {
				t.Fatalf("%s %s: %d modes: %v", tc.mesh, tc.edge, count, err)
			}
			for k, lambda := range r.Values {
				if math.Abs(lambda-want[k]) > 1e-10*want[len(want)-1] { // the table's own demand
					t.Errorf("%s %s %s, %d wanted, mode %d: %.12g, want %.12g", tc.mesh, tc.edge, tc.mass, count, k, lambda, want[k])
				}
			}
			checkModes(t, tc.solver, r, 1e-7)
		}
	}
}

// exactSpectrum lists eigenvalues of a domain with their multiplicities (table).
func exactSpectrum(t *testing.T, domain, edge string, count int) []float64 {
	t.Helper()
	var want []float64
	for _, row := range readTable(t, "spectrum_exact.csv").rows {
		if row["domain"] == domain && row["edge"] == edge {
			for range integer(t, row, "multiplicity") {
				want = append(want, number(t, row, "value"))
			}
		}
	}
	if len(want) < count {
		t.Fatalf("%s %s: %d values in the table", domain, edge, len(want))
	}
	return want[:count]
}

// multiplets averages got over the runs of equal values in want.
func multiplets(got, want []float64) (mean, value []float64) {
	for i := 0; i < len(want); {
		j, sum := i, 0.0
		for ; j < len(want) && math.Abs(want[j]-want[i]) <= 1e-9*want[i]; j++ {
			sum += got[j]
		}
		mean, value = append(mean, sum/float64(j-i)), append(value, want[i])
		i = j
	}
	return mean, value
}

// Second order in h: sphere (first 36: l(l+1), 2l+1 times each), square, disc,
// hemisphere, insulated and held.
func TestModesConverge(t *testing.T) {
	for _, tc := range []struct {
		domain, edge string
		count        int
		skip         int // multiplets left out
		bound        float64
		meshes       []*mesh.Mesh
		rim          func(x, y, z float64) bool
	}{
		// λ = 2 of the icosphere converges faster than h² by accident (reference notes).
		{"unit sphere", "closed", 36, 2, 0.02, []*mesh.Mesh{meshtest.Icosphere(2, 0, 0), meshtest.Icosphere(3, 0, 0), meshtest.Icosphere(4, 0, 0)}, nil},
		{"unit square", "insulated", 10, 1, 0.02, plates(12, 24, 48), nil},
		{"unit square", "held", 10, 0, 0.02, plates(12, 24, 48), func(x, y, _ float64) bool { return x == 0 || y == 0 || x == 1 || y == 1 }},
		{"unit disc", "held", 9, 0, 0.02, []*mesh.Mesh{meshtest.Disc(8), meshtest.Disc(16), meshtest.Disc(32)}, func(x, y, _ float64) bool { return math.Hypot(x, y) > 1-1e-9 }},
		{"unit disc", "insulated", 9, 1, 0.02, []*mesh.Mesh{meshtest.Disc(8), meshtest.Disc(16), meshtest.Disc(32)}, nil},
	} {
		want := exactSpectrum(t, tc.domain, tc.edge, tc.count)
		var errs [][]float64
		for _, m := range tc.meshes {
			s := solverFor(t, m, Options{})
			var held []int32
			if tc.rim != nil {
				held = vertices(m, tc.rim)
			}
			r, err := s.Modes(context.Background(), tc.count, held)
			if err != nil {
				t.Fatal(err)
			}
			checkModes(t, s, r, 1e-7)
			mean, value := multiplets(r.Values, want)
			for k := range mean {
				if k == len(errs) {
					errs = append(errs, nil)
				}
				errs[k] = append(errs[k], math.Abs(mean[k]-value[k])/max(value[k], 1))
			}
			for _, v := range held {
				if r.Fields[0][v] != 0 {
					t.Errorf("%s: mode 0 is %g at held vertex %d", tc.domain, r.Fields[0][v], v)
				}
			}
		}
		last := len(errs)
		if tc.count > 1 && want[tc.count-1] == want[tc.count-2] && tc.domain != "unit sphere" {
			last-- // the last multiplet may be cut short
		}
		for k := tc.skip; k < last; k++ {
			checkOrder(t, fmt.Sprintf("%s %s, eigenvalue %d", tc.domain, tc.edge, k), errs[k], tc.bound)
		}
	}
}

func plates(sizes ...int) []*mesh.Mesh {
	var all []*mesh.Mesh
	for _, n := range sizes {
		all = append(all, meshtest.Plate(1, 1, n, n, 0, 0))
	}
	return all
}

// The heat kernel is Σ exp(-λt) φ(x) φ(y): two unlike ways to the same numbers.
func TestModesAddUpToTheKernel(t *testing.T) {
	for _, consistent := range []bool{false, true} {
		m := meshtest.ShakenSphere(2, 8)
		s := solverFor(t, m, Options{ConsistentMass: consistent})
		n := len(s.lumped)
		const time = 0.25
		r, err := s.Modes(context.Background(), 130, nil)
		if err != nil {
			t.Fatal(err)
		}
		h, err := s.HeatKernels(context.Background(), at(n, 50), []float64{time}, HeatOptions{Tolerance: 1e-11})
		if err != nil {
			t.Fatal(err)
		}
		sum := make([]float64, n)
		for k, x := range r.Fields {
			for v := range sum {
				sum[v] += math.Exp(-r.Values[k]*time) * x[50] * x[v]
			}
		}
		// Modes left out have λ > 150: exp(-37). The rest is the vectors' accuracy.
		if d := maxDiff(sum, h.Fields[0]); d > 1e-9*h.Largest[0] {
			t.Errorf("consistent=%v: sum over modes and Krylov differ by %g", consistent, d)
		}
	}
}

// Components and vertices in no triangle: one constant each, NaN there; a held
// component has none.
func TestModesOfComponents(t *testing.T) {
	one, two := meshtest.Plate(1, 1, 4, 4, 0, 0), meshtest.Plate(2, 1, 4, 4, 0, 0)
	m := meshtest.Join(one, two)
	m.Positions = append(m.Positions, 9, 9, 9)
	s := solverFor(t, m, Options{})
	r, err := s.Modes(context.Background(), 4, nil)
	if err != nil {
		t.Fatal(err)
	}
	if r.Values[0] != 0 || r.Values[1] != 0 || !(r.Values[2] > 1) {
		t.Errorf("eigenvalues %v, want two zeros", r.Values)
	}
	if x := r.Fields[0]; math.Abs(x[0]-1) > 1e-14 || x[30] != 0 || !math.IsNaN(x[50]) {
		t.Errorf("mode 0: %g, %g, %g", x[0], x[30], x[50])
	}
	if r, err = s.Modes(context.Background(), 3, []int32{0}); err != nil {
		t.Fatal(err)
	}
	if r.Values[0] != 0 || !(r.Values[1] > 0) || r.Fields[1][0] != 0 || r.Fields[2][0] != 0 {
		t.Errorf("vertex 0 held: eigenvalues %v", r.Values)
	}
	var bad *OptionError
	for _, count := range []int{0, -3, 51} {
		if _, err := s.Modes(context.Background(), count, nil); !errors.As(err, &bad) {
			t.Errorf("count %d: got %v, want an *OptionError", count, err)
		}
	}
	if _, err := s.Modes(context.Background(), 50, nil); err != nil {
		t.Errorf("all 50 modes: %v", err)
	}
	var field *FieldError
	if _, err := s.Modes(context.Background(), 1, []int32{51}); !errors.As(err, &field) {
		t.Errorf("held vertex 51 of 51: got %v, want a *FieldError", err)
	}
}

func ExampleSolver_Modes() {
	surface, err := mesh.NewSurface(meshtest.Icosphere(4, 0, 0))
	if err != nil {
		fmt.Println(err)
		return
	}
	surface.Delaunay(1000)
	s, err := NewSolver(context.Background(), surface, Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	r, err := s.Modes(context.Background(), 9, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, lambda := range r.Values {
		fmt.Printf("%.2f ", lambda)
	}
	fmt.Println("(sphere: 0, three times 2, five times 6)")
	// Output:
	// 0.00 2.00 2.00 2.00 5.99 5.99 5.99 5.99 5.99 (sphere: 0, three times 2, five times 6)
}
