package sparse

import "math"

// SolveRefinedTo is SolveTo with a look at the residual. It returns the backward error
//
//	‖b - A x‖ / (‖A‖ ‖x‖ + ‖b‖),
//
// ‖·‖ being the largest value of a vector and the largest sum of absolute values in a row of A (held
// rows and columns being the identity's), after at most one step of iterative refinement. The step is taken
// where the error is above 2^-52 and kept where it helps. Residuals are summed in twice the precision, so that
// a step also brings x nearer to the solution, not only to a small residual. dst must not overlap b.
func (f *Factor) SolveRefinedTo(dst, b []float64) (backwardError float64) {
	f.SolveTo(dst, b)
	r := make([]float64, len(b))
	e := f.residual(r, dst, b)
	if !(e > 0x1p-52) || math.IsInf(e, 0) {
		return e
	}
	f.SolveTo(r, r)
	x := make([]float64, len(b))
	for i := range r {
		x[i] = r[i] + dst[i]
	}
	if better := f.residual(r, x, b); better < e {
		copy(dst, x)
		return better
	}
	return e
}

// residual sets r = b - A x and returns the backward error.
func (f *Factor) residual(r, x, b []float64) float64 {
	m, held := f.matrix, f.held
	n := len(b)
	type norms struct{ a, x, b, r float64 }
	parts := make([]norms, (n+chunk-1)/chunk)
	inParallel(f.a.plan.workers, len(parts), func(_, part int) {
		var most norms
		for i := part * chunk; i < min((part+1)*chunk, n); i++ {
			row, s := 1.0, b[i]-x[i]
			if held == nil || !held[i] {
				var low float64
				row = math.Abs(m.Diag[i])
				s, low = subtractProduct(b[i], 0, m.Diag[i], x[i])
				for k := m.Ptr[i]; k < m.Ptr[i+1]; k++ {
					if j := m.Adj[k]; held == nil || !held[j] {
						row += math.Abs(m.Off[k])
						s, low = subtractProduct(s, low, m.Off[k], x[j])
					}
				}
				s += low
			}
			r[i] = s
			most.a, most.x = max(most.a, row), max(most.x, math.Abs(x[i]))
			most.b, most.r = max(most.b, math.Abs(b[i])), max(most.r, math.Abs(s))
		}
		parts[part] = most
	})
	var most norms
	for _, p := range parts {
		most.a, most.x = max(most.a, p.a), max(most.x, p.x)
		most.b, most.r = max(most.b, p.b), max(most.r, p.r)
	}
	if most.r == 0 {
		return 0
	}
	return most.r / (most.a*most.x + most.b)
}

// subtractProduct returns high + low - a·b, again in two parts: the high part as rounded, and what was lost in all roundings so
// far (T. Ogita, S. M. Rump, S. Oishi, SIAM J. Sci. Comput. 26(6), 2005, pp. 1955–1988: Dot2).
func subtractProduct(high, low, a, b float64) (float64, float64) {
	p := -a * b
	lost := math.FMA(-a, b, -p)
	s := high + p
	t := s - high
	return s, low + (lost + ((high - (s - t)) + (p - t)))
}
