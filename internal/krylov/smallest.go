package krylov

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"sync"

	"gonum.org/v1/gonum/mat"
)

// Eigen holds eigenpairs K x = λ M x, ascending.
type Eigen struct {
	Values  []float64
	Vectors [][]float64 // M-orthonormal
	// Bounds are on each λ's relative error: the residual of B x = z x over z. The true
	// error is about its square over the relative gap.
	Bounds   []float64
	Solves   int
	Restarts int
}

// A ConvergenceError is an eigenvalue process that ran out of restarts or directions.
type ConvergenceError struct {
	Converged, Wanted int
	Bound             float64 // on the relative error of the worst one wanted
}

func (e *ConvergenceError) Error() string {
	return fmt.Sprintf("%d of %d eigenpairs converged; the worst is known to a relative %.2g", e.Converged, e.Wanted, e.Bound)
}

// mostRestarts is far beyond what any mesh has needed (some ten).
const mostRestarts = 60

// Smallest finds the count smallest eigenpairs of K x = λ M x beside those that the
// pencil deflates, to the relative tolerance. The error is a *ConvergenceError, also
// where there are not so many, or ctx.Err().
//
// The method is block Lanczos with thick restart (K. Wu and H. Simon, SIAM J. Matrix
// Anal. Appl. 22(2), 2000, pp. 602-616, here with blocks of eight) on B. Blocks let one
// pass over the factor serve several vectors and find eigenvalues of that multiplicity.
// An eigenvalue of a higher one could hide; so once all wanted pairs have converged,
// the process goes on from a random block beside them, until the next pair is known
// well enough to show that nothing larger (of B) was left out. Random numbers have a
// fixed seed.
//
// Cost: some 4·count + 100 solves, in blocks, and O(n·count) for each. Memory: 2·count
// + 100 vectors. Mass and Deflate are called by several goroutines at once.
func Smallest(ctx context.Context, p *Pencil, count int, tolerance float64, progress func(fraction float64)) (*Eigen, error) {
	limit := padded(2*count) + 10*abreast
	e := &eigenprocess{pencil: p, n: p.Dim, rng: rand.New(rand.NewPCG(20, 26)), count: count, limit: limit, stride: limit + 2*abreast}
	e.basis = newBlockBasis(p.Dim, e.stride, p.Workers)
	e.h = make([]float64, e.stride*e.stride)
	e.next = make([]float64, abreast*e.basis.rows)
	e.scatter()
	for blocks := 1; ; blocks++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		e.expand()
		full := e.basis.size >= e.limit || e.alive == 0
		if !full && (e.basis.size < count+abreast || blocks%3 != 0) {
			continue // a look costs the cube of the basis
		}
		e.solve()
		done, bound := e.converged(tolerance)
		if progress != nil {
			progress(float64(done) / float64(count))
		}
		switch {
		case done == count && e.alive == 0:
			return e.result(), nil
		case done == count && e.before == nil:
			e.check()
		case done == count && e.settled():
			if !e.changed() {
				return e.result(), nil
			}
			e.check()
		case full && (e.restarts >= mostRestarts || e.alive == 0):
			return nil, &ConvergenceError{Converged: done, Wanted: count, Bound: bound}
		case full:
			e.restarts++
			e.keep((count + (e.basis.size-count)/2) / abreast * abreast)
		}
	}
}

type eigenprocess struct {
	pencil   *Pencil
	n        int
	rng      *rand.Rand
	basis    *blockBasis // M-orthonormal, but for zero vectors
	next     []float64   // the block that comes next, M-orthonormal and orthogonal to the basis
	alive    int         // its columns that are not zero, which come first
	count    int
	limit    int       // of the basis
	h        []float64 // Vᵀ M B V, stride × stride, row-major
	stride   int
	z        []float64 // Ritz values, descending
	s        []float64 // their vectors: columns of a size × size matrix
	error    []float64 // residual of each
	couple   []float64 // next block against the basis: 8 × size
	coupled  int       // B takes the next block to the basis from here on, and beyond it
	before   []float64 // what had converged when the last check began; nil before the first
	solves   int
	restarts int
	x, b     []float64 // scratch: eight columns each
}

// scratch returns two arrays of eight columns, for use until the next call.
func (e *eigenprocess) scratch() (x, b []float64) {
	if e.x == nil {
		e.x, e.b = make([]float64, abreast*e.n), make([]float64, abreast*e.n)
	}
	return e.x, e.b
}

