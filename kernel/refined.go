package kernel

import "heatskin/internal/sparse"

// A refined solve of (M + diag(loss) + τL) x = b, M being left out where mass is false,
// knows L by its weights alone:
//
//	(Lx)_i = Σ_j w_ij (x_i - x_j).
//
// The factor knows L by its diagonal, too, and there the weights across a thin
// triangle bury those along it by the square of its aspect ratio: what is left of a
// slow flow along a row of slivers is rounding. Residuals by differences, and
// refinement with the factor as it is, bring it back: cells of 1:1e4 then cost no
// digit (TestEstimateHoldsOnThinCells). It takes two solves, more where the factor is
// worse. Not for several goroutines at once.
type refined struct {
	solver *Solver
	factor *sparse.Factor
	mass   bool
	tau    float64
	loss   []float64 // nil: none
	held   []bool    // rows that the factor holds; nil: none
	r      []float64
	worst  float64 // the largest relative error that a solve may have been left with
	solves int
}

// mostCorrections is how often a solve is corrected: a factor that is good to 1e-3 gets
// to rounding with that.
const mostCorrections = 4

// SolveTo sets dst to the solution. dst must not overlap b.
func (f *refined) SolveTo(dst, b []float64) {
	if f.r == nil {
		f.r = make([]float64, len(dst))
	}
	f.factor.SolveTo(dst, b)
	f.solves++
	last := 1.0
	for range mostCorrections {
		f.residual(dst, b)
		f.factor.SolveTo(f.r, f.r)
		f.solves++
		size, step := largestOf(dst), largestOf(f.r)
		if size == 0 || !(step < last*size/2) { // it does not get better
			break
		}
		for i, x := range f.r {
			dst[i] += x
		}
		// Corrections shrink by the same part each time: this one over the one before.
		last, step = step/size, step/size/last*step/size
		if step <= 1e-15 {
			last = step
			break
		}
	}
	f.worst = max(f.worst, last)
}

// residual sets r = b - A x on the free rows, 0 on the others.
func (f *refined) residual(x, b []float64) {
	l := f.solver.stiffness
	if f.mass {
		f.solver.massTo(f.r, x)
	} else {
		clear(f.r)
	}
	for i, xi := range x {
		if f.held != nil && f.held[i] {
			f.r[i] = 0
			continue
		}
		flow := 0.0
		for k := l.Ptr[i]; k < l.Ptr[i+1]; k++ {
			xj := x[l.Adj[k]]
			if f.held != nil && f.held[l.Adj[k]] {
				xj = 0 // what is held there is on the right side
			}
			flow += l.Off[k] * (xj - xi)
		}
		sum := f.r[i] + f.tau*flow
		if f.loss != nil {
			sum += f.loss[i] * xi
		}
		f.r[i] = b[i] - sum
	}
}

// leak is the rate at which rounded entries of L may lose heat that varies slowly over
// some components (nil: all): an error of ε L[i][i] in each diagonal entry, all of one sign, takes
// ε ΣL[i][i] over the area, times D. Only slivers by the thousand, or aspect ratios
// beyond 1e4, make it felt.
func (s *Solver) leak(some []bool) float64 {
	sum, area := 0.0, 0.0
	for i, c := range s.component {
		if c >= 0 && (some == nil || some[c]) {
			sum += s.stiffness.Diag[i]
			area += s.lumped[i]
		}
	}
	if area == 0 {
		return 0
	}
	return 0x1p-52 * sum / area
}
