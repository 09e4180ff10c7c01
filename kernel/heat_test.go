package kernel

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// sphereKernel is the heat kernel of the unit sphere at angle theta:
// Σ (2l+1)/(4π) exp(-l(l+1)t) P_l(cos θ).
func sphereKernel(t, theta float64) float64 {
	x := math.Cos(theta)
	before, p, sum := 0.0, 1.0, 0.0
	for l := range 400 {
		n := float64(l)
		term := (2*n + 1) / (4 * math.Pi) * math.Exp(-n*(n+1)*t)
		sum += term * p
		if term < 1e-18 {
			break
		}
		before, p = p, ((2*n+1)*x*p-n*before)/(n+1)
	}
	return sum
}

// The series of the tests is that of the table (20 digits, two ways). Cancellation in
// double precision leaves 1e-14 of the peak.
func TestSphereSeriesMatchesTable(t *testing.T) {
	for _, row := range readTable(t, "kernel_sphere.csv").rows {
		time := number(t, row, "t")
		got, want := sphereKernel(time, number(t, row, "theta")), number(t, row, "value")
		if math.Abs(got-want) > 1e-14*sphereKernel(time, 0) {
			t.Errorf("t=%s theta=%s: %.17g, table %.17g", row["t"], row["theta_exact"], got, want)
		}
	}
}

// Linear elements are of second order in h. The source is vertex 12, which has six
// neighbours: at five the lumped mass is a little off (see the rates in
// kernel_fem_convergence.csv: order 2.00 at vertex 12).
func TestSphereKernelConvergesWithSecondOrder(t *testing.T) {
	times := []float64{0.05, 0.1, 0.5}
	errs := map[int][]float64{}
	for _, level := range []int{3, 4, 5} { // 642, 2562, 10242 vertices
		m := meshtest.Icosphere(level, 0, 0)
		s := solverFor(t, m, Options{})
		r, err := s.HeatKernels(context.Background(), at(m.NumVertices(), 12), times, HeatOptions{})
		if err != nil {
			t.Fatal(err)
		}
		if len(r.Warnings) > 0 && level == 5 {
			t.Errorf("warnings at 10242 vertices: %q", r.Warnings)
		}
		from := m.Positions[36:39]
		for k, time := range times {
			worst, peak := 0.0, sphereKernel(time, 0)
			for v, u := range r.Fields[k] {
				p := m.Positions[3*v : 3*v+3]
				theta := math.Acos(max(-1, min(1, from[0]*p[0]+from[1]*p[1]+from[2]*p[2])))
				worst = max(worst, math.Abs(u-sphereKernel(time, theta)))
			}
			errs[k] = append(errs[k], worst/peak)
			if level == 5 && worst > 0.005*peak {
				t.Errorf("t=%g, 10242 vertices: error %.3g of the peak, want <= 0.005", time, worst/peak)
			}
			if r.MeshErrors[k] < worst/peak/2 { // what the result says of itself is of the right size
				t.Errorf("level %d t=%g: MeshErrors %.3g, measured %.3g", level, time, r.MeshErrors[k], worst/peak)
			}
			if r.BalanceErrors[k] > 1e-12 { // 1e4 terms, each rounded
				t.Errorf("level %d t=%g: balance error %.3g", level, time, r.BalanceErrors[k])
			}
			if r.ErrorEstimates[k] > 1e-8 || r.Lowest[k] < -1e-8*r.Largest[k] {
				t.Errorf("level %d t=%g: estimate %.3g, lowest %.3g", level, time, r.ErrorEstimates[k], r.Lowest[k])
			}
		}
		t.Logf("level %d: %d solves, %d factorisations", level, r.Solves, r.Factorizations)
	}
	for k, time := range times {
		for i := 1; i < 3; i++ {
			order := math.Log2(errs[k][i-1] / errs[k][i])
			t.Logf("t=%g: error %.3g of the peak, order %.2f", time, errs[k][i], order)
			if math.Abs(order-2) > 0.2 { // the coarsest mesh is off by 7 % at t = 0.05: the next term shows
				t.Errorf("t=%g: order %.2f from %v", time, order, errs[k])
			}
		}
	}
}