// eachColumn runs do for the eight columns, on several goroutines where it pays.
func (e *eigenprocess) eachColumn(do func(l int)) {
	if e.pencil.Workers <= 1 || e.n < 4096 {
		for l := range abreast {
			do(l)
		}
		return
	}
	var wait sync.WaitGroup
	workers := min(e.pencil.Workers, abreast)
	for w := range workers {
		wait.Go(func() {
			for l := w; l < abreast; l += workers {
				do(l)
			}
		})
	}
	wait.Wait()
}

// apply sets each column x of a block to B x, deflated.
func (e *eigenprocess) apply(block []float64) {
	p, n := e.pencil, e.n
	x, b := e.scratch()
	e.basis.columns(x, block, n)
	// B blows null vectors up a thousandfold and more against the rest: their part is
	// taken off before, and twice after.
	e.eachColumn(func(l int) {
		p.deflate(x[l*n : (l+1)*n])
		if p.Mass == nil {
			copy(b[l*n:(l+1)*n], x[l*n:(l+1)*n])
		} else {
			p.Mass(b[l*n:(l+1)*n], x[l*n:(l+1)*n])
		}
	})
	e.solves += abreast
	if p.SolveMany != nil {
		p.SolveMany(x, b, abreast)
	} else {
		for l := range abreast {
			p.Solve(x[l*n:(l+1)*n], b[l*n:(l+1)*n])
		}
	}
	e.eachColumn(func(l int) {
		p.deflate(x[l*n : (l+1)*n])
		p.deflate(x[l*n : (l+1)*n])
	})
	e.basis.interleave(block, x, n)
}

// massed is M times a block, which is the block itself where M is the identity.
func (e *eigenprocess) massed(block []float64) []float64 {
	p, n := e.pencil, e.n
	if p.Mass == nil {
		return block
	}
	x, b := make([]float64, abreast*n), make([]float64, abreast*n)
	e.basis.columns(x, block, n)
	e.eachColumn(func(l int) { p.Mass(b[l*n:(l+1)*n], x[l*n:(l+1)*n]) })
	out := make([]float64, len(block))
	e.basis.interleave(out, b, n)
	return out
}

// against takes from each column of a block its part along the basis from vector first
// on, and returns the coefficients: 8j+l for vector j and column l.
func (e *eigenprocess) against(block []float64, first int) []float64 {
	c := make([]float64, (e.basis.size-first)*abreast)
	if len(c) > 0 {
		e.basis.dots(c, e.massed(block), first)
		e.basis.subtract(block, c, first)
	}
	return c
}

// gram is the matrix of M products of a block's columns, 8 × 8.
func (e *eigenprocess) gram(block []float64) []float64 {
	self := &blockBasis{rows: e.basis.rows, workers: e.basis.workers, v: block, size: abreast}
	c := make([]float64, 64)
	self.dots(c, e.massed(block), 0)
	return c
}

// scatter makes the next block a random one beside the basis.
func (e *eigenprocess) scatter() {
	for i := range e.next[:abreast*e.n] {
		e.next[i] = e.rng.NormFloat64()
	}
	// Through the operator first: random vectors are rough, and what is rough in them
	// would only fill the basis.
	e.apply(e.next)
	sizes := e.gram(e.next)
	e.against(e.next, 0)
	e.against(e.next, 0)
	e.orthonormalize(sizes)
}

// orthonormalize makes the next block M-orthonormal, X = Q R, and returns R (8i+l for
// row i, column l). Sizes is the Gram matrix of X before anything was taken off it: a
// column that is rounding against that is replaced by a random one, with a zero row in
// R, or dropped once there is no direction left.
func (e *eigenprocess) orthonormalize(sizes []float64) (r []float64) {
	r = make([]float64, 64)
	for i := range abreast {
		r[9*i] = 1
	}
	for range 2 { // Cholesky twice: the second time takes off what the first one rounded
		g := e.gram(e.next)
		u, ok := upper(g, sizes)
		if !ok {
			return e.oneByOne(sizes, r)
		}
		divide(e.basis, e.next, u)
		r = times(u, r)
	}
	e.alive = abreast
	return r
}

