package krylov

import (
	"math"

	"heatskin/internal/parallel"
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
func each(workers, n int, do func(block, lo, hi int)) { eachPiece(workers, n, blockRows, do) }

// eachPiece runs do for every size of n rows.
func eachPiece(workers, n, size int, do func(piece, lo, hi int)) {
	blocks := (n + size - 1) / size
	if workers > n/4096 { // small vectors are done before a goroutine has started
		workers = n / 4096
	}
	parallel.On(workers, blocks, func(b int) { do(b, b*size, min(n, (b+1)*size)) })
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
