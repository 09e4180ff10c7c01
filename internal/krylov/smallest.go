package krylov

import (
	"context"
	"math"
	"math/rand/v2"

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

// A ConvergenceError is an eigenvalue process that ran out of restarts.
type ConvergenceError struct {
	Converged, Wanted int
	Bound             float64 // on the relative error of the worst one wanted
}

func (e *ConvergenceError) Error() string {
	return "krylov: eigenpairs did not converge"
}

// Smallest finds the count smallest eigenpairs of K x = λ M x beside those that the
// pencil deflates, to the relative tolerance. The error is a *ConvergenceError, also
// where there are not so many, or ctx.Err().
//
// The method is block Lanczos with thick restart (K. Wu and H. Simon, SIAM J. Matrix
// Anal. Appl. 22(2), 2000, pp. 602-616, here with blocks) on B. Blocks let one pass
// over the factor serve several vectors and find eigenvalues of that multiplicity. An
// eigenvalue of a higher one could hide; so once all wanted pairs have converged, the
// process goes on from a random block beside them, until the next pair is known well
// enough to show that nothing larger (of B) was left out. Random numbers have a fixed seed.
//
// Cost: some 4·count + 100 solves, in blocks, and O(n·count) for each. Memory: 2·count
// + 100 vectors.
func Smallest(ctx context.Context, p *Pencil, count int, tolerance float64, progress func(fraction float64)) (*Eigen, error) {
	e := &eigenprocess{pencil: p, rng: rand.New(rand.NewPCG(20, 26)), block: min(8, p.Dim), count: count}
	e.basis.workers = p.Workers
	e.limit = 2*count + 10*e.block
	e.next = make([]float64, p.Dim*e.block)
	for i := range e.next {
		e.next[i] = e.rng.NormFloat64()
	}
	// Through the operator first: random vectors are rough, and what is rough in them
	// would only fill the basis.
	e.apply(e.next)
	e.orthonormalize(e.norms())
	const mostRestarts = 60
	for blocks := 1; ; blocks++ {
		if err := e.expand(ctx); err != nil {
			return nil, err
		}
		full := len(e.basis.vectors) >= e.limit || e.width() == 0
		if !full && (len(e.basis.vectors) < count+e.block || blocks%3 != 0) {
			continue // a look costs the cube of the basis
		}
		e.solve()
		done, bound := e.converged(tolerance)
		if progress != nil {
			progress(float64(done) / float64(count))
		}
		switch {
		case done == count && e.width() == 0:
			return e.result(), nil
		case done == count && e.before == nil:
			e.check()
		case done == count && e.settled():
			if !e.changed() {
				return e.result(), nil
			}
			e.check()
		case full && (e.restarts >= mostRestarts || e.width() == 0):
			return nil, &ConvergenceError{Converged: done, Wanted: count, Bound: bound}
		case full:
			e.restarts++
			m := len(e.basis.vectors)
			e.keep(min(m-e.block, count+(m-count)/2))
		}
	}
}

type eigenprocess struct {
	pencil   *Pencil
	rng      *rand.Rand
	basis    basis     // M-orthonormal
	next     []float64 // the block that comes next: width columns, M-orthonormal, and to the basis
	block    int       // columns at most
	count    int
	limit    int       // of the basis
	h        []float64 // Vᵀ M B V, limit+2·block square, row-major, for the basis and the next block
	z        []float64 // Ritz values, descending
	s        []float64 // their vectors, columns of a len(basis) square matrix
	error    []float64 // residual of each
	couple   []float64 // next block against the basis: width × len(basis)
	coupled  int       // B takes the next block to the basis from here on, and beyond it
	solves   int
	restarts int
	before   []float64 // what had converged when the last check began; nil before the first
}

func (e *eigenprocess) width() int  { return len(e.next) / e.pencil.Dim }
func (e *eigenprocess) stride() int { return e.limit + 2*e.block }

// apply sets each column x to B x, deflated.
func (e *eigenprocess) apply(x []float64) {
	p, n := e.pencil, e.pencil.Dim
	k := len(x) / n
	if k == 0 {
		return
	}
	b := make([]float64, len(x))
	// B blows null vectors up a thousandfold and more against the rest: their part is
	// taken off before, and twice after.
	for l := range k {
		p.deflate(x[l*n : (l+1)*n])
		p.Mass(b[l*n:(l+1)*n], x[l*n:(l+1)*n])
	}
	e.solves += k
	if p.SolveMany != nil {
		p.SolveMany(x, b, k)
	} else {
		for l := range k {
			p.Solve(x[l*n:(l+1)*n], b[l*n:(l+1)*n])
		}
	}
	for range 2 {
		for l := range k {
			p.deflate(x[l*n : (l+1)*n])
		}
	}
}

// against takes from each column of x its part along the basis from vector first on,
// and returns the coefficients, basis by columns.
func (e *eigenprocess) against(x []float64, first int) []float64 {
	p, n := e.pencil, e.pencil.Dim
	part := &basis{vectors: e.basis.vectors[first:], workers: e.basis.workers, partial: e.basis.partial}
	k, m := len(x)/n, len(part.vectors)
	mx := make([]float64, len(x))
	for l := range k {
		p.Mass(mx[l*n:(l+1)*n], x[l*n:(l+1)*n])
	}
	c := make([]float64, m*k)
	part.dotsMany(c, mx, k)
	part.subtractMany(x, c, k)
	e.basis.partial = part.partial
	return c
}

// norms are the M norms of the next block's columns.
func (e *eigenprocess) norms() []float64 {
	n := e.pencil.Dim
	mx, out := make([]float64, n), make([]float64, e.width())
	for l := range out {
		out[l] = e.norm(e.next[l*n:(l+1)*n], mx)
	}
	return out
}

// orthonormalize makes the next block M-orthonormal, x = q r, and orthogonal to the
// basis, and returns r (column l of x is Σ_i r[i*k+l] q_i). Columns that depend on
// others are replaced by random ones (with a zero row in r), or dropped once there is
// no direction left. Sizes are the columns' norms before anything was taken off them.
func (e *eigenprocess) orthonormalize(sizes []float64) (r []float64, k int) {
	p, n := e.pencil, e.pencil.Dim
	k = e.width()
	r = make([]float64, k*k)
	kept := 0
	mq := make([]float64, n)
	for l := range k {
		x := e.next[l*n : (l+1)*n]
		e.project(x, kept, r, k, l)
		norm := e.norm(x, mq)
		if norm <= 1e-13*sizes[l] {
			// Nothing of its own: a random direction takes its place. Its first trip
			// through B makes it as smooth as the others.
			for try := 0; ; try++ {
				if try == 3 {
					norm = 0
					break
				}
				for i := range x {
					x[i] = e.rng.NormFloat64()
				}
				e.apply(x)
				size := e.norm(x, mq)
				e.against(x, 0)
				e.project(x, kept, nil, k, l)
				e.against(x, 0)
				e.project(x, kept, nil, k, l)
				p.deflate(x)
				if norm = e.norm(x, mq); norm > 1e-9*size {
					break
				}
			}
			if norm == 0 || len(e.basis.vectors)+kept >= n {
				continue
			}
			scale(x, 1/norm)
		} else {
			r[kept*k+l] = norm
			scale(x, 1/norm)
		}
		copy(e.next[kept*n:(kept+1)*n], x)
		kept++
	}
	e.next = e.next[:kept*n]
	return r, k
}

// project takes from x its parts along the first kept columns of the next block,
// twice, and adds the coefficients to column l of r.
func (e *eigenprocess) project(x []float64, kept int, r []float64, k, l int) {
	p, n := e.pencil, e.pencil.Dim
	mx := make([]float64, n)
	for range 2 {
		for i := range kept {
			q := e.next[i*n : (i+1)*n]
			p.Mass(mx, x)
			c := inner(p.Workers, q, mx)
			axpy(x, -c, q)
			if r != nil {
				r[i*k+l] += c
			}
		}
	}
}

func (e *eigenprocess) norm(x, mx []float64) float64 {
	e.pencil.Mass(mx, x)
	return math.Sqrt(max(0, inner(e.pencil.Workers, x, mx)))
}

// expand moves the next block into the basis and makes a new one from it.
func (e *eigenprocess) expand(ctx context.Context) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	n, k := e.pencil.Dim, e.width()
	if e.h == nil {
		e.h = make([]float64, e.stride()*e.stride())
	}
	first := len(e.basis.vectors)
	for l := range k {
		e.basis.vectors = append(e.basis.vectors, append([]float64(nil), e.next[l*n:(l+1)*n]...))
	}
	e.apply(e.next)
	sizes := e.norms()
	// First the vectors that B couples the block with, then all of them: the second pass
	// removes what rounding left of the first.
	near := e.against(e.next, e.coupled)
	c := e.against(e.next, 0)
	for i, x := range near {
		c[e.coupled*k+i] += x
	}
	e.coupled = first
	for l := range k {
		e.pencil.deflate(e.next[l*n : (l+1)*n])
	}
	for j := range e.basis.vectors {
		for l := range k {
			e.set(j, first+l, c[j*k+l])
		}
	}
	r, columns := e.orthonormalize(sizes)
	// The new block's rows of the coupling: r on the columns just added, 0 before.
	m := len(e.basis.vectors)
	e.couple = make([]float64, e.width()*m)
	for i := range e.width() {
		for l := range columns {
			e.couple[i*m+first+l] = r[i*columns+l]
		}
	}
	return nil
}

