package sparse

import "math"

// SolveRefinedTo is SolveTo with a look at the residual: it returns the backward error
//
//	‖b - A x‖ / (‖A‖ ‖x‖ + ‖b‖),  in the largest-entry norm,
//
// after at most one step of iterative refinement, taken when it pays.
// dst must not overlap b.
func (f *Factor) SolveRefinedTo(dst, b []float64) (backwardError float64) {
	f.SolveTo(dst, b)
	n := len(b)
	r := make([]float64, n)
	e := f.residual(r, dst, b)
	if e <= 0x1p-52 {
		return e
	}
	f.SolveTo(r, r)
	for i := range r {
		r[i] += dst[i]
	}
	x := make([]float64, n)
	copy(x, r)
	if better := f.residual(r, x, b); better < e {
		copy(dst, x)
		return better
	}
	return e
}

// residual sets r = b - A x and returns the backward error.
func (f *Factor) residual(r, x, b []float64) float64 {
	m, held := f.matrix, f.held
	var normA, normX, normB, normR float64
	for i := range b {
		row, s := 1.0, b[i]-x[i]
		if held == nil || !held[i] {
			row, s = math.Abs(m.Diag[i]), b[i]-m.Diag[i]*x[i]
			for k := m.Ptr[i]; k < m.Ptr[i+1]; k++ {
				if j := m.Adj[k]; held == nil || !held[j] {
					row += math.Abs(m.Off[k])
					s -= m.Off[k] * x[j]
				}
			}
		}
		r[i] = s
		normA, normX = max(normA, row), max(normX, math.Abs(x[i]))
		normB, normR = max(normB, math.Abs(b[i])), max(normR, math.Abs(s))
	}
	if normR == 0 {
		return 0
	}
	return normR / (normA*normX + normB)
}
