package kernel

import (
	"context"
	"math"
	"slices"
)

// euler advances by backward Euler,
//
//	(M + τL) u(t+τ) = M u(t),
//
// with the same number of equal steps from each output time to the next; so early
// times, where heat moves fast, get short steps. A field after N steps from 0 to t is
// the exact one (of the mesh) averaged over times with the Gamma distribution of N
// stages, mean t and variance t²/N: nowhere below 0, nowhere above the largest
// initial value, of the same total. At a point source in the plane 1/t averages to
// 1/t·N/(N-1): it comes out too high by 1/(N-1), and all else is off by less than
// that part of the peak.
func (f *flow) euler(ctx context.Context, steps int) error {
	s, r := f.solver, f.result
	n := len(f.load)
	u := make([]float64, n)
	b := slices.Clone(f.load)
	now, tau := 0.0, 0.0
	variance := 0.0
	for k, i := range f.order {
		interval := f.reach[i] - now
		if interval > 0 {
			// Equal intervals differ by rounding; one factor is to serve them all.
			if next := interval / float64(steps); math.Abs(next-tau) > 1e-12*tau {
				tau = next
			}
			factor, fresh, err := s.shifted(ctx, f.shifts(tau))
			if err != nil {
				return err
			}
			if fresh {
				r.Factorizations++
			}
			solve := factor.SolveTo
			if s.leak(f.warm)*interval > 1e-12 {
				solve = (&refined{solver: s, factor: factor, mass: true, tau: tau, held: f.cold()}).SolveTo
			}
			for step := range steps {
				if err := ctx.Err(); err != nil {
					s.release(factor)
					return err
				}
				solve(u, b)
				r.Solves++
				s.massTo(b, u)
				s.options.Progress("heat", (float64(k)+float64(step+1)/float64(steps))/float64(len(f.order)))
			}
			s.release(factor)
			variance += interval * interval / float64(steps)
			now = f.reach[i]
		}
		field := slices.Clone(u)
		f.blank(field)
		r.Fields[i] = field
		spread := variance / (now * now)
		r.ErrorEstimates[i] = spread / max(0, 1-spread)
	}
	return nil
}
