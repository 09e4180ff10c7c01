package krylov

import (
	"math"
	"sync"
	"sync/atomic"
)

// blockRows is how many rows of a basis one piece of work covers: a few vectors of
// that length stay in the first-level cache. It also fixes the order of all sums.
const blockRows = 512

// A basis is a growing list of vectors of one length.
type basis struct {
	vectors [][]float64
	workers int
	partial []float64 // sums of one block, for every block
}

// each runs do for every block of n rows, on several goroutines.
func each(workers, n int, do func(block, lo, hi int)) {
	blocks := (n + blockRows - 1) / blockRows
	if workers > blocks/8 { // small vectors are done before a goroutine has started
		workers = blocks / 8
	}
	run := func(b int) { do(b, b*blockRows, min(n, (b+1)*blockRows)) }
	if workers <= 1 {
		for b := range blocks {
			run(b)
		}
		return
	}
	var taken atomic.Int64
	var wait sync.WaitGroup
	for range workers {
		wait.Go(func() {
			for {
				b := int(taken.Add(1)) - 1
				if b >= blocks {
					return
				}
				run(b)
			}
		})
	}
	wait.Wait()
}

// dots sets c[j] = vectors[j]ᵀ x.
func (b *basis) dots(c, x []float64) {
	n, k := len(x), len(b.vectors)
	blocks := (n + blockRows - 1) / blockRows
	if len(b.partial) < blocks*k {
		b.partial = make([]float64, blocks*max(k, 16)*2)
	}
	each(b.workers, n, func(block, lo, hi int) {
		for j, v := range b.vectors {
			b.partial[block*k+j] = dot(v[lo:hi], x[lo:hi])
		}
	})
	for j := range k {
		sum := 0.0
		for block := range blocks {
			sum += b.partial[block*k+j]
		}
		c[j] = sum
	}
}

// add sets x += Σ c[j] vectors[j] over the first len(c) vectors.
func (b *basis) add(x, c []float64) {
	each(b.workers, len(x), func(_, lo, hi int) {
		for j, a := range c {
			axpy(x[lo:hi], a, b.vectors[j][lo:hi])
		}
	})
}

// dotsMany sets c[j*k+l] = vectors[j]ᵀ x_l for the k columns x_l of x.
func (b *basis) dotsMany(c, x []float64, k int) {
	n := len(x) / k
	rows := len(b.vectors)
	blocks := (n + blockRows - 1) / blockRows
	if len(b.partial) < blocks*rows*k {
		b.partial = make([]float64, blocks*max(rows, 16)*k*2)
	}
	each(b.workers, n, func(block, lo, hi int) {
		out := b.partial[block*rows*k:]
		for j, v := range b.vectors {
			v = v[lo:hi]
			l := 0
			for ; l+4 <= k; l += 4 {
				dot4(out[j*k+l:j*k+l+4], v, x[l*n+lo:l*n+hi], x[(l+1)*n+lo:(l+1)*n+hi], x[(l+2)*n+lo:(l+2)*n+hi], x[(l+3)*n+lo:(l+3)*n+hi])
			}
			for ; l < k; l++ {
				out[j*k+l] = dot(v, x[l*n+lo:l*n+hi])
			}
		}
	})
	clear(c[:rows*k])
	for block := range blocks {
		for i, s := range b.partial[block*rows*k : (block+1)*rows*k] {
			c[i] += s
		}
	}
}

// subtractMany sets x_l -= Σ_j c[j*k+l] vectors[j] for the k columns x_l of x.
func (b *basis) subtractMany(x, c []float64, k int) {
	n := len(x) / k
	each(b.workers, n, func(_, lo, hi int) {
		j := 0
		for ; j+4 <= len(b.vectors); j += 4 {
			v0, v1, v2, v3 := b.vectors[j][lo:hi], b.vectors[j+1][lo:hi], b.vectors[j+2][lo:hi], b.vectors[j+3][lo:hi]
			for l := range k {
				axpy4(x[l*n+lo:l*n+hi], -c[j*k+l], -c[(j+1)*k+l], -c[(j+2)*k+l], -c[(j+3)*k+l], v0, v1, v2, v3)
			}
		}
		for ; j < len(b.vectors); j++ {
			for l := range k {
				axpy(x[l*n+lo:l*n+hi], -c[j*k+l], b.vectors[j][lo:hi])
			}
		}
	})
}

