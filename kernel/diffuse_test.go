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

// held is a Hold that is value on the vertices and free elsewhere.
func held(n int, value float64, sets ...[]int32) []float64 {
	hold := make([]float64, n)
	for v := range hold {
		hold[v] = math.NaN()
	}
	for _, set := range sets {
		for _, v := range set {
			hold[v] = value
		}
	}
	return hold
}

func uniform(n int, value float64) []float64 {
	u := make([]float64, n)
	for v := range u {
		u[v] = value
	}
	return u
}

// A square plate with one hot edge: 1/4 in the middle, exactly, by symmetry; elsewhere
// the table's Fourier series, with second order away from the hot corners.
func TestSteadyPlate(t *testing.T) {
	for _, row := range readTable(t, "heat_plate.csv").rows {
		if number(t, row, "L") != 1 || number(t, row, "H") != 1 {
			continue
		}
		x, y, want := number(t, row, "x"), number(t, row, "y"), number(t, row, "T")
		var errs []float64
		for _, n := range []int{16, 32, 64} {
			m := meshtest.Plate(1, 1, n, n, 0, 0)
			v := nearest(m, x, y, 0)
			if math.Abs(m.Positions[3*v]-x)+math.Abs(m.Positions[3*v+1]-y) > 1e-9 || y > 1-2.0/16 {
				continue
			}
			cold := vertices(m, func(x, y, _ float64) bool { return x == 0 || x == 1 || y == 0 })
			hot := vertices(m, func(x, y, _ float64) bool { return y == 1 })
			hold := held(m.NumVertices(), 0, cold)
			for _, v := range hot {
				hold[v] = 1
				if x := m.Positions[3*v]; x == 0 || x == 1 {
					hold[v] = 0.5
				}
			}
			u, solveError, err := solverFor(t, m, Options{}).Steady(context.Background(), &Problem{Hold: hold})
			if err != nil {
				t.Fatal(err)
			}
			if solveError > 1e-14 {
				t.Errorf("n=%d: error of the solve %g", n, solveError)
			}
			errs = append(errs, math.Abs(u[v]-want))
		}
		switch {
		case x == 0.5 && y == 0.5:
			if errs[2] > 1e-13 { // condition 1e3
				t.Errorf("centre: %.3g off 1/4", errs[2])
			}
		case len(errs) == 3:
			checkOrder(t, fmt.Sprintf("plate (%g, %g)", x, y), errs, 1e-3)
		}
	}
}

// Fins: heat conducted along, lost over the faces. Δθ = m²θ, θ = 1 at the base.
func TestSteadyFins(t *testing.T) {
	for _, row := range readTable(t, "heat_fin_straight.csv").rows {
		ml, x := number(t, row, "mL"), number(t, row, "x_over_L")
		if x == 0 || ml > 2 {
			continue
		}
		var errs, efficiency []float64
		for _, n := range []int{8, 16, 32} {
			m := meshtest.Plate(1, 0.25, n, n/4, 0, 0)
			s := solverFor(t, m, Options{})
			base := vertices(m, func(x, _, _ float64) bool { return x == 0 })
			u, _, err := s.Steady(context.Background(), &Problem{Hold: held(m.NumVertices(), 1, base), Exchanges: []Exchange{s.FaceExchange(ml*ml, 0)}})
			if err != nil {
				t.Fatal(err)
			}
			errs = append(errs, math.Abs(u[nearest(m, x, 0.125, 0)]-number(t, row, "theta_adiabatic_tip")))
			efficiency = append(efficiency, math.Abs(s.heatOf(s.inward(u))/0.25-number(t, row, "efficiency_adiabatic_tip")))
		}
		checkOrder(t, fmt.Sprintf("straight fin mL=%g x=%g", ml, x), errs, 1e-3)
		checkOrder(t, fmt.Sprintf("straight fin mL=%g efficiency", ml), efficiency, 1e-3)
	}
	for _, row := range readTable(t, "heat_fin_annular.csv").rows {
		r1, r2, k, radius := number(t, row, "r1"), number(t, row, "r2"), number(t, row, "m"), number(t, row, "r")
		if radius != r2 || k*(r2-r1) > 3 {
			continue
		}
		var errs []float64
		for _, rows := range []int{8, 16, 32} {
			m := annulus(r1, r2, 8*rows, rows)
			s := solverFor(t, m, Options{})
			base := vertices(m, func(x, y, _ float64) bool { return math.Abs(math.Hypot(x, y)-r1) < 1e-9 })
			u, _, err := s.Steady(context.Background(), &Problem{Hold: held(m.NumVertices(), 1, base), Exchanges: []Exchange{s.FaceExchange(k*k, 0)}})
			if err != nil {
				t.Fatal(err)
			}
			errs = append(errs, math.Abs(u[rows]-number(t, row, "theta"))) // vertex rows: column 0, on the rim
		}
		checkOrder(t, fmt.Sprintf("annular fin %g..%g m=%g", r1, r2, k), errs, 3e-3)
	}
}

