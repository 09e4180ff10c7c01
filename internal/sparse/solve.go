package sparse

import (
	"math"

	"heatskin/internal/dense"
)

// SolveTo sets dst to the solution of A x = b, with A as last factored: a held row comes out as
// x[i] = b[i] and does not act on the others, so that the caller moves known values to the
// right side. dst may be b. It panics if a length is not the number of rows.
//
// For an M-matrix (positive definite, no positive entry off the diagonal) and b ≥ 0 no
// subtraction cancels, neither here nor off the diagonal in the factorisation, so each x[i] is right to
// a small relative error of its own, however far below the largest it lies, down to about
// 1e-300 of it. The right side is scaled by a power of two so that the range of float64 lies
// where it is needed: solutions of b and of 2^k b have the same digits.
func (f *Factor) SolveTo(dst, b []float64) {
	f.checkSolve(dst, b, 1)
	v := f.a.getVectors(1)
	scaling := f.load(v.x, b, 1)
	f.a.upwards(v, func(ln *solveLane, s int32) { f.forward(v, ln, s) })
	f.a.downwards(v, func(ln *solveLane, s int32) { f.backward(v, ln, s) })
	f.store(dst, v.x, 1, scaling)
	f.a.putVectors(v)
}

func (f *Factor) checkSolve(dst, b []float64, k int) {
	if f.matrix == nil {
		panic("sparse: solve without a factor: Factorize has not succeeded")
	}
	if n := len(f.a.perm); k < 0 || len(b) != n*k || len(dst) != n*k {
		panic("sparse: solve: length is not rows times right sides")
	}
}

// chunk is how many rows one goroutine copies at a time.
const chunk = 1 << 14

// load sets x = 2^e S P b with e such that the largest value is near 2^400: values far below it keep four
// fifths of the range of exponents, and solutions have room to be larger. b holds up to eight right sides, column by
// column; x has eight values a row, or one if there is one right side. It returns e for each.
func (f *Factor) load(x, b []float64, width int) (e [8]int) {
	n := len(f.a.perm)
	sides := len(b) / max(n, 1)
	workers := f.a.plan.workers
	chunks := (n + chunk - 1) / chunk
	largest := make([][8]float64, chunks)
	// In the caller's order: b is read in sequence, and a row of x written at once.
	inParallel(workers, chunks, func(_, i int) {
		top := &largest[i]
		for v := i * chunk; v < min((i+1)*chunk, n); v++ {
			k := int(f.a.inverse[v])
			scale := f.scale[k]
			row := x[width*k:][:width]
			for c := range row {
				row[c] = 0
				if c < sides {
					row[c] = b[c*n+v] * scale
					top[c] = max(top[c], math.Abs(row[c]))
				}
			}
		}
	})
	var up1, up2 [8]float64 // 2^e may be out of range
	for c := range sides {
		top := 0.0
		for i := range largest {
			top = max(top, largest[i][c])
		}
		if top > 0 && top <= math.MaxFloat64 {
			_, e[c] = math.Frexp(top)
			e[c] = 400 - e[c]
		}
		up1[c], up2[c] = math.Ldexp(1, e[c]/2), math.Ldexp(1, e[c]-e[c]/2)
	}
	inParallel(workers, chunks, func(_, i int) {
		for k := i * chunk; k < min((i+1)*chunk, n); k++ {
			row := x[width*k:][:width]
			for c := range row {
				row[c] *= up1[c]
				row[c] *= up2[c]
			}
		}
	})
	return e
}

// store sets dst = 2^-e Pᵀ S x, in the shapes of load.
func (f *Factor) store(dst, x []float64, width int, e [8]int) {
	n := len(f.a.perm)
	sides := len(dst) / max(n, 1)
	var down1, down2 [8]float64
	for c := range sides {
		down1[c], down2[c] = math.Ldexp(1, -(e[c]/2)), math.Ldexp(1, -(e[c]-e[c]/2))
	}
	inParallel(f.a.plan.workers, (n+chunk-1)/chunk, func(_, i int) {
		for v := i * chunk; v < min((i+1)*chunk, n); v++ {
			k := int(f.a.inverse[v])
			scale := f.scale[k]
			for c, value := range x[width*k:][:sides] {
				dst[c*n+v] = value * scale * down1[c] * down2[c]
			}
		}
	})
}

// forward eliminates the columns of supernode s from the right side, and hands the rest to its parent.
func (f *Factor) forward(v *vectors, ln *solveLane, s int32) {
	a := f.a
	node := &a.nodes[s]
	w, m := int(node.w), int(node.m)
	fr := front{w: w, m: m, blocks: (m + 7) / 8, l: f.values[node.values:]}
	t := ln.t[:8*fr.blocks]
	x := v.x[node.first : node.first+node.w]
	clear(t[copy(t, x):])
	out := a.take(v, ln, s, func(relative []int32, from []float64) {
		for i, r := range relative {
			t[r] += from[i]
		}
	})
	for p := 0; 8*p < w; p++ {
		start, cols := fr.factorPanel(p)
		d := fr.l[start:][:8*cols]
		y := (*[8]float64)(t[8*p:])
		for k := range cols {
			s := y[k] * d[8*k+k]
			y[k] = s
			for i := k + 1; i < 8; i++ {
				y[i] -= d[8*k+i] * s
			}
		}
		dense.MulSub(t[8*p+8:], fr.l[start+8*cols:], y[:], fr.blocks-p-1, cols)
	}
	copy(x, t)
	copy(out, t[w:m])
}

// backward solves for the columns of supernode s, all later ones being known.
func (f *Factor) backward(v *vectors, ln *solveLane, s int32) {
	a := f.a
	node := &a.nodes[s]
	w, m := int(node.w), int(node.m)
	fr := front{w: w, m: m, blocks: (m + 7) / 8, l: f.values[node.values:]}
	t := ln.t[:8*fr.blocks]
	x := v.x[node.first : node.first+node.w]
	copy(t, x)
	for i, r := range a.below(s) {
		t[w+i] = v.x[r]
	}
	clear(t[m:])
	for p := (w - 1) / 8; p >= 0; p-- {
		start, cols := fr.factorPanel(p)
		d := fr.l[start:][:8*cols]
		y := (*[8]float64)(t[8*p:])
		dense.MulTransSub(y[:], fr.l[start+8*cols:], t[8*p+8:], fr.blocks-p-1, cols)
		for k := cols - 1; k >= 0; k-- {
			s := y[k]
			for i := k + 1; i < 8; i++ {
				s -= d[8*k+i] * y[i]
			}
			y[k] = s * d[8*k+k]
		}
	}
	copy(x, t)
}
