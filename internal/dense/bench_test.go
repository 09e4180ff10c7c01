package dense

import (
	"fmt"
	"testing"
)

// C -= A Bᵀ for whole panels, rows × 8 columns, as the factorisation calls it.
func BenchmarkProduct(b *testing.B) {
	for _, rows := range []int{16, 64, 256} {
		for _, inner := range []int{8, 32, 256} {
			b.Run(fmt.Sprintf("rows=%d/inner=%d", rows, inner), func(b *testing.B) {
				blocks := rows / 8
				u := Product{A: make([]float64, rows*inner), B: make([]float64, rows*inner), C: make([]float64, rows*8), Blocks: blocks, Cols: 8,
					CStep: 64, AStep: 64, Panels: inner / 8, Width: 8, AHop: 64 * blocks, BHop: 64 * blocks, BCol: 1, BRow: 8}
				for b.Loop() {
					u.Subtract()
				}
				b.ReportMetric(2*float64(rows*inner*8)/float64(b.Elapsed().Nanoseconds())*float64(b.N), "GFlop/s")
			})
		}
	}
}

// A panel of eight columns times a vector, both ways, larger than the caches: what bounds a solve.
func BenchmarkVector(b *testing.B) {
	const blocks = 1 << 18
	p, y, x := make([]float64, 64*blocks), make([]float64, 8*blocks), make([]float64, 8)
	b.Run("MulSub", func(b *testing.B) {
		b.SetBytes(8 * int64(len(p)))
		for b.Loop() {
			MulSub(y, p, x, blocks, 8)
		}
	})
	b.Run("MulTransSub", func(b *testing.B) {
		b.SetBytes(8 * int64(len(p)))
		for b.Loop() {
			MulTransSub(x, p, y, blocks, 8)
		}
	})
}