// Annulus with held rims: heat flow 2π/ln(b/a), from the balance of a long run.
func TestAnnulusFlow(t *testing.T) {
	row := readTable(t, "heat_annulus.csv").rows[0]
	a, b, want := number(t, row, "a"), number(t, row, "b"), number(t, row, "flow_over_k_thickness_dT")
	var errs []float64
	for _, rows := range []int{8, 16, 32} {
		m := annulus(a, b, 8*rows, rows)
		s := solverFor(t, m, Options{})
		rim := func(radius float64) []int32 {
			return vertices(m, func(x, y, _ float64) bool { return math.Abs(math.Hypot(x, y)-radius) < 1e-9 })
		}
		hold := held(m.NumVertices(), 0, rim(a))
		for _, v := range rim(b) {
			hold[v] = 1
		}
		steady, _, err := s.Steady(context.Background(), &Problem{Hold: hold})
		if err != nil {
			t.Fatal(err)
		}
		// From the steady field on nothing changes, and what the hot rim gives the cold
		// one takes: the energy of u, per unit of time.
		r, err := s.Diffuse(context.Background(), &Problem{Hold: hold, Initial: steady}, []float64{1}, FlowOptions{})
		if err != nil {
			t.Fatal(err)
		}
		if d := maxDiff(r.Fields[0], steady); d > 1e-8 {
			t.Errorf("the steady field moves by %g", d)
		}
		lu, flow := make([]float64, len(steady)), 0.0
		s.stiffness.MulVecTo(lu, s.inward(steady))
		lu = s.outward(lu)
		for _, v := range rim(b) {
			flow += lu[v]
		}
		errs = append(errs, math.Abs(flow-want)/want)
	}
	checkOrder(t, "annulus flow", errs, 2e-3)
}