// Every entry of the kernel matrices of tiny meshes, to 30 digits in the table
// (eigen-decomposition at 50 digits, checked by Taylor series). 1e-11 of the largest
// entry: three digits above rounding.
func TestKernelMatricesOfTinyMeshes(t *testing.T) {
	positions, triangles := map[string][]float64{}, map[string][]int32{}
	for _, row := range readTable(t, "kernel_matrix_meshes.csv").rows {
		name := row["mesh"]
		for _, c := range []string{"a", "b", "c"} {
			if row["kind"] == "vertex" {
				positions[name] = append(positions[name], number(t, row, c))
			} else {
				triangles[name] = append(triangles[name], int32(integer(t, row, c)))
			}
		}
	}
	type key struct {
		mesh, mass string
		t          float64
	}
	want := map[key]map[[2]int]float64{}
	for _, row := range readTable(t, "kernel_matrix.csv").rows {
		k := key{row["mesh"], row["mass"], number(t, row, "t")}
		if want[k] == nil {
			want[k] = map[[2]int]float64{}
		}
		i, j := integer(t, row, "i"), integer(t, row, "j")
		want[k][[2]int{i, j}], want[k][[2]int{j, i}] = number(t, row, "value"), number(t, row, "value")
	}
	compared := 0
	for k, entries := range want {
		m, err := mesh.New(positions[k.mesh], triangles[k.mesh])
		if err != nil {
			t.Fatal(err)
		}
		surface, err := mesh.NewSurface(m)
		if err != nil {
			t.Fatal(err)
		}
		if k.mesh == "flat5" || k.mesh == "bent5" {
			// The tables keep the triangulation as it is, with positive off-diagonal
			// entries opposite obtuse angles: no flips, no splits.
		} else {
			surface.Delaunay(100)
		}
		s, err := NewSolver(context.Background(), surface, Options{ConsistentMass: k.mass == "consistent"})
		if err != nil {
			t.Fatal(err)
		}
		n := m.NumVertices()
		peak := 0.0
		for _, v := range entries {
			peak = max(peak, math.Abs(v))
		}
		for i := range n {
			r, err := s.HeatKernels(context.Background(), at(n, i), []float64{k.t}, HeatOptions{Tolerance: 1e-12})
			if err != nil {
				t.Fatal(err)
			}
			for j := range n {
				compared++
				if got := r.Fields[0][j]; math.Abs(got-entries[[2]int{i, j}]) > 1e-11*peak {
					t.Errorf("%s %s t=%g (%d,%d): %.15g, want %.15g", k.mesh, k.mass, k.t, i, j, got, entries[[2]int{i, j}])
				}
			}
		}
	}
	if compared < 1000 {
		t.Errorf("only %d entries compared", compared)
	}
}

// The discrete kernel on the flat torus has a closed form (product of circulant
// kernels, checked by Bessel functions): the table's 16 digits, less some rounding.
func TestDiscreteTorusKernel(t *testing.T) {
	for _, row := range readTable(t, "kernel_discrete_torus.csv").rows {
		n := integer(t, row, "N")
		if n > 24 {
			continue
		}
		s, err := newSolver(context.Background(), nil, torusGrid(1, 1, n, n), Options{})
		if err != nil {
			t.Fatal(err)
		}
		r, err := s.HeatKernels(context.Background(), at(n*n, 0), []float64{number(t, row, "t")}, HeatOptions{Tolerance: 1e-12})
		if err != nil {
			t.Fatal(err)
		}
		got, want := r.Fields[0][integer(t, row, "di")*n+integer(t, row, "dj")], number(t, row, "value")
		if math.Abs(got-want) > 2e-12*r.Largest[0] { // the tolerance, and the table is exact
			t.Errorf("N=%d t=%s (%s,%s): %.16g, want %.16g", n, row["t"], row["di"], row["dj"], got, want)
		}
	}
}

