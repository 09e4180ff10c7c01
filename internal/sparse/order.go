package sparse

import (
	"context"
	"slices"
)

func dissect(ctx context.Context, p *Pattern, coords []float64, workers int) ([]int32, error) {
	return order(p), ctx.Err()
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