// A plane wall that loses heat at its surface: series over 60 roots (table). The wall
// is a strip insulated at x = 0, the middle, with -du/dn = Bi u at x = 1.
func TestPlaneWall(t *testing.T) {
	for _, bi := range []float64{0.1, 1, 10} {
		errs := map[float64][]float64{}
		for _, n := range []int{8, 16, 32} {
			m := meshtest.Plate(1, 0.25, n, n/4, 0, 0)
			surface, err := mesh.NewSurface(m)
			if err != nil {
				t.Fatal(err)
			}
			var edges [][2]int32
			end := vertices(m, func(x, _, _ float64) bool { return x == 1 })
			for i := 1; i < len(end); i++ {
				edges = append(edges, [2]int32{end[i-1], end[i]})
			}
			if err := surface.Place([]mesh.Datum{mesh.AtEdges(edges)}); err != nil {
				t.Fatal(err)
			}
			surface.Delaunay(1000)
			s, err := NewSolver(context.Background(), surface, Options{})
			if err != nil {
				t.Fatal(err)
			}
			times := []float64{0.2, 0.5, 1}
			r, err := s.Diffuse(context.Background(), &Problem{Initial: uniform(len(s.lumped), 1), Exchanges: []Exchange{s.EdgeExchange(0, bi, 0)}}, times, FlowOptions{})
			if err != nil {
				t.Fatal(err)
			}
			for _, row := range readTable(t, "heat_wall_midplane.csv").rows {
				for k, time := range times {
					if number(t, row, "Bi") == bi && number(t, row, "Fo") == time {
						errs[time] = append(errs[time], math.Abs(r.Fields[k][nearest(m, 0, 0.125, 0)]-number(t, row, "theta_midplane")))
					}
				}
			}
			for k := range times {
				if b := r.Balances[k]; b.Error > 1e-8 || math.Abs(b.Begin-0.25) > 1e-13 || b.Lost[0] <= 0 {
					t.Errorf("Bi=%g n=%d: balance %+v", bi, n, b)
				}
			}
		}
		for time, e := range errs {
			if len(e) != 3 {
				t.Fatalf("Bi=%g Fo=%g: not in the table", bi, time)
			}
			if time == 0.2 { // the series' second term is still there, with an error of its own sign
				if e[2] > 1e-4 {
					t.Errorf("wall Bi=%g Fo=0.2: errors %.3g", bi, e)
				}
				continue
			}
			checkOrder(t, fmt.Sprintf("wall Bi=%g Fo=%g", bi, time), e, 1e-3)
		}
	}
}

// Uniform heat that is lost over the faces stays uniform: exp(-ht) on every mesh, and
// what backward Euler makes of it, to the table's digits.
func TestFaceLoss(t *testing.T) {
	m := meshtest.ShakenSphere(2, 5)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	for _, row := range readTable(t, "heat_lumped.csv").rows {
		h, time, want := number(t, row, "h"), number(t, row, "t"), number(t, row, "u")
		r, err := s.Diffuse(context.Background(), &Problem{Initial: uniform(n, 1), Exchanges: []Exchange{s.FaceExchange(h, 0)}}, []float64{time}, FlowOptions{})
		if err != nil {
			t.Fatal(err)
		}
		for v, u := range r.Fields[0] {
			if math.Abs(u-want) > 1e-11 { // rounding of an operator of norm 1e3 at γ ~ t/13
				t.Fatalf("h=%g t=%g vertex %d: %.15g, want %.15g", h, time, v, u, want)
			}
		}
	}
	for _, row := range readTable(t, "heat_lumped_steppers.csv").rows {
		h, steps := number(t, row, "h"), integer(t, row, "steps")
		r, err := s.Diffuse(context.Background(), &Problem{Initial: uniform(n, 1), Exchanges: []Exchange{s.FaceExchange(h, 0)}},
			[]float64{number(t, row, "dt") * float64(steps)}, FlowOptions{Stepper: ImplicitEuler, Steps: steps})
		if err != nil {
			t.Fatal(err)
		}
		if got, want := r.Fields[0][3], number(t, row, "backward_euler"); math.Abs(got-want) > 1e-15*float64(steps+100) {
			t.Errorf("h=%g %d steps: %.15g, want %.15g", h, steps, got, want)
		}
		if r.Balances[0].Error > 1e-13 {
			t.Errorf("h=%g %d steps: balance %+v", h, steps, r.Balances[0])
		}
	}
}

