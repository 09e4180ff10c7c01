package kernel

import (
	"context"
	"math"
	"slices"

	"heatskin/internal/krylov"
	"heatskin/internal/sparse"
)

// krylov fills in the fields from Krylov spaces, two for each group of times: one of
// what was there at time 0, one of what is given all the time.
func (f *march) krylov(ctx context.Context) error {
	factor := f.solver.analysis.NewFactor()
	groups := groupTimes(f.order, f.times)
	for len(groups) > 0 {
		group := groups[0]
		groups = groups[1:]
		left, err := f.space(ctx, factor, group)
		if err != nil {
			return err
		}
		groups = append(regroup(group, left), groups...)
	}
	return nil
}

// groupTimes cuts times, in ascending order, into groups for one shift each.
func groupTimes(order []int, times []float64) [][]int {
	var groups [][]int
	for _, i := range order {
		last := len(groups) - 1
		if last < 0 || times[i] > groupRatio*times[groups[last][0]] {
			groups = append(groups, nil)
			last++
		}
		groups[last] = append(groups[last], i)
	}
	return groups
}

// regroup makes groups of what one space left over: a smaller group has a better
// shift. It ends because a group of one leaves nothing.
func regroup(group, left []int) [][]int {
	switch half := len(left) / 2; {
	case len(left) == 0:
		return nil
	case len(left) < len(group):
		return [][]int{left}
	default:
		return [][]int{left[:half], left[half:]}
	}
}

// space fills in the fields of one group from the spaces of one shift and returns
// those that did not meet the tolerance.
func (f *march) space(ctx context.Context, factor *sparse.Factor, group []int) (left []int, err error) {
	s, r := f.solver, f.result
	shift := math.Sqrt(f.times[group[0]]) * math.Sqrt(f.times[group[len(group)-1]]) / bestShift(f.tolerance)
	shift, err = s.tryShifts(shift, f.k.Diag, nil, func(shift float64) error {
		r.Factorizations++
		return factor.Factorize(ctx, f.matrix(shift), f.held)
	})
	if err != nil {
		return nil, err
	}
	solve := f.solve(factor, shift, f.times[group[len(group)-1]], f.tolerance)
	pencil := &krylov.Pencil{
		Dim: len(f.p), Shift: shift, Workers: s.options.Workers,
		Mass: f.massTo,
		Solve: func(dst, b []float64) {
			solve(dst, b)
			r.Solves++
		},
		Deflate: func(x []float64) { s.centre(x, f.floating) },
	}
	var parts []*part
	if maxAbs := largestOf(f.p); maxAbs > 0 {
		parts = append(parts, &part{krylov.NewProcess(pencil, f.p), krylov.Heat, krylov.HeatTotal})
	}
	if maxAbs := largestOf(f.b); maxAbs > 0 {
		parts = append(parts, &part{krylov.NewProcess(pencil, f.b), krylov.Supply, krylov.SupplyTotal})
	}
	start, growth := f.drift()
	pending := slices.Clone(group)
	looked := make(map[int]*glance, len(group))
	for _, i := range group {
		looked[i] = &glance{}
	}
	for round := 0; len(pending) > 0; round++ {
		final := true
		for _, q := range parts {
			final = final && (q.Exhausted() || q.Len() >= basisLimit)
		}
		rest := pending[:0]
		var slowest *part
		worst := 0.0
		for _, i := range pending {
			t, g := f.times[i], looked[i]
			now, total, most := 0.0, 0.0, -1.0 // error estimates: at t, of the integral up to t
			var behind *part
			for _, q := range parts {
				_, _, e := q.Evaluate(q.now(t, shift))
				_, _, e2 := q.Evaluate(q.total(t, shift))
				now, total = now+e, total+e2
				if e = max(e, e2/t); !(e <= most) && !q.Exhausted() && q.Len() < basisLimit {
					most, behind = e, q
				}
			}
			if g.error(now, total, t, f.size) <= f.tolerance || final || round%6 == 5 {
				g.now = f.combine(parts, t, shift, start, growth, false)
				g.total = f.combine(parts, t, shift, start, growth, true)
				g.largest, g.largestTotal = f.largest(g.now, 1), f.largest(g.total, t)
			}
			relative := g.error(now, total, t, f.size)
			if relative <= f.tolerance || final && len(group) == 1 {
				f.settle(i, g.now, g.total)
				r.ErrorEstimates[i] = relative + 0x1p-50
				continue
			}
			rest = append(rest, i)
			if !(relative <= worst) {
				worst, slowest = relative, behind
			}
		}
		pending = rest
		s.options.Progress("heat", float64(len(f.order)-f.missing())/float64(len(f.order)))
		if final || len(pending) == 0 {
			break
		}
		if slowest == nil {
			slowest = parts[0]
		}
		if err := slowest.Extend(ctx); err != nil {
			return nil, err
		}
	}
	return pending, nil
}

// A glance is what was last seen of the field at one time: its free part and that of
// its integral, and the largest values of both, held values in place.
type glance struct {
	now, total            []float64
	largest, largestTotal float64
}

// error is the larger of the errors of field and integral over their largest values,
// infinite before the first look. A field that has died away is measured against a
// trace of what it once was.
func (g *glance) error(now, total, t, size float64) float64 {
	trace := 1e-30 * size
	switch {
	case g.now == nil:
		return math.Inf(1)
	case now == 0 && total == 0:
		return 0
	}
	return max(now/max(g.largest, trace), total/max(g.largestTotal, t*trace))
}

// A part is one of the two things that a field is made of.
type part struct {
	*krylov.Process
	now, total func(t, shift float64) krylov.Function // of the part at t; of its integral from 0 to t
}

// combine adds up the parts at time t, or their integrals, and the means of floating
// components.
func (f *march) combine(parts []*part, t, shift float64, start, growth []float64, integral bool) []float64 {
	w := make([]float64, len(f.p))
	for _, q := range parts {
		g := q.now
		if integral {
			g = q.total
		}
		y, _, _ := q.Evaluate(g(t, shift))
		q.AddTo(w, y)
	}
	f.solver.centre(w, f.floating)
	for v, c := range f.solver.component {
		switch {
		case c < 0 || !f.floating[c]:
		case integral:
			w[v] += t * (start[c] + t/2*growth[c])
		default:
			w[v] += start[c] + t*growth[c]
		}
	}
	return w
}

// largest is the largest absolute value of the field whose free part is w, held values
// counting times weight.
func (f *march) largest(w []float64, weight float64) float64 {
	top := 0.0
	for v, x := range w {
		if f.solver.component[v] >= 0 {
			top = max(top, math.Abs(x+weight*f.lift[v]))
		}
	}
	return top
}

func (f *march) missing() int {
	k := 0
	for _, u := range f.result.Fields {
		if u == nil {
			k++
		}
	}
	return k
}

func largestOf(x []float64) float64 {
	top := 0.0
	for _, v := range x {
		top = max(top, math.Abs(v))
	}
	return top
}
