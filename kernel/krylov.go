package kernel

import (
	"context"
	"errors"
	"math"

	"heatskin/internal/krylov"
	"heatskin/internal/sparse"
)

const (
	// groupRatio is how far apart the times of one shift may lie. With the shift in the
	// middle, exp(-tx) takes about 36 vectors to 1e-8 at both ends of a factor of 30,
	// against 25 for one time alone (Chebyshev coefficients of g, see package
	// internal/krylov); a factorisation costs more than the 11.
	groupRatio = 30
	// basisLimit bounds the memory of a basis, in vectors. 1e-12 over a whole group
	// takes about that many.
	basisLimit = 64
)

// bestShift is D·t over the shift that needs the fewest vectors: 14 at 1e-8, and in
// proportion to the digits asked for (from the same coefficients).
func bestShift(tolerance float64) float64 { return max(4, -1.7*math.Log10(tolerance)) }

// krylov fills in the fields from Krylov spaces, one for each group of times.
func (f *flow) krylov(ctx context.Context, tolerance float64) error {
	groups := groupTimes(f.order, f.reach)
	for len(groups) > 0 {
		group := groups[0]
		groups = groups[1:]
		left, err := f.space(ctx, group, tolerance)
		if err != nil {
			return err
		}
		groups = append(regroup(group, left), groups...)
	}
	return nil
}

// space fills in the fields of one group, shortest time first, from one Krylov space.
// It returns those whose tolerance was not met with basisLimit vectors; never all of
// them if the group is one time, which is then as good as it gets.
func (f *flow) space(ctx context.Context, group []int, tolerance float64) (left []int, err error) {
	s, r := f.solver, f.result
	shortest, longest := f.reach[group[0]], f.reach[group[len(group)-1]]
	shift := math.Sqrt(shortest) * math.Sqrt(longest) / bestShift(tolerance)
	factor, shift, err := f.factor(ctx, shift)
	if err != nil {
		return nil, err
	}
	defer s.release(factor)
	// What does not vary is kept apart and leaks nothing.
	rounding := s.leak(f.warm) * longest
	solve := factor.SolveTo
	var better *refined
	if rounding > 0.1*tolerance {
		better = &refined{solver: s, factor: factor, mass: true, tau: shift, held: f.cold()}
		solve = better.SolveTo
	}
	process := krylov.NewProcess(&krylov.Pencil{
		Dim: len(f.load), Shift: shift, Workers: s.options.Workers,
		Mass: s.massTo,
		Solve: func(dst, b []float64) {
			solve(dst, b)
			r.Solves++
		},
		Deflate: func(x []float64) { s.centre(x, f.warm) },
	}, f.load)
	r.Spaces++

	uniform := 0.0 // ∫u² of the part that stays
	for c, q := range f.heat {
		if q > 0 {
			uniform += q / s.area[c] * q
		}
	}
	pending := append([]int(nil), group...)
	done := len(f.order) - f.missing()
	for len(pending) > 0 {
		if err := process.Extend(ctx); err != nil {
			return nil, err
		}
		final := process.Len() >= basisLimit || process.Exhausted()
		worst := 0.0
		rest := pending[:0]
		for _, i := range pending {
			y, norm, estimate := process.Evaluate(krylov.Heat(f.reach[i], shift))
			// The largest value is at least ∫u²/∫u.
			relative := estimate * f.total / (uniform + norm*norm)
			if !(relative <= tolerance) && !(final && len(group) == 1) {
				rest = append(rest, i)
				worst = max(worst, relative)
				continue
			}
			r.Fields[i] = f.field(process, y)
			varying := norm / math.Sqrt(uniform+norm*norm)
			if better != nil { // an error of the solve counts as often as the shift goes into t
				rounding = min(rounding, better.worst*longest/shift)
			}
			r.ErrorEstimates[i] = relative + rounding*varying + 0x1p-50
			if math.IsNaN(relative) { // all digits lost; say so
				r.ErrorEstimates[i] = math.Inf(1)
			}
		}
		done += len(pending) - len(rest)
		pending = rest
		part := 0.0
		if worst > 0 && worst < 1 {
			part = math.Log(worst) / math.Log(tolerance)
		}
		s.options.Progress("heat", (float64(done)+float64(len(pending))*part)/float64(len(f.order)))
		if final {
			break
		}
	}
	return pending, nil
}

// field is the result with coefficients y: what varies, and the mean that stays.
func (f *flow) field(process *krylov.Process, y []float64) []float64 {
	s := f.solver
	u := make([]float64, len(f.load))
	process.AddTo(u, y)
	s.centre(u, f.warm) // rounding of the sum, so that heat is kept to the last digits
	for i, c := range s.component {
		if c >= 0 {
			u[i] += f.heat[c] / s.area[c]
		}
	}
	f.blank(u)
	return u
}

// cold marks the rows that shifts holds.
func (f *flow) cold() []bool {
	held := make([]bool, len(f.load))
	for i, c := range f.solver.component {
		held[i] = c < 0 || !f.warm[c]
	}
	return held
}

// missing is how many fields are still to be filled in.
func (f *flow) missing() int {
	k := 0
	for _, u := range f.result.Fields {
		if u == nil {
			k++
		}
	}
	return k
}

// factor is that of M + γL for a shift γ as near to the one wanted as rounding allows.
func (f *flow) factor(ctx context.Context, want float64) (factor *sparse.Factor, shift float64, err error) {
	s := f.solver
	shift, err = s.tryShifts(want, s.stiffness.Diag, f.warm, func(shift float64) error {
		var fresh bool
		factor, fresh, err = s.shifted(ctx, f.shifts(shift))
		if fresh {
			f.result.Factorizations++
		}
		return err
	})
	return factor, shift, err
}

// tryShifts calls factorize with the shift wanted or, where M + γK cannot be factored
// with that, the nearest that can, and returns it. Far below the mesh's shortest times
// M + γK is M, far above its longest ones the mass is lost to rounding; in both cases a
// nearer shift gives the same result. diag is K's diagonal, some are the components that
// count (nil: all).
func (s *Solver) tryShifts(want float64, diag []float64, some []bool, factorize func(shift float64) error) (float64, error) {
	least, stiffest, largest := math.Inf(1), 0.0, 0.0
	for i, c := range s.component {
		if c < 0 || some != nil && !some[c] {
			continue
		}
		least = min(least, s.lumped[i]/diag[i])
		stiffest = max(stiffest, diag[i])
		largest = max(largest, s.area[c])
	}
	shift := min(max(want, 1e-18*least), 1e15*largest/stiffest)
	for retries := 8; ; retries-- {
		err := factorize(shift)
		var lost *sparse.NotPositiveDefiniteError
		if !errors.As(err, &lost) || retries == 0 {
			return shift, err
		}
		shift /= 100
	}
}