// Heat left in a square of which all edges are held at 0 (table: the square of the
// segment's content). The layer at the edge is √t wide, so h is well below that.
func TestHeatContentOfASquare(t *testing.T) {
	var times, want []float64
	for _, row := range readTable(t, "kernel_heat_content.csv").rows {
		if row["region"] == "unit square held" && number(t, row, "t") >= 0.005 {
			times, want = append(times, number(t, row, "t")), append(want, number(t, row, "value"))
		}
	}
	errs := make([][]float64, len(times))
	for _, n := range []int{16, 32, 64} {
		m := meshtest.Plate(1, 1, n, n, 0, 0)
		s := solverFor(t, m, Options{})
		edge := vertices(m, func(x, y, _ float64) bool { return x == 0 || y == 0 || x == 1 || y == 1 })
		r, err := s.Diffuse(context.Background(), &Problem{Initial: uniform(m.NumVertices(), 1), Hold: held(m.NumVertices(), 0, edge)}, times, FlowOptions{})
		if err != nil {
			t.Fatal(err)
		}
		for k := range times {
			// Trapezoidal sums of a smooth bump lose nothing to the lumping inside.
			errs[k] = append(errs[k], math.Abs(r.Balances[k].Inside-want[k])/want[k])
			if b := r.Balances[k]; b.Error > 1e-8 || b.Held <= 0 {
				t.Errorf("n=%d t=%g: balance %+v", n, times[k], b)
			}
		}
	}
	for k, time := range times {
		if time <= 0.2 { // at t = 1 the content is e^-20, and its relative error follows λh²
			checkOrder(t, fmt.Sprintf("content t=%g", time), errs[k], 5e-3)
		}
	}
}

// A step in temperature at the end of a long strip: erfc(x/(2√(Dt))), table.
func TestSemiInfinite(t *testing.T) {
	const d, time = 0.5, 0.02 // √(Dt) = 0.1, the strip is ten of it long
	for _, stepper := range []FlowOptions{{}, {Stepper: ImplicitEuler, Steps: 400}} {
		m := meshtest.Plate(1, 0.05, 100, 5, 0, 0)
		s := solverFor(t, m, Options{})
		end := vertices(m, func(x, _, _ float64) bool { return x == 0 })
		r, err := s.Diffuse(context.Background(), &Problem{Diffusivity: d, Hold: held(m.NumVertices(), 1, end)}, []float64{time}, stepper)
		if err != nil {
			t.Fatal(err)
		}
		for _, row := range readTable(t, "heat_semi_infinite.csv").rows {
			x := 2 * number(t, row, "eta") * math.Sqrt(d*time)
			v := nearest(m, x, 0, 0)
			if math.Abs(m.Positions[3*v]-x) > 1e-9 {
				continue
			}
			// h²/(8Dt) is 1e-3; 400 Euler steps are good to 1/400 of a value's change.
			if got, want := r.Fields[0][v], number(t, row, "erfc"); math.Abs(got-want) > 2e-3 {
				t.Errorf("%+v x=%g: %.5f, want %.5f", stepper, x, got, want)
			}
		}
		// The table's flux factor, integrated over time from 0: 2√(Dt/π) per unit width.
		if got, want := -r.Balances[0].Held/0.05, 2*math.Sqrt(d*time/math.Pi); math.Abs(got-want) > 0.05*want {
			t.Errorf("%+v: %.5f came in, want %.5f", stepper, got, want)
		}
		if r.Balances[0].Error > 1e-8 {
			t.Errorf("%+v: balance %+v", stepper, r.Balances[0])
		}
	}
}

