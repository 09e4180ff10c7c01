package kernel

import (
	"context"
	"fmt"
	"math"
	"slices"
)

// FlowOptions say how a Problem is advanced in time. The zero value is Krylov at the
// default tolerance.
type FlowOptions struct {
	Stepper Stepper // "" means Krylov
	// Tolerance is the error in time over the largest value. Krylov: 0 means 1e-8.
	// ImplicitEuler: with Steps 0, steps are doubled until two runs differ by less.
	Tolerance float64
	// Steps are ImplicitEuler's up to each output time from the one before; 0 without a
	// Tolerance means 100.
	Steps int
}

// mostSteps ends the doubling of steps: backward Euler is good to some 1e-5 by then, and
// Krylov does better for less.
const mostSteps = 1 << 15

// A FlowResult holds fields at the times asked for, in the order asked for, and what
// became of the heat. Slices have one entry for each time.
type FlowResult struct {
	Fields         [][]float64 // by surface vertex; NaN at vertices in no triangle
	Balances       []Balance
	ErrorEstimates []float64 // error in time over the largest value; NaN for ImplicitEuler of given Steps
	Solves         int
	Factorizations int
	Warnings       []string
}

// A Balance is where the heat is and where it went from time 0 on:
//
//	Inside = Begin + Put - Held - Σ Lost,
//
// each found on its own: Inside from the field, Put from the data, Lost from the time
// integral of u, Held from the equations of the held vertices. Error is what is
// missing, over the largest heat among them.
type Balance struct {
	Begin  float64   // at time 0, with held values in place
	Inside float64   // at the time
	Put    float64   // by Rate
	Held   float64   // taken out at held vertices; below 0 if they gave
	Lost   []float64 // to each exchange; below 0 if it gave
	Error  float64
}

// Diffuse advances a problem to each of the times. The Krylov stepper is exact in time
// for its constant data up to the tolerance: it takes the two functions exp(-tA) of
// the initial field and (1 - exp(-tA))/A of the constant supply from a Krylov space
// each, with one factor for all times within a factor of 30. Implicit Euler takes
// equal steps from each output time to the next; with lumped mass and Delaunay weights
// its values stay in the range of the data.
//
// Cost: Krylov takes some 25 solves for each space, ImplicitEuler Steps for each time.
// The error is a *TimeError, an *OptionError, a *FieldError or ctx.Err().
func (s *Solver) Diffuse(ctx context.Context, pr *Problem, times []float64, opt FlowOptions) (*FlowResult, error) {
	all, err := HeatOptions{Stepper: opt.Stepper, Tolerance: opt.Tolerance, Steps: opt.Steps}.withDefaults()
	if err != nil {
		return nil, err
	}
	for i, t := range times {
		if !(t > 0) || math.IsInf(t, 0) {
			return nil, &TimeError{i, t}
		}
	}
	y, err := s.newSystem(pr)
	if err != nil {
		return nil, err
	}
	order := make([]int, len(times))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case times[a] < times[b]:
			return -1
		case times[a] > times[b]:
			return 1
		}
		return 0
	})
	r := &FlowResult{Fields: make([][]float64, len(times)), Balances: make([]Balance, len(times)), ErrorEstimates: make([]float64, len(times))}
	f := &march{system: y, times: times, order: order, result: r, tolerance: all.Tolerance}
	switch {
	case all.Stepper == Krylov:
		err = f.krylov(ctx)
	case opt.Steps == 0 && opt.Tolerance > 0:
		err = f.doubling(ctx)
	default:
		err = f.euler(ctx, all.Steps)
	}
	if err != nil {
		return nil, err
	}
	for i, u := range r.Fields {
		r.Fields[i] = s.outward(u)
	}
	for i, e := range r.ErrorEstimates {
		if e > all.Tolerance {
			r.Warnings = append(r.Warnings, fmt.Sprintf("t = %g: the error in time is estimated at %.2g of the largest value, above the tolerance %g", times[i], e, all.Tolerance))
		}
	}
	return r, nil
}

// A march is one call of Diffuse.
type march struct {
	*system
	times     []float64
	order     []int // shortest first
	result    *FlowResult
	tolerance float64
}

