package kernel

import (
	"context"
	"fmt"
	"math"
)

// A SteadyError is a component whose heat has nowhere to go, or comes from nowhere:
// what is put in grows without end.
type SteadyError struct {
	Component int
	Rate      float64 // heat per unit of time that is left over
}

func (e *SteadyError) Error() string {
	return fmt.Sprintf("component %d gains heat at the rate %g and has no held or losing vertex: there is no steady state; hold an edge, or let faces or edges lose heat", e.Component, e.Rate)
}

// Steady returns the field that a problem tends to as time goes on, and the
// relative error that the solve may have left in it. Components with nothing held and nothing
// lost tend to the mean of their heat, if what is put in there adds up to 0. NaN at
// vertices in no triangle. One factorisation and some two solves.
//
// The error is a *SteadyError, an *OptionError, a *FieldError or ctx.Err().
func (s *Solver) Steady(ctx context.Context, pr *Problem) (u []float64, solveError float64, err error) {
	y, err := s.newSystem(pr)
	if err != nil {
		return nil, 0, err
	}
	start, growth := y.drift()
	gross := make([]float64, len(y.floating))
	held := append([]bool(nil), y.held...)
	pinned := make([]bool, len(y.floating))
	for i, c := range s.component {
		if c < 0 || !y.floating[c] {
			continue
		}
		gross[c] += math.Abs(y.b[i])
		if !pinned[c] { // one vertex stands still; the mean is put right afterwards
			pinned[c], held[i] = true, true
		}
	}
	for c, g := range growth {
		if rate := g * s.area[c]; y.floating[c] && math.Abs(rate) > 1e-12*gross[c] {
			return nil, 0, &SteadyError{c, rate}
		}
	}
	b := append([]float64(nil), y.b...)
	for i, h := range held {
		if h {
			b[i] = 0
		}
	}
	factor := s.analysis.NewFactor()
	if err := factor.Factorize(ctx, y.k, held); err != nil {
		return nil, 0, err
	}
	w := make([]float64, len(b))
	y.held = held
	f := y.refine(factor, false, 1)
	f.SolveTo(w, b)
	solveError = f.worst
	s.centre(w, y.floating)
	for i, c := range s.component {
		switch {
		case c < 0:
			w[i] = math.NaN()
		case y.floating[c]:
			w[i] += start[c]
		default:
			w[i] += y.lift[i]
		}
	}
	return s.outward(w), solveError, nil
}
