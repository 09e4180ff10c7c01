package krylov

import (
	"context"
	"math"
)

// A Process is a shift-and-invert Lanczos process (J. van den Eshof and M.
// Hochbruck, SIAM J. Sci. Comput. 27(4), 2006, pp. 1438-1457) for functions of A
// that act on M⁻¹b, b being given as a right side ("load"):
//
//	f(A) M⁻¹b  ≈  V g(T) e₁ ‖v‖,   v = (M + γK)⁻¹ b,   g(z) = f((1/z - 1)/γ) / z,
//
// V the M-orthonormal basis of the Krylov space of B and v, T = Vᵀ M B V. We depart
// from the paper in the first vector: it takes M⁻¹b itself, which for a load on one
// vertex is a spike whose norm grows as the mesh is refined and which the result has
// long forgotten. One solve more smooths it away, costs nothing (the basis is then
// one vector shorter) and needs no M⁻¹.
//
// Every vector costs one solve, and O(n·Len) for orthogonality.
type Process struct {
	pencil      *Pencil
	basis       basis     // v₁ ... v of Len, and one more unless exhausted
	start       float64   // ‖v‖, in the M norm
	alpha, beta []float64 // T: diagonal, and subdiagonal with the entry below T's last row
	peak        float64   // the largest entry of any basis vector
	massed      []float64 // M times the newest vector
	work        []float64
	dots        []float64
	exhausted   bool // the space is invariant: every function is exact
	ritz        *ritz
	bounds      []float64 // by step: where the spectrum of B seemed to end
}

// NewProcess starts a process with the load b, which it does not keep. It costs one
// solve.
func NewProcess(p *Pencil, load []float64) *Process {
	if len(load) != p.Dim {
		panic("krylov: NewProcess: length of the load is not the dimension")
	}
	q := &Process{pencil: p, massed: make([]float64, p.Dim), work: make([]float64, p.Dim)}
	q.basis.workers = p.Workers
	v := make([]float64, p.Dim)
	p.Solve(v, load)
	before := largest(v)
	p.deflate(v)
	p.Mass(q.massed, v)
	q.start = math.Sqrt(max(0, inner(p.Workers, v, q.massed)))
	// A load that is all null vector (uniform heat) leaves nothing but rounding.
	if q.start == 0 || largest(v) <= 1e-15*before {
		q.start, q.exhausted = 0, true
		return q
	}
	q.append(v, q.start)
	return q
}

// append takes v/norm as the next basis vector; massed must be M v.
func (q *Process) append(v []float64, norm float64) {
	scale(v, 1/norm)
	scale(q.massed, 1/norm)
	q.peak = max(q.peak, largest(v))
	q.basis.vectors = append(q.basis.vectors, v)
}

// Len is the dimension of the space that results come from.
func (q *Process) Len() int { return len(q.alpha) }

// Exhausted tells that a longer basis has nothing to add.
func (q *Process) Exhausted() bool { return q.exhausted }

// Extend makes the space one dimension larger; it does nothing once exhausted. The
// error is ctx.Err().
func (q *Process) Extend(ctx context.Context) error {
	if q.exhausted {
		return nil
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	p, j := q.pencil, len(q.alpha)
	w := q.work
	p.Solve(w, q.massed)
	p.deflate(w)
	// First the two vectors that matter, then all of them: the second pass removes
	// what rounding left of the first, so that one full pass suffices.
	a := inner(p.Workers, w, q.massed)
	axpy(w, -a, q.basis.vectors[j])
	if j > 0 {
		axpy(w, -q.beta[j-1], q.basis.vectors[j-1])
	}
	p.Mass(q.massed, w)
	if cap(q.dots) <= j {
		q.dots = make([]float64, 2*j+16)
	}
	c := q.dots[:j+1]
	q.basis.dots(c, q.massed)
	a += c[j]
	for i := range c {
		c[i] = -c[i]
	}
	q.basis.add(w, c)
	p.deflate(w)
	p.Mass(q.massed, w)
	norm := math.Sqrt(max(0, inner(p.Workers, w, q.massed)))

	q.alpha = append(q.alpha, a)
	q.beta = append(q.beta, norm)
	size := 0.0
	for _, a := range q.alpha {
		size = max(size, math.Abs(a))
	}
	if norm <= 1e-15*size || j+1 >= p.Dim {
		q.exhausted = true
		return nil
	}
	q.work = make([]float64, p.Dim)
	q.append(w, norm)
	q.decompose() // at every step, for the bounds
	return nil
}

// AddTo adds V y to dst; y is what Evaluate returned.
func (q *Process) AddTo(dst, y []float64) { q.basis.add(dst, y) }