// ringKernel is the kernel of n points around a ring of length a with three-point
// differences: Σ exp(-4t/h² sin²(πk/n)) cos(2πik/n) / a.
func ringKernel(a float64, n int, t float64) []float64 {
	out := make([]float64, n)
	h := a / float64(n)
	for i := range n {
		for k := range n {
			sin := math.Sin(math.Pi * float64(k) / float64(n))
			out[i] += math.Exp(-4*t/h*sin/h*sin) * math.Cos(2*math.Pi*float64(i*k%n)/float64(n)) / a
		}
	}
	return out
}

// A torus of thin cells, up to 1:1e6: its kernel is the product of two rings' (Fourier),
// so that the truth is known where dense eigenvalues are lost in rounding.
func TestEstimateHoldsOnThinCells(t *testing.T) {
	const n, m = 40, 32
	for _, b := range []float64{1, 1e-2, 1e-4, 1e-6} {
		s, err := newSolver(context.Background(), nil, torusGrid(1, b, n, m), Options{})
		if err != nil {
			t.Fatal(err)
		}
		for e := -10; e <= 4; e += 2 {
			time := math.Pow(10, float64(e))
			x, y := ringKernel(1, n, time), ringKernel(b, m, time)
			for _, tolerance := range []float64{1e-8, 1e-12} {
				r, err := s.HeatKernels(context.Background(), at(n*m, 0), []float64{time}, HeatOptions{Tolerance: tolerance})
				if err != nil {
					t.Fatal(err)
				}
				worst := 0.0
				for i := range n {
					for j := range m {
						worst = max(worst, math.Abs(x[i]*y[j]-r.Fields[0][i*m+j]))
					}
				}
				worst /= x[0] * y[0]
				if worst > r.ErrorEstimates[0]+1e-13 { // the Fourier sums' rounding
					t.Errorf("b=%g t=%g tolerance %g: error %.3g, estimate %.3g", b, time, tolerance, worst, r.ErrorEstimates[0])
				}
				if r.ErrorEstimates[0] > 1.01*tolerance {
					t.Errorf("b=%g t=%g: estimate %.3g", b, time, r.ErrorEstimates[0])
				}
			}
		}
	}
}

// denseKernel is exp(-tA) M⁻¹ load by a dense eigen-decomposition (gonum).
type denseKernel struct {
	root   []float64 // square roots of the masses
	values []float64
	modes  mat.Dense
}

func newDenseKernel(s *Solver) *denseKernel {
	n := len(s.lumped)
	d := &denseKernel{root: make([]float64, n)}
	for i, m := range s.lumped {
		d.root[s.vertexOut(i)] = math.Sqrt(m)
	}
	d.factorize(func(set func(i, j int, x float64)) {
		l := s.stiffness
		for i := range n {
			v := s.vertexOut(i)
			set(v, v, l.Diag[i]/s.lumped[i])
			for k := l.Ptr[i]; k < l.Ptr[i+1]; k++ {
				w := s.vertexOut(int(l.Adj[k]))
				set(v, w, l.Off[k]/(d.root[v]*d.root[w]))
			}
		}
	})
	d.values[0] = 0 // the surface is connected: one constant mode, known exactly
	return d
}

// factorize decomposes the matrix that fill sets entry by entry.
func (d *denseKernel) factorize(fill func(set func(i, j int, x float64))) {
	a := mat.NewSymDense(len(d.root), nil)
	fill(a.SetSym)
	var eig mat.EigenSym
	if !eig.Factorize(a, true) {
		panic("gonum failed on a symmetric matrix")
	}
	d.values = eig.Values(nil)
	eig.VectorsTo(&d.modes)
}

