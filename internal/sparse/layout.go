package sparse

// A front is a dense lower triangle of m rows of which the first w are eliminated. Its
// columns are cut at multiples of eight into panels, and a panel into blocks of eight rows as
// package dense wants them, from the block on the diagonal down. The columns of the factor, 0 to w, and of
// the update matrix that goes to the parent, w to m, lie in different arrays; where
// w is no multiple of eight, they share a panel's rows, and both hold it narrow.

// factorSize is the number of values in the columns of the factor of a front.
func factorSize(w, m int64) int64 {
	blocks, whole := (m+7)/8, w/8
	size := 64 * (whole*blocks - whole*(whole-1)/2)
	return size + (blocks-whole)*8*(w%8)
}

// updateSize is the number of values in the update matrix of a front.
func updateSize(w, m int64) int64 {
	if w == m {
		return 0
	}
	blocks, p := (m+7)/8, w/8
	size := (blocks - p) * 8 * (min(m, 8*p+8) - w)
	if blocks-p == 1 {
		return size
	}
	whole := blocks - p - 2 // panels between the first and the last
	size += 64 * (whole*(blocks-p-1) - whole*(whole-1)/2)
	return size + 8*(m-8*(blocks-1))
}

// slack is how many values beyond a front's own kernels may read, without using them: they
// load eight columns of B where fewer are left.
const slack = 64

// front gives access to the arrays of one supernode while it is being computed.
type front struct {
	w, m   int
	blocks int       // of eight rows, the last one partly used
	before int       // columns of the subtrees below
	l      []float64 // columns of the factor, and slack
	u      []float64 // update matrix
}

// factorPanel returns where the panel p of the factor begins in l, and its columns.
func (f *front) factorPanel(p int) (start, cols int) {
	return 64 * (p*f.blocks - p*(p-1)/2), min(8, f.w-8*p)
}

// updatePanel returns where panel p of the update matrix begins in u, and its columns.
func (f *front) updatePanel(p int) (start, cols int) {
	p0 := f.w / 8
	if p == p0 {
		return 0, min(f.m, 8*p+8) - f.w
	}
	whole := p - p0 - 1
	start = (f.blocks-p0)*8*(8*p0+8-f.w) + 64*(whole*(f.blocks-p0-1)-whole*(whole-1)/2)
	return start, min(8, f.m-8*p)
}

// column returns the array that holds column c of the front, and where: row i ≥ c is at
// base + i/8·step + i%8.
func (f *front) column(c int) (array []float64, base, step int) {
	p := c / 8
	if c < f.w {
		start, cols := f.factorPanel(p)
		return f.l, start + 8*(c-8*p) - p*8*cols, 8 * cols
	}
	start, cols := f.updatePanel(p)
	return f.u, start + 8*(c-max(f.w, 8*p)) - p*8*cols, 8 * cols
}
