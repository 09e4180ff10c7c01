package sparse

import "heatskin/internal/dense"

// Cutting a large front: columns are eliminated blockPanels at a time, and everything to
// their left is subtracted in chunks of rowChunk blocks by innerChunk panels, 512 KiB of the factor that stay in
// the second-level cache while all columns of a target pass by.
const (
	blockPanels = 8
	rowChunk    = 32
	innerChunk  = 32
	smallFront  = 48 // blocks; below this, cutting costs more than it saves
)

// tinyPivot is the largest value that a pivot of a singular matrix, scaled to a diagonal
// between 1/2 and 2, may come out with after as many columns in its subtree: of a graph's
// Laplacian the last pivot is the sum of the errors of all rows before. A smaller pivot would be
// noise, and so would the solution's constant part. Laplacians of spheres of 1e4 rows leave 1e-12 instead of 0.
func tinyPivot(columns int) float64 { return (32 + 0.5*float64(columns)) * 0x1p-52 }

// each calls do(i) for i from 0 to n-1, on several goroutines or on one.
type each func(n int, do func(i int))

// eliminate turns an assembled front into columns of the factor and the update matrix. Every
// value passes through the same roundings whatever each does and wherever chunks end: terms
// are subtracted one by one in the order of the columns. It returns w, or the first column whose
// pivot is not positive, with the pivot.
func (f *front) eliminate(run each) (column int, pivot float64) {
	panels := (f.w + 7) / 8
	for from := 0; from < panels; from += blockPanels {
		to := min(from+blockPanels, panels)
		if from > 0 {
			if run == nil {
				f.subtractLeft(from, to, from, f.blocks)
			} else {
				chunks := (f.blocks - from + rowChunk - 1) / rowChunk
				run(chunks, func(i int) {
					g := from + i*rowChunk
					f.subtractLeft(from, to, g, min(g+rowChunk, f.blocks))
				})
			}
		}
		square := to
		if f.blocks <= smallFront {
			square = f.blocks
		}
		for p := from; p < to; p++ {
			if p > from {
				f.subtract(p, from, p, p, square)
			}
			if k, pivot := f.factorDiagonal(p); k >= 0 {
				return 8*p + k, pivot
			}
			f.solveBelow(p, p+1, square)
		}
		if square == f.blocks {
			continue
		}
		below := func(g0, g1 int) {
			for p := from; p < to; p++ {
				if p > from {
					f.subtract(p, from, p, g0, g1)
				}
				f.solveBelow(p, g0, g1)
			}
		}
		if run == nil {
			below(square, f.blocks)
			continue
		}
		chunks := (f.blocks - square + rowChunk - 1) / rowChunk
		run(chunks, func(i int) {
			g := square + i*rowChunk
			below(g, min(g+rowChunk, f.blocks))
		})
	}
	if f.w == f.m {
		return f.w, 0
	}
	p0 := f.w / 8
	if run == nil {
		f.subtractFromUpdate(p0, f.blocks, p0, f.blocks)
		return f.w, 0
	}
	// Tiles of the lower triangle, long rows first: they take longest.
	type tile struct{ g, p int }
	var tiles []tile
	chunks := (f.blocks - p0 + rowChunk - 1) / rowChunk
	for i := chunks - 1; i >= 0; i-- {
		for j := 0; j <= i; j++ {
			tiles = append(tiles, tile{p0 + i*rowChunk, p0 + j*rowChunk})
		}
	}
	run(len(tiles), func(i int) {
		t := tiles[i]
		f.subtractFromUpdate(t.p, min(t.p+rowChunk, f.blocks), t.g, min(t.g+rowChunk, f.blocks))
	})
	return f.w, 0
}

// subtractLeft subtracts from rows [g0, g1) of panels [from, to) what all panels to the left contribute.
func (f *front) subtractLeft(from, to, g0, g1 int) {
	for ; g0 < g1; g0 += rowChunk {
		end := min(g0+rowChunk, g1)
		for q := 0; q < from; q += innerChunk {
			for p := from; p < to; p++ {
				if p < end {
					f.subtract(p, q, min(q+innerChunk, from), max(p, g0), end)
				}
			}
		}
	}
}

