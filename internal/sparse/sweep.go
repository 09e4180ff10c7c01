package sparse

import "sync/atomic"

// vectors is what one solve works with, for a number of right sides at once: 1, 8 or 16.
type vectors struct {
	width int
	x     []float64 // in the order of elimination; eight right sides in a row, all rows, then the next eight
	slab  []float64 // what roots of subtrees and fronts of the top hand to their parents
	lanes []solveLane
	waits []atomic.Int32
}

// solveLane is what one goroutine works with in a solve.
type solveLane struct {
	t     []float64    // the rows of one front
	stack [2][]float64 // what fronts hand to their parents
	fill  [2]int
}

func (a *Analysis) getVectors(width int) *vectors {
	if v, ok := a.vectors[width/8].Get().(*vectors); ok {
		return v
	}
	pl := a.plan
	v := &vectors{width: width, x: make([]float64, width*len(a.perm)), slab: make([]float64, int64(width)*pl.vectorSlab),
		lanes: make([]solveLane, pl.workers), waits: make([]atomic.Int32, len(a.nodes))}
	longest := 0
	for s := range a.nodes {
		longest = max(longest, int(a.nodes[s].m))
	}
	for i := range v.lanes {
		v.lanes[i].t = make([]float64, width*((longest+7)/8*8))
		for d := range 2 {
			v.lanes[i].stack[d] = make([]float64, int64(width)*pl.vectorStack[d])
		}
	}
	return v
}

func (a *Analysis) putVectors(v *vectors) { a.vectors[v.width/8].Put(v) }

// upwards visits all supernodes, children before parents: subtrees by whoever is free, and a front of the top
// by the one who finished the last of its children.
func (a *Analysis) upwards(v *vectors, visit func(ln *solveLane, s int32)) {
	pl := a.plan
	for _, s := range pl.top {
		v.waits[s].Store(pl.waits[s])
	}
	inParallel(pl.workers, len(pl.subtrees), func(worker, i int) {
		ln := &v.lanes[worker]
		ln.fill = [2]int{}
		root := pl.subtrees[i]
		for s := a.nodes[root].lo; s <= root; s++ {
			visit(ln, s)
		}
		for s := a.nodes[root].parent; s >= 0 && v.waits[s].Add(-1) == 0; s = a.nodes[s].parent {
			visit(ln, s)
		}
	})
}

// downwards visits all supernodes, parents before children.
func (a *Analysis) downwards(v *vectors, visit func(ln *solveLane, s int32)) {
	pl := a.plan
	if len(pl.top) == 0 {
		inParallel(pl.workers, len(pl.subtrees), func(worker, i int) {
			a.descend(&v.lanes[worker], pl.subtrees[i], visit)
		})
		return
	}
	tasks := len(pl.top) + len(pl.subtrees)
	ready := make(chan int32, tasks)
	for _, s := range pl.top {
		if a.nodes[s].parent < 0 {
			ready <- s
		}
	}
	for _, s := range pl.subtrees {
		if a.nodes[s].parent < 0 {
			ready <- s
		}
	}
	var left atomic.Int64
	left.Store(int64(tasks))
	inParallel(pl.workers, pl.workers, func(_, i int) {
		ln := &v.lanes[i]
		for s := range ready {
			if pl.isTop[s] {
				visit(ln, s)
				for c := s - 1; c >= a.nodes[s].lo; c = a.nodes[c].lo - 1 {
					ready <- c
				}
			} else {
				a.descend(ln, s, visit)
			}
			if left.Add(-1) == 0 {
				close(ready)
			}
		}
	})
}

func (a *Analysis) descend(ln *solveLane, root int32, visit func(ln *solveLane, s int32)) {
	for s := root; s >= a.nodes[root].lo; s-- {
		visit(ln, s)
	}
}

// take calls add for what each child of s hands up, last child first, and removes it from the
// lane's stack; then it returns where s puts what it hands up itself.
func (a *Analysis) take(v *vectors, ln *solveLane, s int32, add func(relative []int32, from []float64)) (out []float64) {
	pl, node := a.plan, &a.nodes[s]
	d := pl.depth[s]
	for c := s - 1; c >= node.lo; c = a.nodes[c].lo - 1 {
		child := &a.nodes[c]
		r := int(child.m - child.w)
		size := v.width * r
		relative := a.relative[child.rows : child.rows+int64(r)]
		if slot := pl.vectorSlot[c]; slot >= 0 {
			at := int64(v.width) * slot
			add(relative, v.slab[at:at+int64(size)])
			continue
		}
		ln.fill[1-d] -= size
		add(relative, ln.stack[1-d][ln.fill[1-d]:][:size])
	}
	size := v.width * int(node.m-node.w)
	if slot := pl.vectorSlot[s]; slot >= 0 {
		return v.slab[int64(v.width)*slot:][:size]
	}
	ln.fill[d] += size
	return ln.stack[d][ln.fill[d]-size:][:size]
}
