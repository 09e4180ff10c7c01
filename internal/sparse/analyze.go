package sparse

import (
	"context"
	"math"
	"runtime"
	"slices"
	"sync"
)

// Options steers an analysis.
type Options struct {
	Coords   []float64 // 3 per row, any unit, or nil; they guide the ordering only
	Workers  int       // goroutines at work at a time; 0 = GOMAXPROCS
	MaxBytes int64     // refuse with a *SizeError when the factor would take more; 0 = no limit
}

// Stats describes the factor that an analysis leads to.
type Stats struct {
	Rows           int
	FactorNonzeros int64   // of L, diagonal included, without padding
	Flops          float64 // sum of the squared column counts
	Supernodes     int
	StoredValues   int64 // float64 values that a Factor keeps, padding included
	PeakBytes      int64 // what the analysis and one Factor take while it is being computed
}

// An Analysis is all that can be known of a factorisation from the pattern alone.
// It is immutable and may serve any number of factors and goroutines.
type Analysis struct {
	pattern    *Pattern
	perm       []int32 // perm[k] is the row that is eliminated k-th
	inverse    []int32
	nodes      []supernode // in postorder
	rows       []int32     // below the columns of each supernode, ascending, in the order of elimination
	relative   []int32     // the same rows as places in the parent's front
	lower      lower
	plan       *plan
	stats      Stats
	workspaces sync.Pool    // of *workspace
	vectors    [3]sync.Pool // of *vectors, for 1, 8 and 16 right sides
}

// lower is the part of the pattern below the diagonal, in the order of elimination, and where a matrix on the pattern
// keeps its entries: to fill a column takes no search and no table of places.
type lower struct {
	ptr  []int64 // entries of column k are [ptr[k], ptr[k+1])
	row  []int32
	from []int32 // index in Matrix.Off
}

// Stats returns counts of the factor to come.
func (a *Analysis) Stats() Stats { return a.stats }

// Analyze chooses an elimination order for matrices on p and works out the factor's structure.
// p must not change afterwards. The error is a *SizeError or ctx.Err().
func Analyze(ctx context.Context, p *Pattern, opt Options) (*Analysis, error) {
	n := p.Dim()
	if len(p.Adj) > math.MaxInt32 {
		return nil, &SizeError{n, 12 * int64(len(p.Adj)), 12 * math.MaxInt32}
	}
	workers := opt.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	g, near, perm, err := dissect(ctx, p, opt.Coords, workers)
	if err != nil {
		return nil, err
	}
	inverse := invert(perm)
	parent := eliminationTree(g, perm, inverse)
	post := postorder(parent)
	count := columnCounts(g, perm, inverse, parent, post)
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	a := &Analysis{pattern: p, stats: Stats{Rows: n}}
	for _, c := range count {
		a.stats.FactorNonzeros += int64(c)
		a.stats.Flops += float64(c) * float64(c)
	}
	var order []int32
	a.nodes, order = supernodes(parent, post, count)
	for k, j := range order {
		order[k] = perm[j]
	}
	inverse = invert(order)
	a.stats.Supernodes = len(a.nodes)
	var below int64
	for s := range a.nodes {
		node := &a.nodes[s]
		node.rows, node.values = below, a.stats.StoredValues
		below += int64(node.m - node.w)
		a.stats.StoredValues += factorSize(int64(node.w), int64(node.m))
	}
	a.plan = makePlan(a.nodes, workers)
	a.stats.PeakBytes = 8*a.stats.StoredValues + a.plan.bytes(n) + 8*below + 16*int64(n) + 4*int64(len(p.Adj))
	if opt.MaxBytes > 0 && a.stats.PeakBytes > opt.MaxBytes {
		return nil, &SizeError{n, a.stats.PeakBytes, opt.MaxBytes}
	}
	a.rows = make([]int32, below)
	a.relative = make([]int32, below)
	a.structure(g, order, inverse)
	a.lower = makeLower(p, g, near, order, inverse, workers)
	a.perm = order
	for k, v := range order {
		a.perm[k] = near[v]
	}
	a.inverse = invert(a.perm)
	return a, ctx.Err()
}