// denseFlow is a Problem's field by dense eigen-decomposition of its own system.
func denseFlow(y *system, times []float64) [][]float64 {
	s := y.solver
	var free []int
	place := map[int]int{}
	for v, h := range y.held {
		if !h {
			place[v] = len(free)
			free = append(free, v)
		}
	}
	d := &denseKernel{root: make([]float64, len(free))}
	for i, v := range free {
		d.root[i] = math.Sqrt(s.lumped[v])
	}
	d.factorize(func(set func(i, j int, x float64)) {
		for i, v := range free {
			set(i, i, y.k.Diag[v]/s.lumped[v])
			for k := y.k.Ptr[v]; k < y.k.Ptr[v+1]; k++ {
				if j, ok := place[int(y.k.Adj[k])]; ok {
					set(i, j, y.k.Off[k]/(d.root[i]*d.root[j]))
				}
			}
		}
	})
	out := make([][]float64, len(times))
	for k, t := range times {
		p, b := make([]float64, len(free)), make([]float64, len(free))
		for i, v := range free {
			p[i], b[i] = y.p[v], y.b[v]
		}
		u := append([]float64(nil), y.lift...)
		faded := d.apply(func(x float64) float64 { return math.Exp(-t * x) }, p)
		given := d.apply(func(x float64) float64 {
			if math.Abs(t*x) < 1e-9 {
				return t * (1 - t*x/2)
			}
			return -math.Expm1(-t*x) / x
		}, b)
		for i, v := range free {
			u[v] += faded[i] + given[i]
		}
		out[k] = s.outward(u)
	}
	return out
}

// Everything at once: held and fed vertices, losses, initial fields, from very short
// times to very long ones. The measured error is within tolerance and estimate.
func TestDiffuseKeepsItsTolerance(t *testing.T) {
	m := meshtest.Plate(1, 1, 12, 12, 0.2, 9)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	wave, rate, point := make([]float64, n), make([]float64, n), make([]float64, n)
	for v := range m.NumVertices() {
		wave[v] = math.Sin(5*m.Positions[3*v]) * math.Cos(3*m.Positions[3*v+1])
	}
	rate[40], rate[90], point[17] = 2, -0.5, 3
	edge := vertices(m, func(x, _, _ float64) bool { return x == 0 })
	corner := make([]float64, n)
	corner[m.NumVertices()-1] = 0.3
	faces := Exchange{Name: "faces", Weight: s.FaceExchange(0.7, 0).Weight, Ambient: 2}
	problems := map[string]*Problem{
		"insulated and fed":  {Rate: rate, Initial: wave},
		"held":               {Hold: held(n, 1.5, edge), Load: point},
		"losing":             {Exchanges: []Exchange{faces, {Name: "corner", Weight: corner, Ambient: -1}}, Initial: wave, Diffusivity: 0.3},
		"held, losing, fed":  {Hold: held(n, -1, edge), Exchanges: []Exchange{faces}, Rate: rate, Load: point, Initial: wave},
		"at rest, then held": {Hold: held(n, 1, edge)},
	}
	var times []float64
	for e := -4.0; e <= 2; e += 0.75 {
		times = append(times, math.Pow(10, e))
	}
	for name, pr := range problems {
		y, err := s.newSystem(pr)
		if err != nil {
			t.Fatal(err)
		}
		want := denseFlow(y, times)
		for _, tolerance := range []float64{1e-4, 1e-6, 1e-8, 1e-10} {
			r, err := s.Diffuse(context.Background(), pr, times, FlowOptions{Tolerance: tolerance})
			if err != nil {
				t.Fatal(err)
			}
			for k, time := range times {
				got := maxDiff(r.Fields[k], want[k]) / maxAbs(want[k])
				// The dense decomposition's own rounding.
				const floor = 2e-11
				if got > tolerance+floor || got > r.ErrorEstimates[k]+floor {
					t.Errorf("%s, tolerance %g, t=%.3g: error %.3g, estimate %.3g", name, tolerance, time, got, r.ErrorEstimates[k])
				}
				if b := r.Balances[k]; b.Error > 100*tolerance {
					t.Errorf("%s, tolerance %g, t=%.3g: balance %+v", name, tolerance, time, b)
				}
			}
			t.Logf("%s, tolerance %g: %d solves, %d factorisations", name, tolerance, r.Solves, r.Factorizations)
		}
	}
}

