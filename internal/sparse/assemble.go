package sparse

import "sort"

// assemble fills panels [p0, p1) of the front of supernode s: zeros, the entries of the matrix,
// then the children's update matrices, last child first.
func (f *Factor) assemble(fr *front, s int32, ln *lane, p0, p1 int) {
	a := f.a
	node := &a.nodes[s]
	factorPanels := (fr.w + 7) / 8
	if p0 < factorPanels {
		from, _ := fr.factorPanel(p0)
		to := len(fr.l) - slack
		if p1 < factorPanels {
			to, _ = fr.factorPanel(p1)
		}
		clear(fr.l[from:to])
		f.scatter(fr, node, ln.place, 8*p0, min(8*p1, fr.w))
	}
	if q := max(p0, fr.w/8); q < p1 && fr.w < fr.m {
		from, _ := fr.updatePanel(q)
		to := len(fr.u)
		if p1 < fr.blocks {
			to, _ = fr.updatePanel(p1)
		}
		clear(fr.u[from:to])
	}
	d := a.plan.depth[s]
	bottom := ln.fill[1-d]
	for c := s - 1; c >= node.lo; c = a.nodes[c].lo - 1 {
		child := &a.nodes[c]
		w, m := int64(child.w), int64(child.m)
		if w == m {
			continue
		}
		size := updateSize(w, m)
		var u []float64
		if slot := a.plan.slot[c]; slot >= 0 {
			u = f.work.slab[slot : slot+size]
		} else {
			bottom -= size
			u = ln.stack[1-d][bottom : bottom+size]
		}
		fr.add(child, u, a.relative[child.rows:child.rows+m-w], 8*p0, 8*p1)
	}
}

// scatter adds the entries of the matrix in columns [c0, c1) of the front; place[i] is where row i, below the
// columns, comes in it.
func (f *Factor) scatter(fr *front, node *supernode, place []int32, c0, c1 int) {
	a, off, held := f.a, f.matrix.Off, f.heldInOrder
	end := node.first + node.w
	for c := c0; c < c1; c++ {
		k := node.first + int32(c)
		array, base, step := fr.column(c)
		column := array[base+c/8*step:] // from the block on the diagonal
		step8, block := int32(step), int32(c/8)
		if held != nil && held[k] {
			column[c%8] = 1
			continue
		}
		scale := f.scale[k]
		column[c%8] = f.matrix.Diag[a.perm[k]] * scale * scale
		from := a.lower.from[a.lower.ptr[k]:a.lower.ptr[k+1]]
		for q, i := range a.lower.row[a.lower.ptr[k]:a.lower.ptr[k+1]] {
			if held != nil && held[i] {
				continue
			}
			r := i - node.first
			if i >= end {
				r = place[i]
			}
			column[(r>>3-block)*step8+r&7] += off[from[q]] * scale * f.scale[i]
		}
	}
}

// add adds the child's update matrix u to the columns [c0, c1) of the front; relative[i] is the
// place in the front of row w+i of the child.
func (fr *front) add(child *supernode, u []float64, relative []int32, c0, c1 int) {
	src := front{w: int(child.w), m: int(child.m), blocks: int(child.m+7) / 8, u: u}
	j0 := sort.Search(len(relative), func(i int) bool { return int(relative[i]) >= c0 })
	for j := j0; j < len(relative) && int(relative[j]) < c1; j++ {
		to, toBase, toStep := fr.column(int(relative[j]))
		_, base, step := src.column(src.w + j)
		i := j
		for i < len(relative) {
			row := src.w + i
			n := min(8-row%8, len(relative)-i)
			from := u[base+row/8*step+row%8:][:n]
			for t, r := range relative[i : i+n] {
				to[toBase+int(r>>3)*toStep+int(r&7)] += from[t]
			}
			i += n
		}
	}
}