// apply is f(A) M⁻¹ load.
func (d *denseKernel) apply(f func(lambda float64) float64, load []float64) []float64 {
	n := len(d.root)
	out := make([]float64, n)
	for j, lambda := range d.values {
		c := 0.0
		for i, q := range load {
			if q != 0 {
				c += q / d.root[i] * d.modes.At(i, j)
			}
		}
		c *= f(lambda)
		for i := range out {
			out[i] += c * d.modes.At(i, j) / d.root[i]
		}
	}
	return out
}

func (d *denseKernel) at(t float64, load []float64) []float64 {
	return d.apply(func(x float64) float64 { return math.Exp(-t * max(0, x)) }, load)
}

// The measured error is within the tolerance, and within the estimate, for all
// tolerances and over six decades of time, from shapes with very different spectra.
func TestKrylovKeepsItsTolerance(t *testing.T) {
	shapes := []struct {
		name string
		mesh *mesh.Mesh
	}{
		{"shaken sphere", meshtest.ShakenSphere(2, 7)},
		{"long tube", meshtest.Cylinder(0.1, 4, 6, 40, 0, 0)},
		{"jittered plate", meshtest.Plate(1, 1, 13, 13, 0.2, 3)},
	}
	var times []float64
	for e := -4.0; e <= 2; e += 0.5 {
		times = append(times, math.Pow(10, e))
	}
	for _, shape := range shapes {
		s := solverFor(t, shape.mesh, Options{})
		n := len(s.lumped)
		dense := newDenseKernel(s)
		line := make([]float64, n)
		for i := range 10 {
			line[i] = 0.1
		}
		for k, load := range [][]float64{at(n, n/2), line} {
			want := make([][]float64, len(times))
			for i, time := range times {
				want[i] = dense.at(time, load)
			}
			for _, tolerance := range []float64{1e-4, 1e-6, 1e-8, 1e-10} {
				r, err := s.HeatKernels(context.Background(), load, times, HeatOptions{Tolerance: tolerance})
				if err != nil {
					t.Fatal(err)
				}
				for i, time := range times {
					// The dense decomposition's own rounding: some units of the stiffest
					// eigenvalue on each, as far as modes last.
					floor := 0x1p-48*dense.values[n-1]*min(time, 1/dense.values[1]) + 1e-13
					got := maxDiff(r.Fields[i], want[i]) / maxAbs(want[i])
					if got > tolerance+floor || got > r.ErrorEstimates[i]+floor || r.ErrorEstimates[i] > tolerance {
						t.Errorf("%s load %d tolerance %g t=%.3g: error %.3g, estimate %.3g", shape.name, k, tolerance, time, got, r.ErrorEstimates[i])
					}
					if r.BalanceErrors[i] > 1e-13 { // n rounded terms
						t.Errorf("%s load %d tolerance %g t=%.3g: balance error %.3g", shape.name, k, tolerance, time, r.BalanceErrors[i])
					}
				}
				t.Logf("%s load %d tolerance %g: %d solves, %d factorisations for %d times", shape.name, k, tolerance, r.Solves, r.Factorizations, len(times))
			}
		}
	}
}

// Times from the absurdly short to the absurdly long have the right limits: the load
// over its own area, and the mean.
func TestExtremeTimes(t *testing.T) {
	s := solverFor(t, meshtest.Plate(2, 1, 8, 4, 0, 0), Options{})
	n, area := len(s.lumped), s.Areas()[5]
	r, err := s.HeatKernels(context.Background(), at(n, 5), []float64{1e-300, 1e-30, 1e30, 1e300}, HeatOptions{})
	if err != nil {
		t.Fatal(err)
	}
	for i := range 2 {
		for v, u := range r.Fields[i] {
			want := 0.0
			if v == 5 {
				want = 1 / area
			}
			if math.Abs(u-want) > 1e-12/area {
				t.Errorf("time %d vertex %d: %g, want %g", i, v, u, want)
			}
		}
		if len(r.Warnings) == 0 || !strings.Contains(r.Warnings[0], "--max-edge") {
			t.Errorf("no warning that 1e-300 is short for the mesh: %q", r.Warnings)
		}
	}
	for i := 2; i < 4; i++ {
		for v, u := range r.Fields[i] {
			if math.Abs(u-0.5) > 1e-13 { // one unit of heat on an area of 2
				t.Errorf("time %d vertex %d: %g, want 0.5", i, v, u)
			}
		}
	}
}

