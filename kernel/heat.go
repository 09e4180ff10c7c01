package kernel

import (
	"context"
	"fmt"
	"math"
	"slices"
)

// A Stepper is a way to advance heat in time.
type Stepper string

const (
	// Krylov takes all times asked for from a few Krylov spaces, to a stated tolerance.
	Krylov Stepper = "krylov"
	// ImplicitEuler takes backward Euler steps: of first order, but with the maximum
	// principle step by step.
	ImplicitEuler Stepper = "implicit-euler"
)

// HeatOptions say how heat is advanced. The zero value is Krylov at the default
// tolerance, with diffusivity 1.
type HeatOptions struct {
	Diffusivity float64 // D in length² per unit of time; 0 means 1
	Stepper     Stepper // "" means Krylov
	Tolerance   float64 // Krylov: error in time over the largest value; 0 means 1e-8
	Steps       int     // ImplicitEuler: steps up to each output time from the one before; 0 means 100
}

// Defaults of HeatOptions.
const (
	DefaultTolerance = 1e-8
	DefaultSteps     = 100
)

// A HeatResult holds fields at the times asked for, in the order asked for. Every
// slice has one entry for each.
type HeatResult struct {
	Fields        [][]float64 // values per unit area at all surface vertices; NaN where heat never comes
	Totals        []float64   // heat found: the area integral of the field
	BalanceErrors []float64   // |total - heat put in| over the heat put in
	// ErrorEstimates bound the error of the stepper in time, over the largest value.
	// Krylov's is a-posteriori; implicit Euler's is that of a point in the plane.
	ErrorEstimates []float64
	// MeshErrors estimate what the edges near the source do to the values there,
	// h²/(8Dt) relative, h being the longest edge where the field is above a tenth of
	// its largest value (or at the source).
	MeshErrors     []float64
	Lowest         []float64 // the least value; rounding and tolerance may put it a hair below 0
	Largest        []float64
	Solves         int
	Factorizations int
	Spaces         int // Krylov spaces built
	Warnings       []string
}

// HeatKernels spreads the heat of load, an amount at each vertex of the surface (see
// mesh.Surface.Load), for each of the times, by
//
//	M du/dt = -D L u,  M u(0) = load.
//
// With a load that adds up to 1 these are heat kernels: values per unit area, whose
// area integral is 1 at all times. The field is NaN on components without heat and at
// vertices in no triangle.
//
// Krylov costs some 25 solves at the default tolerance and one factorisation for all
// times within a factor of 30; memory: as many vectors as solves, at most 64.
// Implicit Euler costs HeatOptions.Steps solves for each time and one factorisation
// for each different step.
//
// The error is a *TimeError, an *OptionError, a *LoadError or ctx.Err(). That a time
// is too short for the mesh, or that a tolerance was not reached, is a warning.
// HeatKernels panics if load has the wrong length.
func (s *Solver) HeatKernels(ctx context.Context, load []float64, times []float64, opt HeatOptions) (*HeatResult, error) {
	if len(load) != len(s.lumped) {
		panic("kernel: HeatKernels: length of the load is not the number of surface vertices")
	}
	opt, err := opt.withDefaults()
	if err != nil {
		return nil, err
	}
	for i, t := range times {
		if !(t > 0) || math.IsInf(t, 0) {
			return nil, &TimeError{i, t}
		}
	}
	flow, err := s.newFlow(s.inward(load))
	if err != nil {
		return nil, err
	}
	// From here on time is measured by D·t, shortest first.
	flow.reach = make([]float64, len(times))
	flow.order = make([]int, len(times))
	for i, t := range times {
		flow.reach[i], flow.order[i] = opt.Diffusivity*t, i
		if x := flow.reach[i]; !(x > 0) || math.IsInf(x, 0) {
			return nil, &TimeError{i, t}
		}
	}
	slices.SortStableFunc(flow.order, func(a, b int) int {
		switch x, y := flow.reach[a], flow.reach[b]; {
		case x < y:
			return -1
		case x > y:
			return 1
		}
		return 0
	})
	k := len(times)
	flow.result = &HeatResult{
		Fields: make([][]float64, k), Totals: make([]float64, k), BalanceErrors: make([]float64, k),
		ErrorEstimates: make([]float64, k), MeshErrors: make([]float64, k),
		Lowest: make([]float64, k), Largest: make([]float64, k),
	}
	if opt.Stepper == Krylov {
		err = flow.krylov(ctx, opt.Tolerance)
	} else {
		err = flow.euler(ctx, opt.Steps)
	}
	if err != nil {
		return nil, err
	}
	for i, t := range times {
		flow.judge(i, t, opt)
	}
	for i, u := range flow.result.Fields {
		flow.result.Fields[i] = s.outward(u)
	}
	return flow.result, nil
}

func (o HeatOptions) withDefaults() (HeatOptions, error) {
	if o.Diffusivity == 0 {
		o.Diffusivity = 1
	}
	if o.Stepper == "" {
		o.Stepper = Krylov
	}
	if o.Tolerance == 0 {
		o.Tolerance = DefaultTolerance
	}
	if o.Steps == 0 {
		o.Steps = DefaultSteps
	}
	switch {
	case !(o.Diffusivity > 0) || math.IsInf(o.Diffusivity, 0):
		return o, &OptionError{"diffusivity", "a finite number above 0", fmt.Sprint(o.Diffusivity)}
	case o.Stepper != Krylov && o.Stepper != ImplicitEuler:
		return o, &OptionError{"stepper", fmt.Sprintf("%s or %s", Krylov, ImplicitEuler), fmt.Sprintf("%q", string(o.Stepper))}
	case !(o.Tolerance > 0 && o.Tolerance < 1):
		return o, &OptionError{"tolerance", "a number between 0 and 1", fmt.Sprint(o.Tolerance)}
	case o.Steps < 1:
		return o, &OptionError{"steps", "1 or more", fmt.Sprint(o.Steps)}
	}
	return o, nil
}

