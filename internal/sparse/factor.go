package sparse

import (
	"context"
	"math"
)

// A Factor holds P A Pᵀ = L Lᵀ for one matrix at a time. Solves may run
// concurrently with each other, but not with Factorize.
type Factor struct {
	a      *Analysis
	rows   []int32
	values []float64
	matrix *Matrix
	held   []bool
}

// NewFactor allocates a factor, to be filled by Factorize.
func (a *Analysis) NewFactor() *Factor {
	return &Factor{a: a}
}

// Factorize computes the factor of m, whose pattern must be the one analysed (the same
// *Pattern, or one equal to it). Rows and columns with held[i] are replaced by the identity's; held may be nil.
// A factor may be refilled any number of times. m and held are kept (not copied) for SolveRefinedTo and must not change before the
// next Factorize.
func (f *Factor) Factorize(ctx context.Context, m *Matrix, held []bool) error {
	a := f.a
	n := len(a.perm)
	if m.Dim() != n || len(m.Adj) != len(a.pattern.Adj) {
		panic("sparse: Factorize: matrix is not on the pattern that was analysed")
	}
	if f.values == nil {
		f.rows = make([]int32, a.colPtr[n])
		f.values = make([]float64, a.colPtr[n])
	}
	f.matrix, f.held = m, held
	fill := make([]int64, n)
	copy(fill, a.colPtr)
	x := make([]float64, n)
	mark := make([]int32, n)
	for k := range mark {
		mark[k] = -1
	}
	stack := make([]int32, n)
	for k := range n {
		v := a.perm[k]
		mark[k] = int32(k)
		top := n
		d := m.Diag[v]
		vHeld := held != nil && held[v]
		if vHeld {
			d = 1
		}
		path := make([]int32, 0, 64)
		for q := m.Ptr[v]; q < m.Ptr[v+1]; q++ {
			w := m.Adj[q]
			i := a.inverse[w]
			if int(i) >= k {
				continue
			}
			if !vHeld && (held == nil || !held[w]) {
				x[i] = m.Off[q]
			}
			path = path[:0]
			for j := i; mark[j] != int32(k); j = a.parent[j] {
				mark[j] = int32(k)
				path = append(path, j)
			}
			for s := len(path) - 1; s >= 0; s-- {
				top--
				stack[top] = path[s]
			}
		}
		diagonal := d
		for ; top < n; top++ {
			j := stack[top]
			first := a.colPtr[j]
			l := x[j] / f.values[first]
			x[j] = 0
			for q := first + 1; q < fill[j]; q++ {
				x[f.rows[q]] -= f.values[q] * l
			}
			d -= l * l
			f.rows[fill[j]] = int32(k)
			f.values[fill[j]] = l
			fill[j]++
		}
		if !(d > 0x1p-52*math.Abs(diagonal)) || math.IsInf(d, 0) {
			return &NotPositiveDefiniteError{int(v), d}
		}
		f.rows[fill[k]] = int32(k)
		f.values[fill[k]] = math.Sqrt(d)
		fill[k]++
		if k&1023 == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
	}
	return nil
}

// SolveTo sets dst to the solution of A x = b, with A as last factored: held rows come out as x[i] = b[i]
// and are zero columns to the other rows. dst may be b.
func (f *Factor) SolveTo(dst, b []float64) { f.SolveManyTo(dst, b, 1) }

// SolveManyTo solves for k right sides, column-major: b is n × k. dst may be b.
func (f *Factor) SolveManyTo(dst, b []float64, k int) {
	a := f.a
	n := len(a.perm)
	if len(b) != n*k || len(dst) != n*k {
		panic("sparse: SolveManyTo: length is not rows times right sides")
	}
	x := make([]float64, n)
	for c := range k {
		for i, v := range a.perm {
			x[i] = b[c*n+int(v)]
		}
		for j := range n {
			first, last := a.colPtr[j], a.colPtr[j+1]
			x[j] /= f.values[first]
			for q := first + 1; q < last; q++ {
				x[f.rows[q]] -= f.values[q] * x[j]
			}
		}
		for j := n - 1; j >= 0; j-- {
			first, last := a.colPtr[j], a.colPtr[j+1]
			s := x[j]
			for q := first + 1; q < last; q++ {
				s -= f.values[q] * x[f.rows[q]]
			}
			x[j] = s / f.values[first]
		}
		for i, v := range a.perm {
			dst[c*n+int(v)] = x[i]
		}
	}
}
