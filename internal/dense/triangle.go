package dense

import "math"

// Cholesky overwrites the leading n rows and columns of a block of n columns by its lower
// Cholesky factor, with the reciprocals of the pivots' roots on the diagonal, which is the form
// that the other kernels take; the entries above the diagonal become zero, rows from n on stay.
// It returns n, or the first column k whose pivot is not above tiny, with that pivot.
func Cholesky(d []float64, n int, tiny float64) (column int, pivot float64) {
	d = d[:8*n]
	for k := range n {
		p := d[8*k+k]
		if !(p > tiny) || p > math.MaxFloat64 {
			return k, p
		}
		r := 1 / math.Sqrt(p)
		d[8*k+k] = r
		for i := k + 1; i < n; i++ {
			d[8*k+i] *= r
		}
		for j := k + 1; j < n; j++ {
			l := d[8*k+j]
			for i := j; i < n; i++ {
				d[8*j+i] = subMul(d[8*j+i], d[8*k+i], l)
			}
			d[8*j+k] = 0
		}
	}
	return n, 0
}

// SolveRight overwrites the panel x, of the given number of blocks and n columns, by x L⁻ᵀ.
// l is a block of n columns as Cholesky leaves it: its first n rows count.
func SolveRight(x, l []float64, blocks, n int) {
	if uint(n-1) > 7 || len(x) < 8*n*blocks || len(l) < 8*n {
		panic("dense: SolveRight: slice too short")
	}
	if blocks <= 0 {
		return
	}
	switch {
	case useAVX512 && n == 8:
		solveRightAVX512(&x[0], &l[0], blocks)
	case useAVX2 && n == 8:
		solveRightAVX2(&x[0], &l[0], blocks)
	default:
		solveRightGo(x, l, blocks, n)
	}
}

func solveRightGo(x, l []float64, blocks, n int) {
	for g := range blocks {
		b := x[8*n*g:][:8*n]
		for k := range n {
			xk := (*[8]float64)(b[8*k:])
			for j := range k {
				xj, m := (*[8]float64)(b[8*j:]), l[8*j+k]
				for i := range 8 {
					xk[i] = subMul(xk[i], xj[i], m)
				}
			}
			r := l[8*k+k]
			for i := range 8 {
				xk[i] *= r
			}
		}
	}
}

// SolveRightTrans overwrites x, one block of n columns, by x L⁻¹, with l as for SolveRight.
func SolveRightTrans(x, l []float64, n int) {
	if uint(n-1) > 7 || len(x) < 8*n || len(l) < 8*n {
		panic("dense: SolveRightTrans: slice too short")
	}
	if useAVX512 && n == 8 {
		solveRightTransAVX512(&x[0], &l[0])
		return
	}
	solveRightTransGo(x, l, n)
}

func solveRightTransGo(x, l []float64, n int) {
	for k := n - 1; k >= 0; k-- {
		xk := (*[8]float64)(x[8*k:])
		r := l[8*k+k]
		for i := range 8 {
			xk[i] *= r
		}
		for j := range k {
			xj, m := (*[8]float64)(x[8*j:]), l[8*j+k]
			for i := range 8 {
				xj[i] = subMul(xj[i], xk[i], m)
			}
		}
	}
}