// A run to late times ends in the steady state, by another way.
func TestSteadyIsTheLimit(t *testing.T) {
	m := meshtest.Plate(1, 1, 12, 12, 0.2, 9)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	rate := make([]float64, n)
	rate[40], rate[90] = 2, -2
	edge := vertices(m, func(x, _, _ float64) bool { return x == 0 })
	for name, pr := range map[string]*Problem{
		"source and sink": {Rate: rate, Initial: uniform(n, 3)},
		"held":            {Rate: rate, Hold: held(n, 1, edge)},
		"losing":          {Rate: rate, Exchanges: []Exchange{s.FaceExchange(0.5, -2)}},
	} {
		steady, _, err := s.Steady(context.Background(), pr)
		if err != nil {
			t.Fatal(err)
		}
		r, err := s.Diffuse(context.Background(), pr, []float64{1e4}, FlowOptions{Tolerance: 1e-10})
		if err != nil {
			t.Fatal(err)
		}
		if d := maxDiff(steady, r.Fields[0]); d > 1e-9*maxAbs(steady) {
			t.Errorf("%s: steady state and late field differ by %g", name, d)
		}
	}
	rate[90] = -1
	var bad *SteadyError
	if _, _, err := s.Steady(context.Background(), &Problem{Rate: rate}); !errors.As(err, &bad) {
		t.Errorf("more put in than taken out: got %v, want a *SteadyError", err)
	}
}

// Backward Euler stays in the range of its data, where Krylov may leave it by its
// tolerance.
func TestDiffuseKeepsTheMaximumPrinciple(t *testing.T) {
	m := meshtest.Plate(1, 1, 16, 16, 0.2, 4)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	step := make([]float64, n)
	for v := range m.NumVertices() {
		if m.Positions[3*v] > 0.5 {
			step[v] = 1
		}
	}
	edge := vertices(m, func(_, y, _ float64) bool { return y == 0 })
	pr := &Problem{Initial: step, Hold: held(n, 0.5, edge), Exchanges: []Exchange{s.FaceExchange(3, 0.25)}}
	for _, steps := range []int{1, 5} {
		r, err := s.Diffuse(context.Background(), pr, []float64{1e-6, 1e-3, 1, 1000}, FlowOptions{Stepper: ImplicitEuler, Steps: steps})
		if err != nil {
			t.Fatal(err)
		}
		for k, field := range r.Fields {
			for v, u := range field {
				if u < 0 || u > 1+1e-15 {
					t.Fatalf("steps=%d field %d vertex %d: %g", steps, k, v, u)
				}
			}
			if r.Balances[k].Error > 1e-12 {
				t.Errorf("steps=%d field %d: balance %+v", steps, k, r.Balances[k])
			}
		}
	}
}

// Step doubling ends with an error that its estimate tells to a fifth (the next term is
// a step smaller), and says so where it gave up.
func TestStepDoubling(t *testing.T) {
	m := meshtest.Plate(1, 1, 10, 10, 0, 0)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	edge := vertices(m, func(x, _, _ float64) bool { return x == 0 })
	pr := &Problem{Hold: held(n, 1, edge), Initial: uniform(n, 0.2)}
	times := []float64{0.05, 0.3}
	exact, err := s.Diffuse(context.Background(), pr, times, FlowOptions{Tolerance: 1e-10})
	if err != nil {
		t.Fatal(err)
	}
	for _, tolerance := range []float64{1e-2, 1e-3, 1e-4} {
		r, err := s.Diffuse(context.Background(), pr, times, FlowOptions{Stepper: ImplicitEuler, Tolerance: tolerance})
		if err != nil {
			t.Fatal(err)
		}
		for k := range times {
			got := maxDiff(r.Fields[k], exact.Fields[k]) / maxAbs(exact.Fields[k])
			if got > 1.2*r.ErrorEstimates[k] || got < 0.8*r.ErrorEstimates[k] || r.ErrorEstimates[k] > tolerance {
				t.Errorf("tolerance %g t=%g: error %.3g, estimate %.3g", tolerance, times[k], got, r.ErrorEstimates[k])
			}
		}
		if len(r.Warnings) > 0 {
			t.Errorf("tolerance %g: warnings %q", tolerance, r.Warnings)
		}
	}
	r, err := s.Diffuse(context.Background(), pr, times[:1], FlowOptions{Stepper: ImplicitEuler, Tolerance: 1e-9})
	if err != nil {
		t.Fatal(err)
	}
	if len(r.Warnings) != 1 || r.ErrorEstimates[0] < 1e-9 {
		t.Errorf("tolerance 1e-9: estimate %g, warnings %q", r.ErrorEstimates[0], r.Warnings)
	}
}