// settle stores the free part w at time i and its integral over time, and draws up the
// balance.
func (f *march) settle(i int, w, integral []float64) {
	s, t, pr := f.solver, f.times[i], f.problem
	u, total := make([]float64, len(w)), make([]float64, len(w)) // with held values; its time integral
	for v := range u {
		u[v] = w[v] + f.lift[v]
		total[v] = integral[v] + t*f.lift[v]
	}
	b := Balance{Begin: f.begin, Inside: s.heatOf(u), Lost: make([]float64, len(pr.Exchanges))}
	for _, q := range pr.Rate {
		b.Put += t * q
	}
	for k, e := range pr.Exchanges {
		for v, weight := range e.Weight {
			b.Lost[k] += weight * (total[v] - t*e.Ambient)
		}
	}
	// A held vertex takes out what its own equation leaves over: M du/dt = -K u + put,
	// integrated over time, less the change of M u.
	flow, change, moved := make([]float64, len(w)), make([]float64, len(w)), make([]float64, len(w))
	f.k.MulVecTo(flow, total)
	for v := range change {
		change[v] = w[v]
		if !f.held[v] && pr.Initial != nil {
			change[v] -= pr.Initial[v]
		}
	}
	s.massTo(moved, change)
	for v, h := range f.held {
		switch {
		case !h || s.component[v] < 0:
		case pr.Load != nil:
			b.Held += pr.Load[v] // put there, and gone at once
			b.Begin += pr.Load[v]
			fallthrough
		default:
			b.Held += t*f.put[v] - flow[v] - moved[v]
		}
	}
	missing := b.Inside - b.Begin - b.Put + b.Held
	size := max(math.Abs(b.Inside), math.Abs(b.Begin), math.Abs(b.Put), math.Abs(b.Held))
	for _, q := range b.Lost {
		missing += q
		size = max(size, math.Abs(q))
	}
	if size > 0 {
		b.Error = math.Abs(missing) / size
	}
	for v, c := range s.component {
		if c < 0 {
			u[v] = math.NaN()
		}
	}
	f.result.Fields[i], f.result.Balances[i] = u, b
}

// doubling runs euler with twice the steps of the run before, until the fields of two
// runs differ by less than the tolerance: the error of a first-order method halves, so
// what is left of it in the finer run is about that difference.
func (f *march) doubling(ctx context.Context) error {
	r := f.result
	var before [][]float64
	for steps := 16; ; steps *= 2 {
		if err := f.euler(ctx, steps); err != nil {
			return err
		}
		worst := math.Inf(1)
		if before != nil {
			worst = 0
			for i, u := range r.Fields {
				off, size := 0.0, 0.0
				for v, x := range u {
					if f.solver.component[v] >= 0 {
						off, size = max(off, math.Abs(x-before[i][v])), max(size, math.Abs(x))
					}
				}
				if size > 0 {
					off /= size
				}
				r.ErrorEstimates[i] = off
				worst = max(worst, off)
			}
		}
		if worst <= f.tolerance || 2*steps > mostSteps {
			return nil
		}
		before = slices.Clone(r.Fields)
	}
}

// euler takes equal backward Euler steps from each output time to the next.
func (f *march) euler(ctx context.Context, steps int) error {
	s, r := f.solver, f.result
	n := len(f.p)
	w, rhs, integral := make([]float64, n), slices.Clone(f.p), make([]float64, n)
	factor := s.analysis.NewFactor()
	now, tau := 0.0, 0.0
	solve := factor.SolveTo
	for k, i := range f.order {
		if interval := f.times[i] - now; interval > 0 {
			if next := interval / float64(steps); math.Abs(next-tau) > 1e-12*tau {
				tau = next
				if err := factor.Factorize(ctx, f.matrix(tau), f.held); err != nil {
					return err
				}
				r.Factorizations++
				solve = f.solve(factor, tau, interval, 1e-10)
			}
			for step := range steps {
				if err := ctx.Err(); err != nil {
					return err
				}
				for v, b := range f.b {
					rhs[v] += tau * b
				}
				solve(w, rhs)
				r.Solves++
				for v, x := range w {
					integral[v] += tau * x
				}
				f.massTo(rhs, w)
				s.options.Progress("heat", (float64(k)+float64(step+1)/float64(steps))/float64(len(f.order)))
			}
			now = f.times[i]
		}
		f.settle(i, w, integral)
		r.ErrorEstimates[i] = math.NaN()
	}
	return nil
}
