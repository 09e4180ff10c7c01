package sparse

// eliminationTree returns the parent of each column of the factor, -1 at a root, when the vertices
// of g are eliminated in the order perm, whose inverse is given: parent[k] is the first row below
// the diagonal in column k of L. It runs in O(|A| α) (J. W. H. Liu, SIAM J. Matrix Anal. Appl.
// 11(1), 1990, pp. 134–172, algorithm 4.2: path compression).
func eliminationTree(g *graph, perm, inverse []int32) (parent []int32) {
	n := len(perm)
	parent = make([]int32, n)
	ancestor := make([]int32, n)
	for k := range int32(n) {
		parent[k], ancestor[k] = -1, -1
		v := perm[k]
		for _, w := range g.neighbours(v) {
			for i := inverse[w]; i < k; {
				next := ancestor[i]
				ancestor[i] = k
				if next < 0 {
					parent[i] = k
					break
				}
				i = next
			}
		}
	}
	return parent
}

// postorder lists the nodes of a forest, children before parents and each subtree without gaps;
// children and roots come in ascending order.
func postorder(parent []int32) (post []int32) {
	n := len(parent)
	head, next := make([]int32, n), make([]int32, n)
	for k := range head {
		head[k] = -1
	}
	for k := n - 1; k >= 0; k-- {
		if p := parent[k]; p >= 0 {
			next[k], head[p] = head[p], int32(k)
		}
	}
	post = make([]int32, 0, n)
	var stack []int32
	for root := range int32(n) {
		if parent[root] >= 0 {
			continue
		}
		stack = append(stack, root)
		for len(stack) > 0 {
			v := stack[len(stack)-1]
			if c := head[v]; c >= 0 {
				head[v] = next[c]
				stack = append(stack, c)
				continue
			}
			post = append(post, v)
			stack = stack[:len(stack)-1]
		}
	}
	return post
}

// columnCounts returns the number of entries of each column of L, the diagonal included, in
// nearly O(|A|) (J. R. Gilbert, E. G. Ng, B. W. Peyton, SIAM J. Matrix Anal. Appl. 15(4), 1994,
// pp. 1075–1091). Row i of L is the subtree of those k < i with a[i][k] ≠ 0 and of the paths from
// them to i; column counts are sums over subtrees of +1 at each leaf of a row's
// subtree and -1 where two of its branches meet.
func columnCounts(g *graph, perm, inverse, parent, post []int32) (count []int32) {
	n := len(perm)
	count = make([]int32, n)
	first := make([]int32, n)    // postorder number of the first descendant
	maxFirst := make([]int32, n) // largest first[] among the leaves that row i has seen
	prevLeaf := make([]int32, n) // the last of those leaves
	ancestor := make([]int32, n)
	for k := range first {
		first[k], maxFirst[k], prevLeaf[k], ancestor[k] = -1, -1, -1, int32(k)
	}
	for k, j := range post {
		if first[j] < 0 {
			count[j] = 1 // j is a leaf of the tree
		}
		for ; j >= 0 && first[j] < 0; j = parent[j] {
			first[j] = int32(k)
		}
	}
	for _, j := range post {
		if parent[j] >= 0 {
			count[parent[j]]-- // j itself is not in its parent's column
		}
		v := perm[j]
		for _, w := range g.neighbours(v) {
			i := inverse[w]
			if i <= j || first[j] <= maxFirst[i] {
				continue // not below the diagonal, or no leaf of row i's subtree
			}
			maxFirst[i] = first[j]
			previous := prevLeaf[i]
			prevLeaf[i] = j
			count[j]++
			if previous < 0 {
				continue
			}
			meet := previous
			for meet != ancestor[meet] {
				meet = ancestor[meet]
			}
			for s := previous; s != meet; {
				s, ancestor[s] = ancestor[s], meet
			}
			count[meet]--
		}
		if parent[j] >= 0 {
			ancestor[j] = parent[j]
		}
	}
	for _, j := range post {
		if q := parent[j]; q >= 0 {
			count[q] += count[j]
		}
	}
	return count
}