func TestDiffuseRefusesBadFields(t *testing.T) {
	m := meshtest.Tetrahedron(0)
	m.Positions = append(m.Positions, 7, 7, 7)
	s := solverFor(t, m, Options{})
	n := len(s.lumped)
	bad := func(v int, x float64) []float64 {
		u := make([]float64, n)
		u[v] = x
		return u
	}
	for name, pr := range map[string]*Problem{
		"initial NaN":         {Initial: bad(1, math.NaN())},
		"load infinite":       {Load: bad(1, math.Inf(1))},
		"load in no triangle": {Load: bad(4, 1)},
		"rate NaN":            {Rate: bad(0, math.NaN())},
		"hold infinite":       {Hold: bad(0, math.Inf(1))},
		"coefficient below 0": {Exchanges: []Exchange{{Weight: bad(2, -1)}}},
	} {
		var field *FieldError
		if _, err := s.Diffuse(context.Background(), pr, []float64{1}, FlowOptions{}); !errors.As(err, &field) {
			t.Errorf("%s: got %v, want a *FieldError", name, err)
		}
	}
	var option *OptionError
	if _, err := s.Diffuse(context.Background(), &Problem{Exchanges: []Exchange{s.FaceExchange(1, math.NaN())}}, []float64{1}, FlowOptions{}); !errors.As(err, &option) {
		t.Errorf("ambient NaN: got %v, want an *OptionError", err)
	}
	var time *TimeError
	if _, err := s.Diffuse(context.Background(), &Problem{}, []float64{-1}, FlowOptions{}); !errors.As(err, &time) {
		t.Errorf("time -1: got %v, want a *TimeError", err)
	}
	// All held, or nothing at all: no unknowns, no heat, and still an answer.
	for _, pr := range []*Problem{{}, {Hold: uniform(n, 2)}} {
		r, err := s.Diffuse(context.Background(), pr, []float64{1}, FlowOptions{})
		if err != nil {
			t.Fatal(err)
		}
		if want := 2.0; pr.Hold != nil && r.Fields[0][0] != want || pr.Hold == nil && r.Fields[0][0] != 0 || !math.IsNaN(r.Fields[0][4]) {
			t.Errorf("%+v: field %v", pr, r.Fields[0])
		}
	}
}

func ExampleSolver_Diffuse() {
	// A strip, cold at first, is held at 100 degrees at its left end.
	m := meshtest.Plate(1, 0.1, 50, 5, 0, 0)
	surface, err := mesh.NewSurface(m)
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
	hold := make([]float64, surface.NumVertices)
	for v := range hold {
		hold[v] = math.NaN() // free
		if surface.Positions[3*v] == 0 {
			hold[v] = 100
		}
	}
	r, err := s.Diffuse(context.Background(), &Problem{Diffusivity: 0.5, Hold: hold}, []float64{0.1, 10}, FlowOptions{})
	if err != nil {
		fmt.Println(err)
		return
	}
	far := m.NumVertices() - 1
	fmt.Printf("far end: %.1f at t = 0.1, %.1f at t = 10\n", r.Fields[0][far], r.Fields[1][far])
	fmt.Printf("heat taken in: %.2f, then %.2f\n", -r.Balances[0].Held, -r.Balances[1].Held)
	// Output:
	// far end: 0.3 at t = 0.1, 100.0 at t = 10
	// heat taken in: 2.42, then 9.90
}