// One mode, lambda = 1, t = 1: (1 + 1/N)^-N, the table's digits less N roundings.
func TestImplicitEulerOfOneMode(t *testing.T) {
	// The first mode along a torus grid of n columns has eigenvalue (4/h²) sin²(π/n);
	// a length that makes it 1 turns the table's row into a field.
	const n = 12
	length := 2 * n * math.Sin(math.Pi/n)
	s, err := newSolver(context.Background(), nil, torusGrid(length, 1, n, 3), Options{})
	if err != nil {
		t.Fatal(err)
	}
	load := make([]float64, n*3)
	for i := range n {
		for j := range 3 {
			load[3*i+j] = s.lumped[3*i+j] * (1 + math.Cos(2*math.Pi*float64(i)/n))
		}
	}
	rows := 0
	var errs []float64
	for _, row := range readTable(t, "kernel_timestep_mode.csv").rows {
		if row["scheme"] != "implicit_euler" {
			continue
		}
		rows++
		steps := integer(t, row, "N")
		r, err := s.HeatKernels(context.Background(), load, []float64{1}, HeatOptions{Stepper: ImplicitEuler, Steps: steps})
		if err != nil {
			t.Fatal(err)
		}
		got, want := r.Fields[0][0]-1, number(t, row, "value")
		if math.Abs(got-want) > 1e-15*float64(steps+30) {
			t.Errorf("N=%d: %.17g, want %.17g", steps, got, want)
		}
		errs = append(errs, math.Abs(got-math.Exp(-1)))
	}
	if rows < 10 {
		t.Fatalf("%d rows in the table", rows)
	}
	// First order: from N to 2N the error halves, once N is large.
	if ratio := errs[len(errs)-2] / errs[len(errs)-1]; math.Abs(ratio-2) > 0.01 {
		t.Errorf("error ratio %g from N to 2N, want 2", ratio)
	}
}

// With Delaunay weights and lumped mass a step is an average: values stay between 0
// and the initial peak, however long the step. Heat is kept.
func TestImplicitEulerKeepsTheMaximumPrinciple(t *testing.T) {
	for _, m := range []*mesh.Mesh{meshtest.ShakenSphere(3, 1), meshtest.Plate(1, 1, 20, 20, 0.2, 2), meshtest.MoebiusBand(40, 6), meshtest.Book(3, 8)} {
		s := solverFor(t, m, Options{})
		n, area := len(s.lumped), s.Areas()[9]
		for _, time := range []float64{1e-6, 1e-3, 1, 1e4} {
			for _, steps := range []int{1, 7} {
				r, err := s.HeatKernels(context.Background(), at(n, 9), []float64{time}, HeatOptions{Stepper: ImplicitEuler, Steps: steps})
				if err != nil {
					t.Fatal(err)
				}
				if r.Lowest[0] < 0 || r.Largest[0] > 1/area*(1+1e-14) {
					t.Errorf("t=%g steps=%d: values from %g to %g (start %g)", time, steps, r.Lowest[0], r.Largest[0], 1/area)
				}
				if r.BalanceErrors[0] > 1e-12 { // n rounded terms, each step
					t.Errorf("t=%g steps=%d: balance error %g", time, steps, r.BalanceErrors[0])
				}
			}
		}
	}
}