// upper is R of G = RᵀR; not ok where a column has less than 1e-5 of its own, or is
// down at 1e-10 of its size.
func upper(g, sizes []float64) (r []float64, ok bool) {
	r = make([]float64, 64)
	for l := range abreast {
		for i := range l + 1 {
			sum := g[8*i+l]
			for k := range i {
				sum -= r[8*k+i] * r[8*k+l]
			}
			if i < l {
				r[8*i+l] = sum / r[9*i]
				continue
			}
			if !(sum > 1e-10*g[9*l]) || !(g[9*l] > 1e-20*sizes[9*l]) {
				return nil, false
			}
			r[9*l] = math.Sqrt(sum)
		}
	}
	return r, true
}

// divide sets X to X R⁻¹, row by row.
func divide(b *blockBasis, x, r []float64) {
	b.eachChunk(func(_, lo, hi int) {
		for i := lo; i < hi; i++ {
			row := x[abreast*i : abreast*i+abreast]
			for l := range abreast {
				sum := row[l]
				for k := range l {
					sum -= row[k] * r[8*k+l]
				}
				row[l] = sum / r[9*l]
			}
		}
	})
}

// times is a b, 8 × 8.
func times(a, b []float64) []float64 {
	c := make([]float64, 64)
	for i := range abreast {
		for k := range abreast {
			for l := range abreast {
				c[8*i+l] += a[8*i+k] * b[8*k+l]
			}
		}
	}
	return c
}

// oneByOne is orthonormalize where columns depend on one another: Gram and Schmidt's way,
// with replacements. What came before is in r already.
func (e *eigenprocess) oneByOne(sizes, before []float64) []float64 {
	n := e.n
	x := make([]float64, abreast*n)
	e.basis.columns(x, e.next, n)
	r := make([]float64, 64)
	var kept [][]float64
	var poor int
	for l := range abreast {
		v := x[l*n : (l+1)*n]
		norm := e.project(v, kept, r[l:])
		if norm*norm <= 1e-20*sizes[9*l] || norm == 0 { // B blows rounding up by 1e5 along null vectors
			poor++
			continue
		}
		r[8*len(kept)+l] = norm
		scale(v, 1/norm)
		kept = append(kept, v)
	}
	if poor > 0 {
		kept = e.replace(kept, poor)
	}
	packed := make([]float64, abreast*n)
	for i, v := range kept {
		copy(packed[i*n:(i+1)*n], v)
	}
	e.basis.interleave(e.next, packed, n)
	e.alive = len(kept)
	return times(r, before)
}

// replace adds up to poor random directions to kept.
func (e *eigenprocess) replace(kept [][]float64, poor int) [][]float64 {
	n := e.n
	block := make([]float64, abreast*e.basis.rows)
	for i := range n {
		for l := range poor {
			block[abreast*i+l] = e.rng.NormFloat64()
		}
	}
	e.apply(block)
	sizes := e.gram(block)
	e.against(block, 0)
	e.against(block, 0)
	x := make([]float64, abreast*n)
	e.basis.columns(x, block, n)
	for l := range poor {
		v := x[l*n : (l+1)*n]
		norm := e.project(v, kept, nil)
		if norm*norm <= 1e-18*sizes[9*l] || norm == 0 {
			continue // no direction left
		}
		scale(v, 1/norm)
		kept = append(kept, v)
	}
	return kept
}

// project takes from v its parts along kept, twice, adds the coefficients to every
// eighth entry of r, and returns the M norm of what is left.
func (e *eigenprocess) project(v []float64, kept [][]float64, r []float64) float64 {
	p := e.pencil
	mv := v
	massed := func() {
		if p.Mass != nil {
			mv = make([]float64, len(v))
			p.Mass(mv, v)
		}
	}
	for range 2 {
		for i, q := range kept {
			massed()
			c := inner(p.Workers, q, mv)
			axpy(v, -c, q)
			if r != nil {
				r[8*i] += c
			}
		}
	}
	massed()
	return math.Sqrt(max(0, inner(p.Workers, v, mv)))
}

// expand moves the next block into the basis and makes a new one from it.
func (e *eigenprocess) expand() {
	first := e.basis.size
	e.basis.append(e.next)
	e.apply(e.next)
	sizes := e.gram(e.next)
	// First the vectors that B couples the block with, then all of them: the second pass
	// removes what rounding left of the first.
	near := e.against(e.next, e.coupled)
	c := e.against(e.next, 0)
	for i, x := range near {
		c[e.coupled*abreast+i] += x
	}
	e.coupled = first
	m := e.basis.size
	for j := range m {
		for l := range abreast {
			e.set(j, first+l, c[abreast*j+l])
		}
	}
	// The new block's rows of the coupling: R on the vectors just added, 0 before.
	r := e.orthonormalize(sizes)
	e.couple = make([]float64, abreast*m)
	for i := range abreast {
		copy(e.couple[i*m+first:(i+1)*m], r[8*i:8*i+8])
	}
}

