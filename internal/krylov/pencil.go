package krylov

// A Pencil is what a process knows of K and M: two linear maps and a shift.
type Pencil struct {
	Dim   int
	Shift float64                // γ > 0
	Mass  func(dst, x []float64) // dst = M x; dst and x do not overlap
	Solve func(dst, b []float64) // dst = (M + γK)⁻¹ b; dst and b do not overlap
	// SolveMany is Solve for k columns at a time; nil: Solve does them one by one. Both may
	// overwrite b for Smallest.
	SolveMany func(dst, b []float64, k int)
	// Deflate projects x, in the M inner product, onto the complement of known null
	// vectors of K; nil where there are none. What the process returns then lacks
	// their part, which the caller adds: it does not change with time.
	Deflate func(x []float64)
	Workers int // goroutines for sums over a basis; at least 1
}

func (p *Pencil) deflate(x []float64) {
	if p.Deflate != nil {
		p.Deflate(x)
	}
}