// turn replaces the vectors by the first keep combinations of them, vector l being
// Σ_j s[j*stride+l] vectors[j]; vectors beyond the first rows stay as they are and move
// up behind them.
func (b *basis) turn(rows, keep int, s []float64, stride int) {
	n := len(b.vectors[0])
	each(b.workers, n, func(_, lo, hi int) {
		out := make([]float64, keep*(hi-lo))
		for l := range keep {
			y := out[l*(hi-lo) : (l+1)*(hi-lo)]
			j := 0
			for ; j+4 <= rows; j += 4 {
				axpy4(y, s[j*stride+l], s[(j+1)*stride+l], s[(j+2)*stride+l], s[(j+3)*stride+l],
					b.vectors[j][lo:hi], b.vectors[j+1][lo:hi], b.vectors[j+2][lo:hi], b.vectors[j+3][lo:hi])
			}
			for ; j < rows; j++ {
				axpy(y, s[j*stride+l], b.vectors[j][lo:hi])
			}
		}
		for l := range keep {
			copy(b.vectors[l][lo:hi], out[l*(hi-lo):(l+1)*(hi-lo)])
		}
	})
	b.vectors = append(b.vectors[:keep], b.vectors[rows:]...)
}

// dot4 sets out[l] = vᵀ x_l: v is read once for four columns.
func dot4(out, v, x0, x1, x2, x3 []float64) {
	var s0, s1, s2, s3 float64
	x0, x1, x2, x3 = x0[:len(v)], x1[:len(v)], x2[:len(v)], x3[:len(v)]
	for i, a := range v {
		s0 += a * x0[i]
		s1 += a * x1[i]
		s2 += a * x2[i]
		s3 += a * x3[i]
	}
	out[0], out[1], out[2], out[3] = s0, s1, s2, s3
}

// axpy4 is y += a0 v0 + a1 v1 + a2 v2 + a3 v3.
func axpy4(y []float64, a0, a1, a2, a3 float64, v0, v1, v2, v3 []float64) {
	v0, v1, v2, v3 = v0[:len(y)], v1[:len(y)], v2[:len(y)], v3[:len(y)]
	for i := range y {
		y[i] += (a0*v0[i] + a1*v1[i]) + (a2*v2[i] + a3*v3[i])
	}
}

// inner is xᵀ y, with the sum in the order of blocks.
func inner(workers int, x, y []float64) float64 {
	part := make([]float64, (len(x)+blockRows-1)/blockRows)
	each(workers, len(x), func(block, lo, hi int) { part[block] = dot(x[lo:hi], y[lo:hi]) })
	sum := 0.0
	for _, s := range part {
		sum += s
	}
	return sum
}

// dot is xᵀ y in four interleaved sums.
func dot(x, y []float64) float64 {
	var s0, s1, s2, s3 float64
	y = y[:len(x)]
	i := 0
	for ; i+4 <= len(x); i += 4 {
		s0 += x[i] * y[i]
		s1 += x[i+1] * y[i+1]
		s2 += x[i+2] * y[i+2]
		s3 += x[i+3] * y[i+3]
	}
	for ; i < len(x); i++ {
		s0 += x[i] * y[i]
	}
	return (s0 + s1) + (s2 + s3)
}

// axpy is y += a x.
func axpy(y []float64, a float64, x []float64) {
	x = x[:len(y)]
	for i := range y {
		y[i] += a * x[i]
	}
}

func scale(x []float64, a float64) {
	for i := range x {
		x[i] *= a
	}
}

// largest is the largest |x[i]|.
func largest(x []float64) float64 {
	top := 0.0
	for _, v := range x {
		top = max(top, math.Abs(v))
	}
	return top
}