// Two steppers of different make: they agree to what each states of itself.
func TestSteppersAgree(t *testing.T) {
	m := meshtest.ShakenSphere(3, 4)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	times := []float64{0.3, 0.1, 0.2}
	exact, err := s.HeatKernels(context.Background(), at(n, 12), times, HeatOptions{})
	if err != nil {
		t.Fatal(err)
	}
	for _, steps := range []int{10, 40, 160} {
		r, err := s.HeatKernels(context.Background(), at(n, 12), times, HeatOptions{Stepper: ImplicitEuler, Steps: steps})
		if err != nil {
			t.Fatal(err)
		}
		for i, time := range times {
			got := maxDiff(r.Fields[i], exact.Fields[i]) / exact.Largest[i]
			// The estimate is the plane's. The mesh's own peak falls faster than 1/t at
			// first (by twice its MeshErrors, 3 % here), the sphere's more slowly later.
			if got > 1.1*r.ErrorEstimates[i] || got < 0.2*r.ErrorEstimates[i] {
				t.Errorf("steps=%d t=%g: steppers differ by %.3g, stated %.3g", steps, time, got, r.ErrorEstimates[i])
			}
		}
		if r.Solves != 3*steps {
			t.Errorf("steps=%d: %d solves", steps, r.Solves)
		}
	}
}

// Heat never comes to a component without a source; each component with one keeps its
// share; a vertex in no triangle has no value. Nothing else must come out of it.
func TestComponents(t *testing.T) {
	one, two := meshtest.Icosphere(2, 0, 0), meshtest.Plate(3, 2, 6, 5, 0.1, 1)
	m := meshtest.Join(one, two, meshtest.Tetrahedron(1))
	m.Positions = append(m.Positions, 9, 9, 9) // a vertex in no triangle
	s := solverFor(t, m, Options{})
	n1, n2 := one.NumVertices(), two.NumVertices()
	areas := s.Areas()
	load := make([]float64, len(areas))
	load[3], load[n1+7] = 0.25, 0.75
	for _, stepper := range []Stepper{Krylov, ImplicitEuler} {
		r, err := s.HeatKernels(context.Background(), load, []float64{0.2, 1e3}, HeatOptions{Stepper: stepper})
		if err != nil {
			t.Fatal(err)
		}
		heat := [2]float64{}
		for v := range m.NumVertices() {
			u := r.Fields[0][v]
			switch {
			case v < n1:
				heat[0] += u * areas[v]
			case v < n1+n2:
				heat[1] += u * areas[v]
			case !math.IsNaN(u):
				t.Fatalf("%s: vertex %d has the value %g, want NaN", stepper, v, u)
			}
		}
		if math.Abs(heat[0]-0.25) > 1e-12 || math.Abs(heat[1]-0.75) > 1e-12 || r.BalanceErrors[0] > 1e-12 {
			t.Errorf("%s: heat %v, want 0.25 and 0.75", stepper, heat)
		}
		if got := r.Fields[1][n1+3]; math.Abs(got-0.75/6) > 1e-10 { // the plate's area is 6
			t.Errorf("%s: plate at t=1000: %g, want 0.125", stepper, got)
		}
	}
}

// K(t, x, y) = K(t, y, x), and scaling lengths by c and times by c² scales values by
// 1/c²: laws that hold whatever the mesh.
func TestKernelLaws(t *testing.T) {
	m := meshtest.ShakenSphere(2, 3)
	s := solverFor(t, m, Options{})
	rng := rand.New(rand.NewPCG(1, 1))
	n := len(s.lumped)
	for range 3 {
		x, y := rng.IntN(n), rng.IntN(n)
		from, err := s.HeatKernels(context.Background(), at(n, x), []float64{0.2}, HeatOptions{Tolerance: 1e-11})
		if err != nil {
			t.Fatal(err)
		}
		back, err := s.HeatKernels(context.Background(), at(n, y), []float64{0.2}, HeatOptions{Tolerance: 1e-11})
		if err != nil {
			t.Fatal(err)
		}
		if a, b := from.Fields[0][y], back.Fields[0][x]; math.Abs(a-b) > 2e-11*from.Largest[0] {
			t.Errorf("K(%d,%d) = %.15g, K(%d,%d) = %.15g", x, y, a, y, x, b)
		}
		for _, c := range []float64{1e-3, 1e6} {
			scaled, err := solverFor(t, meshtest.Scale(m, c), Options{}).HeatKernels(context.Background(), at(n, x), []float64{0.1 * c * c}, HeatOptions{Tolerance: 1e-11, Diffusivity: 2})
			if err != nil {
				t.Fatal(err)
			}
			for i, u := range scaled.Fields[0] {
				if math.Abs(u*c*c-from.Fields[0][i]) > 2e-11*from.Largest[0] {
					t.Fatalf("scale %g vertex %d: %g, want %g", c, i, u*c*c, from.Fields[0][i])
				}
			}
		}
	}
}

