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
// a relative error of a small multiple of the tree's height times 2^-53 of its own, however far
// below the largest it lies, down to 1e-300 of it. The right side is scaled by a power of two so that the
// range of float64 lies where it is needed, and the result is exactly homogeneous in b by powers of two.
func (f *Factor) SolveTo(dst, b []float64) {
	f.checkSolve(dst, b, 1)
	a := f.a
	v := a.getVectors()
	up, down := f.loadScaled(v.x, b)
	for s := range a.nodes {
		f.forward(v, int32(s))
	}
	for s := len(a.nodes) - 1; s >= 0; s-- {
		f.backward(v, int32(s))
	}
	f.storeScaled(dst, v.x, up, down)
	a.vectors.Put(v)
}

func (f *Factor) checkSolve(dst, b []float64, k int) {
	if f.matrix == nil {
		panic("sparse: solve without a factor: Factorize has not succeeded")
	}
	if n := len(f.a.perm); len(b) != n*k || len(dst) != n*k {
		panic("sparse: solve: length is not rows times right sides")
	}
}

// loadScaled sets x = 2^e S P b with e such that the largest value is near 2^400, which leaves the lower values
// four fifths of the range of exponents, and solutions room to be larger. up and down are the two factors
// whose product is 2^-e; it may itself be out of range.
func (f *Factor) loadScaled(x, b []float64) (back1, back2 float64) {
	largest := 0.0
	for k, v := range f.a.perm {
		largest = max(largest, math.Abs(b[v]*f.scale[k]))
	}
	e := 0
	if largest > 0 && largest <= math.MaxFloat64 {
		_, e = math.Frexp(largest)
		e = 400 - e
	}
	up1, up2 := math.Ldexp(1, e/2), math.Ldexp(1, e-e/2)
	for k, v := range f.a.perm {
		x[k] = b[v] * f.scale[k] * up1 * up2
	}
	return math.Ldexp(1, -(e / 2)), math.Ldexp(1, -(e - e/2))
}

func (f *Factor) storeScaled(dst, x []float64, back1, back2 float64) {
	for k, v := range f.a.perm {
		dst[v] = x[k] * f.scale[k] * back1 * back2
	}
}

// vectors is what one solve works with.
type vectors struct {
	x     []float64 // in the order of elimination
	t     []float64 // one front's rows
	stack [2][]float64
	fill  [2]int
}

func (a *Analysis) getVectors() *vectors {
	if v, ok := a.vectors.Get().(*vectors); ok {
		return v
	}
	v := &vectors{x: make([]float64, len(a.perm))}
	longest := int32(0)
	for s := range a.nodes {
		longest = max(longest, a.nodes[s].m)
	}
	v.t = make([]float64, longest+8)
	return v
}

// forward eliminates the columns of supernode s from the right side.
func (f *Factor) forward(v *vectors, s int32) {
	a := f.a
	node := &a.nodes[s]
	w, m := int(node.w), int(node.m)
	fr := front{w: w, m: m, blocks: (m + 7) / 8, l: f.values[node.values:]}
	t := v.t[:8*fr.blocks]
	clear(t)
	x := v.x[node.first : node.first+node.w]
	copy(t, x)
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
	for i, r := range a.below(s) {
		v.x[r] += t[w+i]
	}
}

// backward solves for the columns of supernode s, all later ones being known.
func (f *Factor) backward(v *vectors, s int32) {
	a := f.a
	node := &a.nodes[s]
	w, m := int(node.w), int(node.m)
	fr := front{w: w, m: m, blocks: (m + 7) / 8, l: f.values[node.values:]}
	t := v.t[:8*fr.blocks]
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

// SolveManyTo solves for k right sides, column-major: b is n × k. dst may be b.
func (f *Factor) SolveManyTo(dst, b []float64, k int) {
	f.checkSolve(dst, b, k)
	n := len(f.a.perm)
	for c := range k {
		f.SolveTo(dst[c*n:c*n+n], b[c*n:c*n+n])
	}
}
