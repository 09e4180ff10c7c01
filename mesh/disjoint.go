package mesh

// disjoint holds disjoint sets of numbers; each set's root is its least member, so
// that a result does not depend on the order of unions.
type disjoint []int32

func newDisjoint(n int) disjoint {
	d := make(disjoint, n)
	for i := range d {
		d[i] = int32(i)
	}
	return d
}

// find is the least member of i's set. Afterwards d[i] is that member.
func (d disjoint) find(i int32) int32 {
	root := i
	for d[root] != root {
		root = d[root]
	}
	for d[i] != root {
		i, d[i] = d[i], root
	}
	return root
}

func (d disjoint) union(i, j int32) {
	i, j = d.find(i), d.find(j)
	if i < j {
		d[j] = i
	} else {
		d[i] = j
	}
}
