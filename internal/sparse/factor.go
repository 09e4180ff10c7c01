package sparse

import (
	"context"
	"math"
	"slices"
	"sync/atomic"
)

// A Factor holds P S A S Pᵀ = L Lᵀ for one matrix A at a time: P is the analysis's order, S a diagonal
// of powers of two that brings A's diagonal between 1/2 and 2, so that nothing depends on units.
// Any number of goroutines may solve with a Factor at once, but none while Factorize runs.
type Factor struct {
	a      *Analysis
	values []float64 // panels of all supernodes, and 64 zeros that kernels may read
	scale  []float64 // diagonal of S, in the order of elimination
	matrix *Matrix   // last factored; nil before and after a failure
	held   []bool

	heldInOrder []bool // held, in the order of elimination, while Factorize runs
	work        *workspace
}

// workspace is what a numeric factorisation needs beside the factor itself.
type workspace struct {
	slab  []float64 // update matrices of the roots of subtrees
	lanes []lane    // one for each goroutine, then one for the top
}

// lane is what one goroutine works with.
type lane struct {
	place []int32      // of the rows below the columns of the present front, by row of the matrix
	stack [2][]float64 // of update matrices
	fill  [2]int64
}

// NewFactor returns an empty factor; Factorize allocates its memory once, and fills it any number of times.
func (a *Analysis) NewFactor() *Factor {
	return &Factor{a: a}
}

func (a *Analysis) newWorkspace() *workspace {
	w := &workspace{slab: make([]float64, a.plan.slab), lanes: make([]lane, a.plan.workers+1)}
	for i := range w.lanes {
		w.lanes[i].place = make([]int32, len(a.perm))
		for d := range 2 {
			size := a.plan.stack[d]
			if i == a.plan.workers {
				size = a.plan.topStack[d]
			}
			w.lanes[i].stack[d] = make([]float64, size)
		}
	}
	return w
}

// Factorize computes the factor of m, which must be on the pattern that was analysed (the same
// one, or one with the same entries). Rows and columns with held[i] are replaced by the identity's;
// held may be nil. Both are kept, not copied, for SolveRefinedTo, and must not change until the
// next call. Memory is reused from call to call.
//
// The error is a *NotPositiveDefiniteError or ctx.Err(); the factor is unusable then, until a
// later call succeeds.
func (f *Factor) Factorize(ctx context.Context, m *Matrix, held []bool) error {
	a := f.a
	n := len(a.perm)
	if p := a.pattern; len(m.Diag) != n || len(m.Off) != len(p.Adj) || held != nil && len(held) != n ||
		m.Pattern != p && !(slices.Equal(m.Ptr, p.Ptr) && slices.Equal(m.Adj, p.Adj)) {
		panic("sparse: Factorize: matrix is not on the pattern that was analysed")
	}
	f.matrix, f.held = nil, held
	if f.values == nil {
		f.values = make([]float64, a.stats.StoredValues+slack)
		f.scale = make([]float64, n)
	}
	if held != nil {
		f.heldInOrder = make([]bool, n)
		defer func() { f.heldInOrder = nil }()
	}
	for k, v := range a.perm {
		d := m.Diag[v]
		if held != nil && held[v] {
			d = 1
			f.heldInOrder[k] = true
		}
		if !(d > 0) || d > math.MaxFloat64 {
			return &NotPositiveDefiniteError{int(v), d}
		}
		_, e := math.Frexp(d)
		f.scale[k] = math.Ldexp(1, -(e >> 1))
	}
	f.matrix = m
	f.work, _ = a.workspaces.Get().(*workspace)
	if f.work == nil {
		f.work = a.newWorkspace()
	}
	err := f.factorize(ctx)
	a.workspaces.Put(f.work)
	f.work = nil
	if err != nil {
		f.matrix = nil
	}
	return err
}

// failure is the first column, in the order of elimination, whose pivot is not positive.
type failure struct {
	column int64
	pivot  float64
}

func (f *Factor) factorize(ctx context.Context) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	pl := f.a.plan
	failures := make([]failure, len(pl.subtrees))
	var stop atomic.Bool
	defer context.AfterFunc(ctx, func() { stop.Store(true) })()
	inParallel(pl.workers, len(pl.subtrees), func(worker, i int) {
		failures[i] = f.factorSubtree(&f.work.lanes[worker], pl.subtrees[i], &stop)
	})
	if stop.Load() {
		return ctx.Err()
	}
	// All subtrees run to their end or failure, so that the row reported does not depend on who came first.
	first := failure{column: -1}
	for _, e := range failures {
		if e.column >= 0 && (first.column < 0 || e.column < first.column) {
			first = e
		}
	}
	if first.column < 0 {
		ln := &f.work.lanes[pl.workers]
		ln.fill = [2]int64{}
		for _, s := range pl.top {
			if stop.Load() {
				return ctx.Err()
			}
			if first = f.factorFront(ln, s, pl.workers); first.column >= 0 {
				break
			}
		}
	}
	if first.column >= 0 {
		s := f.scale[first.column]
		return &NotPositiveDefiniteError{int(f.a.perm[first.column]), first.pivot / s / s}
	}
	return nil
}

func (f *Factor) factorSubtree(ln *lane, root int32, stop *atomic.Bool) failure {
	ln.fill = [2]int64{}
	for s := f.a.nodes[root].lo; s <= root; s++ {
		if stop.Load() {
			break
		}
		if e := f.factorFront(ln, s, 1); e.column >= 0 {
			return e
		}
	}
	return failure{column: -1}
}

// factorFront assembles and eliminates one front, whose children are done, and leaves its update matrix on the
// lane's stack or, for the root of a subtree, in the slab.
func (f *Factor) factorFront(ln *lane, s int32, workers int) failure {
	a := f.a
	node := &a.nodes[s]
	w, m := int64(node.w), int64(node.m)
	d := a.plan.depth[s]
	size := updateSize(w, m)
	fr := front{w: int(w), m: int(m), blocks: int(m+7) / 8,
		before: int(node.first - a.nodes[node.lo].first), l: f.values[node.values : node.values+factorSize(w, m)+slack]}
	if slot := a.plan.slot[s]; slot >= 0 {
		fr.u = f.work.slab[slot : slot+size]
	} else {
		fr.u = ln.stack[d][ln.fill[d] : ln.fill[d]+size]
	}
	for i, r := range a.below(s) {
		ln.place[r] = int32(w) + int32(i)
	}
	var run each
	if workers > 1 && frontCost(w, m) > parallelFront {
		run = func(n int, do func(i int)) { inParallel(workers, n, func(_, i int) { do(i) }) }
		chunks := (fr.blocks + 7) / 8
		run(chunks, func(i int) { f.assemble(&fr, s, ln, 8*i, min(8*i+8, fr.blocks)) })
	} else {
		f.assemble(&fr, s, ln, 0, fr.blocks)
	}
	if k, pivot := fr.eliminate(run); k < fr.w {
		return failure{int64(node.first) + int64(k), pivot}
	}
	for c := s - 1; c >= node.lo; c = a.nodes[c].lo - 1 {
		if a.plan.slot[c] < 0 {
			ln.fill[1-d] -= updateSize(int64(a.nodes[c].w), int64(a.nodes[c].m))
		}
	}
	if a.plan.slot[s] < 0 {
		ln.fill[d] += size
	}
	return failure{column: -1}
}

// parallelFront is the estimated cost in nanoseconds above which a front is worth several
// goroutines: each of its half-dozen joins costs some microseconds.
const parallelFront = 300e3