// Bits do not depend on the number of goroutines.
func TestHeatDoesNotDependOnWorkers(t *testing.T) {
	m := meshtest.Icosphere(5, 0, 0)
	var first *HeatResult
	for _, workers := range []int{1, 2, 5} {
		s := solverFor(t, m, Options{Workers: workers})
		r, err := s.HeatKernels(context.Background(), at(m.NumVertices(), 77), []float64{0.02}, HeatOptions{})
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = r
		} else if !slices.Equal(first.Fields[0], r.Fields[0]) {
			t.Errorf("%d workers: fields differ by %g", workers, maxDiff(first.Fields[0], r.Fields[0]))
		}
	}
}

func TestHeatRefusesWhatItCannotDo(t *testing.T) {
	m := meshtest.Tetrahedron(0)
	m.Positions = append(m.Positions, 5, 5, 5)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	good := []float64{0.1}
	for _, tc := range []struct {
		name  string
		load  []float64
		times []float64
		opt   HeatOptions
		want  any
	}{
		{"time zero", at(n, 0), []float64{1, 0}, HeatOptions{}, &TimeError{}},
		{"time NaN", at(n, 0), []float64{math.NaN()}, HeatOptions{}, &TimeError{}},
		{"time infinite", at(n, 0), []float64{math.Inf(1)}, HeatOptions{}, &TimeError{}},
		{"time overflows", at(n, 0), []float64{1e300}, HeatOptions{Diffusivity: 1e300}, &TimeError{}},
		{"diffusivity below 0", at(n, 0), good, HeatOptions{Diffusivity: -1}, &OptionError{}},
		{"diffusivity NaN", at(n, 0), good, HeatOptions{Diffusivity: math.NaN()}, &OptionError{}},
		{"tolerance 1", at(n, 0), good, HeatOptions{Tolerance: 1}, &OptionError{}},
		{"steps below 0", at(n, 0), good, HeatOptions{Steps: -1}, &OptionError{}},
		{"unknown stepper", at(n, 0), good, HeatOptions{Stepper: "leap"}, &OptionError{}},
		{"no heat", make([]float64, n), good, HeatOptions{}, &LoadError{}},
		{"heat below 0", append([]float64{-1, 2}, make([]float64, n-2)...), good, HeatOptions{}, &LoadError{}},
		{"heat in no triangle", at(n, n-1), good, HeatOptions{}, &LoadError{}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			_, err := s.HeatKernels(context.Background(), tc.load, tc.times, tc.opt)
			var time *TimeError
			var option *OptionError
			var load *LoadError
			ok := false
			switch tc.want.(type) {
			case *TimeError:
				ok = errors.As(err, &time)
			case *OptionError:
				ok = errors.As(err, &option)
			case *LoadError:
				ok = errors.As(err, &load)
			}
			if !ok {
				t.Errorf("got %v, want a %T", err, tc.want)
			}
		})
	}
}

// A triangle that is flat to the last digit has infinite weights: no solver is made.
func TestSolverRefusesOperatorsThatAreNotFinite(t *testing.T) {
	for name, spoil := range map[string]func(op operators){
		"no area":         func(op operators) { op.lumped[3] = 0 },
		"infinite area":   func(op operators) { op.lumped[3] = math.Inf(1) },
		"infinite weight": func(op operators) { op.stiffness.Diag[3] = math.Inf(1) },
		"no number":       func(op operators) { op.stiffness.Diag[3] = math.NaN() },
	} {
		op := torusGrid(1, 1, 4, 4)
		spoil(op)
		var bad *OperatorError
		if _, err := newSolver(context.Background(), nil, op, Options{}); !errors.As(err, &bad) || bad.Vertex != 3 {
			t.Errorf("%s: got %v, want an *OperatorError at vertex 3", name, err)
		}
	}
}

