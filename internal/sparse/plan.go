package sparse

import "slices"

// A plan says who computes what: subtrees of the elimination tree are tasks, each for one
// goroutine; the fronts above them, the top, follow in order, several goroutines to a front.
// It decides where update matrices lie, never the order of an addition.
type plan struct {
	workers  int
	subtrees []int32 // roots, the costliest first
	isTop    []bool  // by supernode
	top      []int32 // ascending
	slot     []int64 // where the update matrix of a subtree's root begins in the slab; by supernode, -1 elsewhere
	slab     int64   // values
	stack    [2]int64
	topStack [2]int64
	depth    []uint8 // parity of the depth: a front and its children use different stacks

	// The same for the solves, where a front hands a vector to its parent. Fronts of the top have a slot, too.
	vectorSlot  []int64
	vectorSlab  int64
	vectorStack [2]int64
	waits       []int32 // in the top: subtrees and fronts to wait for
}

func makePlan(nodes []supernode, workers int) *plan {
	n := len(nodes)
	pl := &plan{workers: workers, isTop: make([]bool, n), slot: make([]int64, n), depth: make([]uint8, n),
		vectorSlot: make([]int64, n), waits: make([]int32, n)}
	work := make([]float64, n)
	total := 0.0
	for s := range nodes {
		c := frontCost(int64(nodes[s].w), int64(nodes[s].m))
		total += c
		work[s] += c
		if q := nodes[s].parent; q >= 0 {
			work[q] += work[s]
		}
	}
	// With eight pieces for each goroutine the last to finish keeps the others waiting for an
	// eighth of its time at most.
	limit := total / float64(8*workers)
	if workers == 1 || total < 2e6 { // one goroutine does 2 ms of work sooner than two share it
		limit = total
	}
	for s := n - 1; s >= 0; s-- {
		q := nodes[s].parent
		if q >= 0 {
			pl.depth[s] = 1 - pl.depth[q]
		}
		pl.slot[s] = -1
		switch {
		case work[s] > limit:
			pl.isTop[s] = true
			pl.top = append(pl.top, int32(s))
		case q < 0 || pl.isTop[q]:
			pl.subtrees = append(pl.subtrees, int32(s))
			pl.slot[s] = pl.slab
			pl.slab += updateSize(int64(nodes[s].w), int64(nodes[s].m))
		}
		pl.vectorSlot[s] = -1
		if pl.isTop[s] || pl.slot[s] >= 0 {
			pl.vectorSlot[s] = pl.vectorSlab
			pl.vectorSlab += int64(nodes[s].m - nodes[s].w)
			if q >= 0 {
				pl.waits[q]++
			}
		}
	}
	slices.Reverse(pl.top)
	slices.SortStableFunc(pl.subtrees, func(a, b int32) int {
		switch {
		case work[a] > work[b]:
			return -1
		case work[a] < work[b]:
			return 1
		}
		return int(a - b)
	})
	// Play the stacks through.
	var size, topSize, vector [2]int64
	for s := range nodes {
		d := pl.depth[s]
		u := updateSize(int64(nodes[s].w), int64(nodes[s].m))
		r := int64(nodes[s].m - nodes[s].w)
		switch {
		case pl.isTop[s]:
			topSize[d] += u
			pl.topStack[d] = max(pl.topStack[d], topSize[d])
		case pl.slot[s] < 0:
			size[d] += u
			vector[d] += r
			pl.stack[d], pl.vectorStack[d] = max(pl.stack[d], size[d]), max(pl.vectorStack[d], vector[d])
		}
		for c := int32(s) - 1; c >= nodes[s].lo; c = nodes[c].lo - 1 { // the children, last first
			u, r := updateSize(int64(nodes[c].w), int64(nodes[c].m)), int64(nodes[c].m-nodes[c].w)
			switch {
			case pl.isTop[c]:
				topSize[1-d] -= u
			case pl.slot[c] < 0:
				size[1-d] -= u
				vector[1-d] -= r
			}
		}
	}
	return pl
}

// bytes is the memory that a factorisation of n rows needs beside the factor.
func (pl *plan) bytes(n int) int64 {
	return 4*int64(pl.workers+1)*int64(n) + 8*(pl.slab+pl.topStack[0]+pl.topStack[1]+int64(pl.workers)*(pl.stack[0]+pl.stack[1]))
}
