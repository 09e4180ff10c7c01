package sparse

import (
	"cmp"
	"slices"
)

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

// A group is a supernode in the making: its own columns are post[begin:end], and it may take in others.
type group struct {
	cost           float64
	w, m           int32
	parent         int32
	begin, end     int32
	merged         int32 // first of the groups taken in, further ones by next
	next           int32
	child, sibling int32 // first child that is not taken in, next child of the same parent
}

// supernodes groups the columns, listed in postorder, into supernodes and returns the new order of
// the columns: order[k] is the column, in the old numbering, that comes k-th. Columns join when
// their structures are the same but for the diagonal; then each parent takes in those children with
// which it costs less than apart (after C. Ashcraft and R. Grimes, ACM Trans. Math. Softw.
// 15(4), 1989, pp. 291–309, who bound the number of zeros instead).
func supernodes(parent, post, count []int32) (nodes []supernode, order []int32) {
	owner := make([]int32, len(post)) // of each column, by its old number
	joins := func(k int) bool {       // post[k] and the column before it
		i, j := post[k-1], post[k]
		return parent[i] == j && count[i] == count[j]+1
	}
	number := 0
	for k := range post {
		if k == 0 || !joins(k) {
			number++
		}
	}
	groups := make([]group, 0, number)
	for k, j := range post {
		if k > 0 && joins(k) {
			owner[j] = owner[post[k-1]]
			groups[owner[j]].end = int32(k + 1)
			continue
		}
		owner[j] = int32(len(groups))
		groups = append(groups, group{begin: int32(k), end: int32(k + 1), merged: -1, next: -1, child: -1, m: count[j]})
	}
	for s := range groups {
		g := &groups[s]
		g.w = g.end - g.begin
		g.cost = frontCost(int64(g.w), int64(g.m))
		g.parent = -1
		if q := parent[post[g.end-1]]; q >= 0 {
			g.parent = owner[q]
			g.sibling = groups[g.parent].child
			groups[g.parent].child = int32(s)
		}
	}
	for s := range groups {
		g := &groups[s]
		var kept int32 = -1
		for c := g.child; c >= 0; {
			h := &groups[c]
			next := h.sibling
			if together := frontCost(int64(g.w+h.w), int64(g.m+h.w)); together <= g.cost+h.cost {
				g.w, g.m, g.cost = g.w+h.w, g.m+h.w, together
				h.next = g.merged // lists grow at the head: children come before the columns of s
				g.merged = c
				for d := h.child; d >= 0; { // grandchildren become children, not tried again
					groups[d].sibling, kept, d = kept, d, groups[d].sibling
				}
			} else {
				h.sibling, kept = kept, c
			}
			c = next
		}
		g.child = kept
	}
	return layOut(groups, post)
}

// layOut numbers groups in postorder, children with the larger update matrices first, so that less lies waiting
// on the stack, and lists their columns.
func layOut(groups []group, post []int32) (nodes []supernode, order []int32) {
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
		for c := groups[s].child; c >= 0; c = groups[c].sibling {
			children = append(children, c)
		}
		slices.SortFunc(children, func(a, b int32) int {
			ra, rb := groups[a].m-groups[a].w, groups[b].m-groups[b].w
			return cmp.Or(cmp.Compare(rb, ra), cmp.Compare(a, b))
		})
		begin := int32(len(pending))
		stack = append(stack, visit{s, begin, begin, begin + int32(len(children))})
		pending = append(pending, children...)
	}
	order = make([]int32, 0, len(post))
	var emit func(s int32)
	emit = func(s int32) {
		for c := groups[s].merged; c >= 0; c = groups[c].next {
			emit(c)
		}
		for k := groups[s].begin; k < groups[s].end; k++ {
			order = append(order, post[k])
		}
	}
	place := make([]int32, len(groups))
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
			place[s] = int32(len(nodes))
			nodes = append(nodes, supernode{first: int32(len(order)), w: g.w, m: g.m, parent: parentOf[s]})
			emit(s)
		}
	}
	for k := range nodes {
		if q := nodes[k].parent; q >= 0 {
			nodes[k].parent = place[q]
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
