package sparse

import (
	"context"
	"slices"
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
	PeakBytes      int64 // what one Factor takes while it is being computed
}

// An Analysis is all that can be known of a factorisation from the pattern alone.
// It is immutable and may serve any number of factors and goroutines.
type Analysis struct {
	pattern *Pattern
	perm    []int32 // perm[k] is the row that is eliminated k-th
	inverse []int32
	parent  []int32
	colPtr  []int64
	stats   Stats
	opt     Options
}

// Stats returns counts of the factor to come.
func (a *Analysis) Stats() Stats { return a.stats }

// Analyze chooses an elimination order for matrices on p and works out the factor's structure.
// p must not change afterwards.
func Analyze(ctx context.Context, p *Pattern, opt Options) (*Analysis, error) {
	n := p.Dim()
	a := &Analysis{pattern: p, opt: opt}
	a.perm = order(p)
	a.inverse = make([]int32, n)
	for k, v := range a.perm {
		a.inverse[v] = int32(k)
	}
	a.parent = make([]int32, n)
	count := make([]int32, n)
	ancestor := make([]int32, n)
	mark := make([]int32, n)
	for k := range n {
		a.parent[k], ancestor[k], mark[k], count[k] = -1, -1, -1, 1
	}
	for k := range n {
		mark[k] = int32(k)
		v := a.perm[k]
		for _, w := range p.Adj[p.Ptr[v]:p.Ptr[v+1]] {
			i := a.inverse[w]
			if int(i) >= k {
				continue
			}
			for j := i; j != -1 && int(j) < k; {
				next := ancestor[j]
				ancestor[j] = int32(k)
				if next == -1 {
					a.parent[j] = int32(k)
				}
				j = next
			}
		}
		for _, w := range p.Adj[p.Ptr[v]:p.Ptr[v+1]] {
			i := a.inverse[w]
			if int(i) >= k {
				continue
			}
			for j := i; mark[j] != int32(k); j = a.parent[j] {
				mark[j] = int32(k)
				count[j]++
			}
		}
		if k&4095 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
	}
	a.colPtr = make([]int64, n+1)
	a.stats = Stats{Rows: n, Supernodes: n}
	for k, c := range count {
		a.colPtr[k+1] = a.colPtr[k] + int64(c)
		a.stats.FactorNonzeros += int64(c)
		a.stats.Flops += float64(c) * float64(c)
	}
	a.stats.StoredValues = a.stats.FactorNonzeros
	a.stats.PeakBytes = 12 * a.stats.FactorNonzeros
	if opt.MaxBytes > 0 && a.stats.PeakBytes > opt.MaxBytes {
		return nil, &SizeError{n, a.stats.PeakBytes, opt.MaxBytes}
	}
	return a, nil
}

// order is nested dissection by the levels of a breadth-first search.
func order(p *Pattern) []int32 {
	n := p.Dim()
	perm := make([]int32, 0, n)
	part := make([]int32, n) // which piece a row lies in
	next := int32(1)
	all := make([]int32, n)
	for i := range all {
		all[i] = int32(i)
	}
	level := make([]int32, n)
	search := func(start, piece int32) []int32 {
		queue := []int32{start}
		level[start] = 0
		part[start] = -piece
		for h := 0; h < len(queue); h++ {
			v := queue[h]
			for _, w := range p.Adj[p.Ptr[v]:p.Ptr[v+1]] {
				if part[w] == piece {
					part[w] = -piece
					level[w] = level[v] + 1
					queue = append(queue, w)
				}
			}
		}
		for _, v := range queue {
			part[v] = piece
		}
		return queue
	}
	for i := range part {
		part[i] = 1
	}
	var out []int32 // in reverse: separators first
	type job struct {
		rows  []int32
		piece int32
	}
	stack := []job{{all, 1}}
	for len(stack) > 0 {
		j := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		if len(j.rows) == 0 {
			continue
		}
		queue := search(j.rows[0], j.piece)
		if len(queue) < len(j.rows) { // several components: peel one off
			next++
			for _, v := range queue {
				part[v] = next
			}
			rest := slices.DeleteFunc(slices.Clone(j.rows), func(v int32) bool { return part[v] == next })
			stack = append(stack, job{rest, j.piece}, job{queue, next})
			continue
		}
		if len(j.rows) <= 16 {
			out = append(out, queue...)
			continue
		}
		queue = search(queue[len(queue)-1], j.piece)
		middle := level[queue[len(queue)/2]]
		var low, high []int32
		next++
		lowPiece := next
		next++
		for _, v := range queue {
			switch {
			case level[v] < middle:
				low = append(low, v)
				part[v] = lowPiece
			case level[v] > middle:
				high = append(high, v)
				part[v] = next
			default:
				out = append(out, v)
				part[v] = 0
			}
		}
		stack = append(stack, job{low, lowPiece}, job{high, next})
	}
	for _, v := range slices.Backward(out) {
		perm = append(perm, v)
	}
	return perm
}