func (e *eigenprocess) set(i, j int, x float64) {
	e.h[i*e.stride()+j], e.h[j*e.stride()+i] = x, x
}

// solve finds the Ritz pairs and their residuals.
func (e *eigenprocess) solve() {
	m := len(e.basis.vectors)
	a := mat.NewSymDense(m, nil)
	for i := range m {
		for j := i; j < m; j++ {
			a.SetSym(i, j, e.h[i*e.stride()+j])
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
	for i := range e.width() {
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
// of the worst one wanted.
func (e *eigenprocess) converged(tolerance float64) (done int, bound float64) {
	for l := range min(e.count, len(e.z)) {
		b := e.error[l] / e.z[l]
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
	n := e.pencil.Dim
	e.next = make([]float64, n*e.block)
	for i := range e.next {
		e.next[i] = e.rng.NormFloat64()
	}
	e.apply(e.next)
	sizes := e.norms()
	e.against(e.next, 0)
	e.against(e.next, 0)
	e.orthonormalize(sizes)
}

// settled tells whether a check has shown what it can: the pair after those wanted is
// known to 3 %. What is missing is then beside the last few of them, if anywhere, and
// of a multiplicity above the block's.
func (e *eigenprocess) settled() bool {
	l := e.count
	return len(e.z) > l && e.error[l] <= 0.03*e.z[l]
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

// keep makes the first k Ritz vectors the basis.
func (e *eigenprocess) keep(k int) {
	m := len(e.basis.vectors)
	e.basis.turn(m, k, e.s, m)
	e.coupled = 0
	clear(e.h)
	for l := range k {
		e.set(l, l, e.z[l])
	}
}

func (e *eigenprocess) result() *Eigen {
	out := &Eigen{Solves: e.solves, Restarts: e.restarts}
	gamma := e.pencil.Shift
	for l := range e.count {
		out.Values = append(out.Values, (1/e.z[l]-1)/gamma)
		out.Bounds = append(out.Bounds, e.error[l]/e.z[l])
	}
	m := len(e.basis.vectors)
	e.basis.turn(m, e.count, e.s, m)
	out.Vectors = e.basis.vectors
	return out
}