// A flow is one call of HeatKernels.
type flow struct {
	solver *Solver
	load   []float64
	heat   []float64 // by component: how much of it
	total  float64
	warm   []bool    // by component: has any
	reach  []float64 // D·t, in the order asked for
	order  []int     // shortest first
	result *HeatResult
}

func (s *Solver) newFlow(load []float64) (*flow, error) {
	f := &flow{solver: s, load: load, heat: make([]float64, len(s.area)), warm: make([]bool, len(s.area))}
	for i, q := range load {
		c := s.component[i]
		switch {
		case !(q >= 0) || math.IsInf(q, 0):
			return nil, &LoadError{s.vertexOut(i), q, "want a finite amount, 0 or more"}
		case q == 0:
		case c < 0:
			return nil, &LoadError{s.vertexOut(i), q, "the vertex is in no triangle of positive area; choose another"}
		default:
			f.heat[c] += q
			f.total += q
			f.warm[c] = true
		}
	}
	if !(f.total > 0) || math.IsInf(f.total, 0) {
		return nil, &LoadError{-1, f.total, "no heat was given; want a total above 0"}
	}
	return f, nil
}

// shifts is the argument of factorShifted for one τ on all warm components.
func (f *flow) shifts(tau float64) []float64 {
	all := make([]float64, len(f.warm))
	for c, warm := range f.warm {
		all[c] = tau
		if !warm {
			all[c] = math.NaN()
		}
	}
	return all
}

// blank puts NaN where heat never comes.
func (f *flow) blank(u []float64) {
	for i, c := range f.solver.component {
		if c < 0 || !f.warm[c] {
			u[i] = math.NaN()
		}
	}
}

// judge fills in what the result says about field i, at time t.
func (f *flow) judge(i int, t float64, opt HeatOptions) {
	s, r, u := f.solver, f.result, f.result.Fields[i]
	lowest, largest := math.Inf(1), math.Inf(-1)
	for _, x := range u {
		if x < lowest {
			lowest = x
		}
		if x > largest {
			largest = x
		}
	}
	r.Lowest[i], r.Largest[i] = lowest, largest
	r.Totals[i] = s.heatOf(u)
	r.BalanceErrors[i] = math.Abs(r.Totals[i]-f.total) / f.total
	if opt.Stepper == Krylov && r.ErrorEstimates[i] > opt.Tolerance {
		r.Warnings = append(r.Warnings, fmt.Sprintf("t = %g: the error in time is estimated at %.2g of the largest value, above the tolerance %g: rounding allows no better, with triangles this thin or a tolerance this low", t, r.ErrorEstimates[i], opt.Tolerance))
	}
	if floor := -max(opt.Tolerance, 1e-12) * largest; lowest < floor {
		r.Warnings = append(r.Warnings, fmt.Sprintf("t = %g: values fall to %.3g (largest %.3g): the mass matrix or a negative edge weight does not keep signs", t, lowest, largest))
	}
	edge, slow := f.longestEdge(u, largest)
	r.MeshErrors[i] = slow / f.reach[i] * slow / 8
	if off := 100 * r.MeshErrors[i]; off > 5 {
		effect := fmt.Sprintf("put values off by about %.2g %%", off)
		if off > 100 {
			effect = "cannot carry it"
		}
		r.Warnings = append(r.Warnings, fmt.Sprintf("t = %g is short for this mesh: edges of %.3g where the heat is %s; --max-edge %.2g brings that to 1 %%",
			t, edge, effect, ResolvingEdge(opt.Diffusivity*s.surface.LeastDensity(), t)))
	}
}

// longestEdge is the longest edge of the triangles that matter to the peak of u: at
// the source, or where u is above a tenth of its largest value; slow is the same over
// the root of the density, as a face of density 1 would have it.
func (f *flow) longestEdge(u []float64, largest float64) (longest, slow float64) {
	s := f.solver.surface
	if s == nil {
		return 0, 0
	}
	for face := 0; face < len(s.Vert); face += 3 {
		matters := false
		for _, v := range s.Vert[face : face+3] {
			matters = matters || f.load[v] > 0 || u[v] > 0.1*largest
		}
		if matters {
			edge := max(s.Length[face], s.Length[face+1], s.Length[face+2])
			longest, slow = max(longest, edge), max(slow, s.Slow(int32(face/3), edge))
		}
	}
	return longest, slow
}

// ResolvingEdge is the edge length with which a heat kernel at time t is good to
// about 1 % of its largest value. On a lattice of equal triangles with edge h and
// lumped mass, plane waves of wave number k decay as if k² were k²(1 - k²h²/16); the
// value at a source is then too large by h²/(8Dt), relatively, and values elsewhere
// are off by less than that part of it.
func ResolvingEdge(diffusivity, t float64) float64 {
	return math.Sqrt(0.08 * diffusivity * t)
}