func (e *eigenprocess) set(i, j int, x float64) {
	e.h[i*e.stride+j], e.h[j*e.stride+i] = x, x
}

// solve finds the Ritz pairs and their residuals.
func (e *eigenprocess) solve() {
	m := e.basis.size
	a := mat.NewSymDense(m, nil)
	for i := range m {
		for j := i; j < m; j++ {
			a.SetSym(i, j, e.h[i*e.stride+j])
		}
	}
	var eig mat.EigenSym
	if !eig.Factorize(a, true) {
		panic("krylov: a symmetric eigenproblem did not converge")
	}
	values := eig.Values(nil)
	var vectors mat.Dense
	eig.VectorsTo(&vectors)
	e.z, e.s, e.error = make([]float64, m), make([]float64, m*m), make([]float64, m)
	for l := range m {
		from := m - 1 - l
		e.z[l] = values[from]
		for j := range m {
			e.s[j*m+l] = vectors.At(j, from)
		}
	}
	for i := range e.alive {
		for l := range m {
			sum := 0.0
			for j := range m {
				if c := e.couple[i*m+j]; c != 0 {
					sum += c * e.s[j*m+l]
				}
			}
			e.error[l] += sum * sum
		}
	}
	for l := range m {
		e.error[l] = math.Sqrt(e.error[l])
	}
}

// converged counts the leading Ritz pairs that meet the tolerance, and tells the bound
// of the worst one wanted. Zero vectors of the basis show as values of 0.
func (e *eigenprocess) converged(tolerance float64) (done int, bound float64) {
	for l := range e.count {
		b := math.Inf(1)
		if l < len(e.z) && e.z[l] > 1e-14*e.z[0] {
			b = e.error[l] / e.z[l]
		}
		if b <= tolerance && done == l {
			done++
		}
		bound = max(bound, b)
	}
	return done, bound
}

// check keeps the converged pairs and goes on from a random block beside them.
func (e *eigenprocess) check() {
	e.before = append([]float64(nil), e.z[:e.count]...)
	e.keep(e.count)
	e.scatter()
}

// settled tells whether a check has shown what it can: the pair after those wanted is
// known to 3 %. What is missing is then beside the last few of them, if anywhere, and
// of a multiplicity above the block's.
func (e *eigenprocess) settled() bool {
	l := e.count
	return len(e.z) > l && e.z[l] > 0 && e.error[l] <= 0.03*e.z[l]
}

// changed tells whether a check has brought up pairs that had been missed.
func (e *eigenprocess) changed() bool {
	for l, z := range e.before {
		if e.z[l] > z*(1+1e-9) {
			return true
		}
	}
	return false
}

// keep makes the first k Ritz vectors the basis, and fills up its last block with zero
// vectors.
func (e *eigenprocess) keep(k int) {
	m := e.basis.size
	for j := range m {
		for l := k; l < min(m, padded(k)); l++ {
			e.s[j*m+l] = 0
		}
	}
	e.basis.turn(padded(k), e.s, m)
	e.coupled = 0
	clear(e.h)
	for l := range k {
		e.set(l, l, e.z[l])
	}
}

func (e *eigenprocess) result() *Eigen {
	out := &Eigen{Solves: e.solves, Restarts: e.restarts}
	e.keep(e.count)
	var x []float64
	for l := range e.count {
		out.Values = append(out.Values, (1/e.z[l]-1)/e.pencil.Shift)
		out.Bounds = append(out.Bounds, e.error[l]/e.z[l])
		if l%abreast == 0 {
			x = make([]float64, abreast*e.n)
			e.basis.columns(x, e.basis.v[l*e.basis.rows:(l+abreast)*e.basis.rows], e.n)
		}
		v := x[l%abreast*e.n : (l%abreast+1)*e.n : (l%abreast+1)*e.n]
		e.pencil.deflate(v)
		out.Vectors = append(out.Vectors, v)
	}
	return out
}