func makeLower(p *Pattern, g *graph, near, perm, inverse []int32, workers int) lower {
	n := len(perm)
	l := lower{ptr: make([]int64, n+1), row: make([]int32, len(p.Adj)/2), from: make([]int32, len(p.Adj)/2)}
	chunks := (n + chunk - 1) / chunk
	inParallel(workers, chunks, func(_, c int) {
		for k := c * chunk; k < min((c+1)*chunk, n); k++ {
			for _, w := range g.neighbours(perm[k]) {
				if int(inverse[w]) > k {
					l.ptr[k+1]++
				}
			}
		}
	})
	for k := range n {
		l.ptr[k+1] += l.ptr[k]
	}
	inParallel(workers, chunks, func(_, c int) {
		for k := c * chunk; k < min((c+1)*chunk, n); k++ {
			v := perm[k]
			at, first := l.ptr[k], p.Ptr[near[v]] // rows of g list neighbours in the order of p
			for q, w := range g.neighbours(v) {
				if i := inverse[w]; int(i) > k {
					l.row[at], l.from[at] = i, int32(first)+int32(q)
					at++
				}
			}
		}
	})
	return l
}

func invert(perm []int32) (inverse []int32) {
	inverse = make([]int32, len(perm))
	for k, v := range perm {
		inverse[v] = int32(k)
	}
	return inverse
}

// structure fills in the rows of all supernodes, subtree by subtree.
func (a *Analysis) structure(g *graph, perm, inverse []int32) {
	pl := a.plan
	marks := make([][]int32, pl.workers) // 1 + the supernode that last had the row
	for i := range marks {
		marks[i] = make([]int32, len(perm))
	}
	inParallel(pl.workers, len(pl.subtrees), func(worker, i int) {
		root := pl.subtrees[i]
		for s := a.nodes[root].lo; s <= root; s++ {
			a.rowsBelow(g, perm, inverse, s, marks[worker])
		}
	})
	for _, s := range pl.top {
		a.rowsBelow(g, perm, inverse, s, marks[0])
	}
}

// rowsBelow fills in the rows of a supernode, the union of its columns' entries in the matrix and
// of its children's rows, and the places of the latter.
func (a *Analysis) rowsBelow(g *graph, perm, inverse []int32, s int32, mark []int32) {
	node := &a.nodes[s]
	end := node.first + node.w
	rows := a.rows[node.rows:node.rows]
	stamp := s + 1
	for _, v := range perm[node.first:end] {
		for _, w := range g.neighbours(v) {
			if i := inverse[w]; i >= end && mark[i] != stamp {
				mark[i] = stamp
				rows = append(rows, i)
			}
		}
	}
	for c := s - 1; c >= node.lo; c = a.nodes[c].lo - 1 {
		for _, i := range a.below(c) {
			if i >= end && mark[i] != stamp {
				mark[i] = stamp
				rows = append(rows, i)
			}
		}
	}
	if len(rows) != int(node.m-node.w) {
		panic("sparse: column counts disagree with the structure: the pattern is not symmetric")
	}
	slices.Sort(rows)
	for c := s - 1; c >= node.lo; c = a.nodes[c].lo - 1 {
		relative := a.relative[a.nodes[c].rows:]
		at := int32(0)
		for i, r := range a.below(c) {
			if r < end {
				relative[i] = r - node.first
				continue
			}
			for rows[at] != r {
				at++
			}
			relative[i] = node.w + at
		}
	}
}

// below returns the rows of a supernode below its columns.
func (a *Analysis) below(s int32) []int32 {
	node := &a.nodes[s]
	return a.rows[node.rows : node.rows+int64(node.m-node.w)]
}
