package sparse

import "slices"

// A supernode is a run of columns of L that are stored as one dense trapezoid: w columns, and
// m rows of which the first w are the columns themselves.
type supernode struct {
	first, w, m int32
	parent      int32 // -1 at a root
	lo          int32 // first supernode of its subtree, which is [lo, itself]
	rows        int64 // rows[rows:rows+m-w] are the rows below the columns
	values      int64 // where its panels begin in the factor
}

// frontCost estimates the nanoseconds that one supernode costs in a numeric factorisation and a few solves.
// The constants are fits to runs on one core with AVX-512; only their proportions matter.
func frontCost(w, m int64) float64 {
	r := m - w
	flops := float64(w) * (float64(r*r) + float64(r*w) + float64(w*w)/3)
	return 100 + 4*float64(factorSize(w, m)) + 0.8*float64(r*r) + 0.03*flops
}

// supernodes groups the columns, listed in postorder, into supernodes and returns the new order of
// the columns: order[k] is the column, in the old numbering, that comes k-th. Columns join when
// their structures are the same but for the diagonal; then each parent takes in those children with
// which it costs less than apart (after C. Ashcraft and R. Grimes, ACM Trans. Math. Softw.
// 15(4), 1989, pp. 291–309, who bound the number of zeros instead).
func supernodes(parent, post, count []int32) (nodes []supernode, order []int32) {
	n := len(post)
	owner := make([]int32, n) // of each column, by its old number
	type group struct {
		w, m         int64
		parent       int32
		cost         float64
		begin, end   int32 // own columns in post
		merged, tail int32 // list of groups taken in, by next
		next         int32
	}
	groups := make([]group, 0, n/2+1)
	for k, j := range post {
		if k > 0 {
			i := post[k-1]
			if parent[i] == j && count[i] == count[j]+1 {
				owner[j] = owner[i]
				groups[owner[i]].end = int32(k + 1)
				continue
			}
		}
		owner[j] = int32(len(groups))
		groups = append(groups, group{begin: int32(k), end: int32(k + 1), merged: -1, tail: -1, next: -1, m: int64(count[j])})
	}
	head := make([]int32, len(groups)) // children, in descending order
	sibling := make([]int32, len(groups))
	for s := range groups {
		g := &groups[s]
		g.w = int64(g.end - g.begin)
		g.cost = frontCost(g.w, g.m)
		g.parent = -1
		if q := parent[post[g.end-1]]; q >= 0 {
			g.parent = owner[q]
		}
		head[s] = -1
	}
	for s := range groups {
		if q := groups[s].parent; q >= 0 {
			sibling[s] = head[q]
			head[q] = int32(s)
		}
	}
	gone := make([]bool, len(groups))
	for s := range groups {
		g := &groups[s]
		var kept int32 = -1
		for c := head[s]; c >= 0; {
			next := sibling[c]
			h := &groups[c]
			if together := frontCost(g.w+h.w, g.m+h.w); together <= g.cost+h.cost {
				g.w, g.m, g.cost = g.w+h.w, g.m+h.w, together
				gone[c] = true
				h.next = g.merged // lists grow at the head: children come before the columns of s
				g.merged = c
				for d := head[c]; d >= 0; { // grandchildren become children, not tried again
					after := sibling[d]
					sibling[d] = kept
					kept = d
					d = after
				}
			} else {
				sibling[c] = kept
				kept = c
			}
			c = next
		}
		head[s] = kept
	}

	// Lay the groups out in postorder, children with the larger update matrices first,
	// so that less lies waiting on the stack.
	parentOf := make([]int32, len(groups))
	for s := range groups {
		parentOf[s] = -1
	}
	var children []int32
	type visit struct {
		group            int32
		begin, next, end int32 // its children are pending[begin:end], those from next on still to visit
	}
	var stack []visit
	var pending []int32
	push := func(s int32) {
		children = children[:0]
		for c := head[s]; c >= 0; c = sibling[c] {
			children = append(children, c)
		}
		slices.SortFunc(children, func(a, b int32) int {
			ra, rb := groups[a].m-groups[a].w, groups[b].m-groups[b].w
			if ra != rb {
				return int(rb - ra)
			}
			return int(a - b)
		})
		begin := int32(len(pending))
		stack = append(stack, visit{s, begin, begin, begin + int32(len(children))})
		pending = append(pending, children...)
	}
	order = make([]int32, 0, n)
	var emit func(s int32)
	emit = func(s int32) {
		for c := groups[s].merged; c >= 0; c = groups[c].next {
			emit(c)
		}
		for k := groups[s].begin; k < groups[s].end; k++ {
			order = append(order, post[k])
		}
	}
	number := make([]int32, len(groups))
	for root := range groups {
		if groups[root].parent >= 0 {
			continue
		}
		push(int32(root))
		for len(stack) > 0 {
			top := &stack[len(stack)-1]
			if top.next < top.end {
				c := pending[top.next]
				top.next++
				parentOf[c] = top.group
				push(c)
				continue
			}
			s := top.group
			pending = pending[:top.begin]
			stack = stack[:len(stack)-1]
			g := &groups[s]
			number[s] = int32(len(nodes))
			nodes = append(nodes, supernode{first: int32(len(order)), w: int32(g.w), m: int32(g.m), parent: parentOf[s]})
			emit(s)
		}
	}
	for k := range nodes {
		if q := nodes[k].parent; q >= 0 {
			nodes[k].parent = number[q]
		}
		nodes[k].lo = int32(k)
	}
	for k := range nodes {
		if q := nodes[k].parent; q >= 0 {
			nodes[q].lo = min(nodes[q].lo, nodes[k].lo)
		}
	}
	return nodes, order
}