// subtract takes from the rows [g0, g1), in blocks, of panel p the product of panels [q0, q1), all left of p.
func (f *front) subtract(p, q0, q1, g0, g1 int) {
	if g0 >= g1 {
		return
	}
	start, cols := f.factorPanel(p)
	left, _ := f.factorPanel(q0)
	hop := 64 * (f.blocks - q0 - 1)
	u := dense.Product{
		C: f.l[start+(g0-p)*8*cols:], A: f.l[left+(g0-q0)*64:], B: f.l[left+(p-q0)*64:],
		Blocks: g1 - g0, Cols: cols, CStep: 8 * cols, AStep: 64,
		Panels: q1 - q0, Width: 8, AHop: hop, BHop: hop, AShrink: 64, BShrink: 64, BCol: 1, BRow: 8,
	}
	u.Subtract()
}

// factorDiagonal factors the diagonal block of panel p. Where the panel is narrow the block's other rows
// are ordinary ones and are solved for as well. It returns -1, or the column of the block that failed.
func (f *front) factorDiagonal(p int) (column int, pivot float64) {
	start, cols := f.factorPanel(p)
	d := f.l[start:][:8*cols]
	var before [64]float64
	copy(before[:], d)
	if k, pivot := dense.Cholesky(d, cols, tinyPivot(f.before+8*p+cols)); k < cols {
		return k, pivot
	}
	if cols < 8 {
		dense.SolveRight(before[:], d, 1, cols)
		for k := range cols {
			copy(d[8*k+cols:8*k+8], before[8*k+cols:8*k+8])
		}
	}
	return -1, 0
}

// solveBelow divides the rows [g0, g1), in blocks, of panel p by its diagonal block.
func (f *front) solveBelow(p, g0, g1 int) {
	start, cols := f.factorPanel(p)
	dense.SolveRight(f.l[start+(g0-p)*8*cols:], f.l[start:], g1-g0, cols)
}

// subtractFromUpdate subtracts L Lᵀ from the rows [g0, g1) of panels [p0, p1) of the update matrix.
func (f *front) subtractFromUpdate(p0, p1, g0, g1 int) {
	whole, narrow := f.w/8, f.w%8
	for ; g0 < g1; g0 += rowChunk {
		end := min(g0+rowChunk, g1)
		for q := 0; q < whole; q += innerChunk {
			to := min(q+innerChunk, whole)
			left, _ := f.factorPanel(q)
			hop := 64 * (f.blocks - q - 1)
			for p := p0; p < min(p1, end); p++ {
				g := max(p, g0)
				start, cols := f.updatePanel(p)
				u := dense.Product{
					C: f.u[start+(g-p)*8*cols:], A: f.l[left+(g-q)*64:], B: f.l[left+(p-q)*64+max(f.w-8*p, 0):],
					Blocks: end - g, Cols: cols, CStep: 8 * cols, AStep: 64,
					Panels: to - q, Width: 8, AHop: hop, BHop: hop, AShrink: 64, BShrink: 64, BCol: 1, BRow: 8,
				}
				u.Subtract()
			}
		}
		if narrow == 0 {
			continue
		}
		left, _ := f.factorPanel(whole)
		for p := p0; p < min(p1, end); p++ {
			g := max(p, g0)
			start, cols := f.updatePanel(p)
			u := dense.Product{
				C: f.u[start+(g-p)*8*cols:], A: f.l[left+(g-whole)*8*narrow:], B: f.l[left+(p-whole)*8*narrow+max(f.w-8*p, 0):],
				Blocks: end - g, Cols: cols, CStep: 8 * cols, AStep: 8 * narrow,
				Panels: 1, Width: narrow, BCol: 1, BRow: 8,
			}
			u.Subtract()
		}
	}
}