func TestHeatStopsWhenCancelled(t *testing.T) {
	s := solverFor(t, meshtest.Icosphere(3, 0, 0), Options{})
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	for _, stepper := range []Stepper{Krylov, ImplicitEuler} {
		calls := 0
		s.options.Progress = func(string, float64) {
			if calls++; calls == 2 {
				cancel()
			}
		}
		if _, err := s.HeatKernels(ctx, at(642, 0), []float64{1}, HeatOptions{Stepper: stepper}); !errors.Is(err, context.Canceled) {
			t.Errorf("%s: got %v, want context.Canceled", stepper, err)
		}
	}
}

// A factor is made once for the same shift, and no more than one idle one is kept.
func TestFactorsAreKept(t *testing.T) {
	s := solverFor(t, meshtest.Icosphere(2, 0, 0), Options{})
	for i, want := range []int{1, 0, 0} {
		r, err := s.HeatKernels(context.Background(), at(162, i), []float64{0.1}, HeatOptions{})
		if err != nil {
			t.Fatal(err)
		}
		if r.Factorizations != want {
			t.Errorf("call %d: %d factorisations, want %d", i, r.Factorizations, want)
		}
	}
	if _, err := s.HeatKernels(context.Background(), at(162, 0), []float64{1e-3, 0.1, 10}, HeatOptions{}); err != nil {
		t.Fatal(err)
	}
	if len(s.shelf.items) != 1 {
		t.Errorf("%d factors on the shelf, want 1", len(s.shelf.items))
	}
}

// The pinned factor solves L x = b exactly: L applied to the answer gives b back.
func TestPinnedFactor(t *testing.T) {
	s := solverFor(t, meshtest.Join(meshtest.Icosphere(2, 0, 0), meshtest.Plate(1, 1, 5, 5, 0, 0)), Options{})
	f, pins, err := s.factorPinned(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if len(pins) != 2 || s.component[pins[0]] != 0 || s.component[pins[1]] != 1 {
		t.Fatalf("pins %v, want one in each component", pins)
	}
	n := len(s.lumped)
	b, x, got := make([]float64, n), make([]float64, n), make([]float64, n)
	b[0], b[100], b[162], b[180] = 1, -1, 2, -2 // the sphere has 162 vertices
	b = s.inward(b)
	rhs := slices.Clone(b)
	for _, p := range pins {
		rhs[p] = 0
	}
	f.SolveTo(x, rhs)
	s.stiffness.MulVecTo(got, x)
	if d := maxDiff(got, b); d > 1e-13 { // condition 1e2, entries up to 2
		t.Errorf("L x differs from b by %g, at the pins too", d)
	}
}

func ExampleSolver_HeatKernels() {
	// A square sheet of side 1; a unit of heat in its middle.
	m := meshtest.Plate(1, 1, 32, 32, 0, 0)
	surface, err := mesh.NewSurface(m)
	if err != nil {
		fmt.Println(err)
		return
	}
	data := []mesh.Datum{mesh.AtVertex(16*33 + 16)}
	if err := surface.Place(data); err != nil {
		fmt.Println(err)
		return
	}
	surface.Delaunay(surface.NumVertices)
	solver, err := NewSolver(context.Background(), surface, Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	r, err := solver.HeatKernels(context.Background(), surface.Load(data), []float64{0.02, 10}, HeatOptions{})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("t = 0.02: %.2f at the source, %.2f in a corner\n", r.Largest[0], r.Fields[0][0])
	fmt.Printf("t = 10: %.6f everywhere\n", r.Largest[1])
	// Output:
	// t = 0.02: 4.00 at the source, 0.03 in a corner
	// t = 10: 1.000000 everywhere
}
