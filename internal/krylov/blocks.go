package krylov

import "heatskin/internal/dense"

// Vectors of eigenvector blocks lie eight abreast: a block holds vector j's entry of
// row i at 8i+j, and a blockBasis is one such block after another. Then both products
// that orthogonality needs are those of package dense. Rows are padded with zeros to a
// multiple of eight; a block with fewer than eight directions has zero columns.
const abreast = 8

// chunkRows is how many rows one piece of work covers; it fixes the order of sums.
const chunkRows = 2048

type blockBasis struct {
	rows    int // padded
	workers int
	v       []float64
	size    int // vectors, a multiple of eight
}

func padded(n int) int { return (n + 7) / 8 * 8 }

func newBlockBasis(n, limit, workers int) *blockBasis {
	rows := padded(n)
	return &blockBasis{rows: rows, workers: workers, v: make([]float64, limit*rows)}
}

// append copies the block x behind the others.
func (b *blockBasis) append(x []float64) {
	copy(b.v[b.size*b.rows:], x)
	b.size += abreast
}

// eachChunk runs do for every chunk of rows.
func (b *blockBasis) eachChunk(do func(chunk, lo, hi int)) {
	eachPiece(b.workers, b.rows, chunkRows, do)
}

// dots sets c[8j+l] = v_jᵀ x_l for the vectors from first on, counted from there, and
// the eight of the block x.
func (b *blockBasis) dots(c, x []float64, first int) {
	m := b.size - first
	chunks := (b.rows + chunkRows - 1) / chunkRows
	partial := make([]float64, chunks*m*abreast)
	b.eachChunk(func(chunk, lo, hi int) {
		u := dense.Product{
			C: partial[chunk*m*abreast : (chunk+1)*m*abreast], CStep: abreast * abreast,
			A: b.v[first*b.rows+abreast*lo:], AStep: abreast * b.rows,
			B: x[abreast*lo:], BCol: 1, BRow: abreast,
			Blocks: m / abreast, Cols: abreast, Panels: 1, Width: hi - lo,
		}
		u.Subtract()
	})
	// C of a block of eight vectors is column by column: vector j of it and x_l at 8l+j.
	clear(c[:m*abreast])
	for chunk := range chunks {
		for i, s := range partial[chunk*m*abreast : (chunk+1)*m*abreast] {
			block, l, j := i/64, i%64/8, i%8
			c[block*64+j*abreast+l] -= s
		}
	}
}

// subtract sets x_l -= Σ_j c[8j+l] v_j over the vectors from first on.
func (b *blockBasis) subtract(x, c []float64, first int) {
	b.eachChunk(func(_, lo, hi int) {
		u := b.across(c, first, b.size)
		for row := lo; row < hi; row += 8 {
			u.C, u.B = x[abreast*row:abreast*row+64], b.v[first*b.rows+abreast*row:]
			u.Subtract()
		}
	})
}

// across is the product C(l, row) -= Σ_j c[8j+l] v_j(row) for eight rows; C and B are
// left to be set.
func (b *blockBasis) across(c []float64, first, last int) dense.Product {
	return dense.Product{
		A: c, AHop: 64, Panels: (last - first) / abreast, Width: abreast,
		BHop: abreast * b.rows, BCol: abreast, BRow: 1, Blocks: 1, Cols: abreast,
	}
}

// turn replaces the vectors by keep combinations of them, v_l = Σ_j s[j·stride+l] v_j;
// keep is a multiple of eight.
func (b *blockBasis) turn(keep int, s []float64, stride int) {
	m := b.size
	coefficients := make([]float64, m*keep) // by block of new vectors, as across wants them, with the sign of a difference
	for l := range keep {
		for j := range m {
			coefficients[l/8*m*8+8*j+l%8] = -s[j*stride+l]
		}
	}
	b.eachChunk(func(_, lo, hi int) {
		out := make([]float64, keep*abreast)
		for row := lo; row < hi; row += 8 {
			clear(out)
			for block := range keep / abreast {
				u := b.across(coefficients[block*m*8:(block+1)*m*8], 0, m)
				u.C, u.B = out[block*64:(block+1)*64], b.v[abreast*row:]
				u.Subtract()
			}
			for block := range keep / abreast {
				copy(b.v[block*abreast*b.rows+abreast*row:], out[block*64:(block+1)*64])
			}
		}
	})
	b.size = keep
}

// columns writes the block x as eight vectors of n entries, one after the other.
func (b *blockBasis) columns(dst, x []float64, n int) {
	b.eachChunk(func(_, lo, hi int) {
		for j := range abreast {
			column := dst[j*n : (j+1)*n]
			for i := lo; i < min(hi, n); i++ {
				column[i] = x[abreast*i+j]
			}
		}
	})
}

// interleave is the reverse of columns.
func (b *blockBasis) interleave(dst, x []float64, n int) {
	b.eachChunk(func(_, lo, hi int) {
		for j := range abreast {
			column := x[j*n : (j+1)*n]
			for i := lo; i < min(hi, n); i++ {
				dst[abreast*i+j] = column[i]
			}
		}
	})
}
