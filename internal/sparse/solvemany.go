package sparse

import "heatskin/internal/dense"

// SolveManyTo is SolveTo for k right sides: dst and b are n × k, column-major. Sixteen at a time
// read the factor once; digits may differ in the last place from those of SolveTo.
func (f *Factor) SolveManyTo(dst, b []float64, k int) {
	f.checkSolve(dst, b, k)
	n := len(f.a.perm)
	for k > 0 {
		if k == 1 {
			f.SolveTo(dst, b)
			return
		}
		width := 16
		if k <= 8 {
			width = 8
		}
		some := min(k, width)
		v := f.a.getVectors(width)
		var scaling [2][8]int
		for g := range width / 8 {
			scaling[g] = f.load(v.x[8*g*n:8*(g+1)*n], b[8*g*n:min(8*(g+1), some)*n], 8)
		}
		f.a.upwards(v, func(ln *solveLane, s int32) { f.forwardMany(v, ln, s) })
		f.a.downwards(v, func(ln *solveLane, s int32) { f.backwardMany(v, ln, s) })
		for g := range width / 8 {
			f.store(dst[8*g*n:min(8*(g+1), some)*n], v.x[8*g*n:8*(g+1)*n], 8, scaling[g])
		}
		f.a.putVectors(v)
		dst, b, k = dst[some*n:], b[some*n:], k-some
	}
}

// In a front, the values of eight right sides lie in a row, all rows of the front below each
// other, and then the next eight right sides. So eight rows of a panel's width are a block, transposed: its rows
// are the right sides.

// forwardMany is forward for v.width right sides.
func (f *Factor) forwardMany(v *vectors, ln *solveLane, s int32) {
	a := f.a
	n := len(a.perm)
	node := &a.nodes[s]
	w, m := int(node.w), int(node.m)
	groups := v.width / 8
	fr := front{w: w, m: m, blocks: (m + 7) / 8, l: f.values[node.values:]}
	step := 64 * fr.blocks // from a group of right sides to the next
	t := ln.t[:groups*step]
	for c := range groups {
		tc := t[c*step : (c+1)*step]
		clear(tc[copy(tc, v.x[8*(c*n+int(node.first)):][:8*w]):])
	}
	out := a.take(v, ln, s, func(relative []int32, from []float64) {
		for c := range groups {
			tc, fc := t[c*step:(c+1)*step], from[8*c*len(relative):][:8*len(relative)]
			for i, r := range relative {
				to, add := (*[8]float64)(tc[8*r:]), (*[8]float64)(fc[8*i:])
				for k := range to {
					to[k] += add[k]
				}
			}
		}
	})
	u := dense.Product{Blocks: groups, CStep: step, AStep: step, BCol: 1, BRow: 8}
	whole, narrow := w/8, w%8
	for g := range fr.blocks {
		// Subtract from the rows of block g all whole panels to its left, then the narrow one.
		if left := min(g, whole); left > 0 {
			u.C, u.Cols = t[64*g:], 8
			u.A, u.AHop, u.AShrink = t, 64, 0
			u.B, u.BHop, u.BShrink = fr.l[64*g:], 64*(fr.blocks-1), 64
			u.Panels, u.Width = left, 8
			u.Subtract()
		}
		if narrow > 0 && g > whole {
			start, _ := fr.factorPanel(whole)
			u.C, u.Cols = t[64*g:], 8
			u.A, u.B = t[64*whole:], fr.l[start+(g-whole)*8*narrow:]
			u.Panels, u.Width = 1, narrow
			u.Subtract()
		}
		if g < whole || g == whole && narrow > 0 {
			start, cols := fr.factorPanel(g)
			for c := range groups {
				dense.SolveRight(t[c*step+64*g:], fr.l[start:], 1, cols)
			}
			if cols < 8 { // the block's other rows are rows below
				u.C, u.Cols = t[64*g+8*cols:], 8-cols
				u.A, u.B = t[64*g:], fr.l[start+cols:]
				u.Panels, u.Width = 1, cols
				u.Subtract()
			}
		}
	}
	for c := range groups {
		copy(v.x[8*(c*n+int(node.first)):][:8*w], t[c*step:])
		copy(out[8*c*(m-w):][:8*(m-w)], t[c*step+8*w:])
	}
}

// backwardMany is backward for v.width right sides.
func (f *Factor) backwardMany(v *vectors, ln *solveLane, s int32) {
	a := f.a
	n := len(a.perm)
	node := &a.nodes[s]
	w, m := int(node.w), int(node.m)
	groups := v.width / 8
	fr := front{w: w, m: m, blocks: (m + 7) / 8, l: f.values[node.values:]}
	step := 64 * fr.blocks
	t := ln.t[:groups*step]
	for c := range groups {
		tc := t[c*step : (c+1)*step]
		copy(tc, v.x[8*(c*n+int(node.first)):][:8*w])
		x := v.x[8*c*n : 8*(c+1)*n]
		for i, r := range a.below(s) {
			*(*[8]float64)(tc[8*(w+i):]) = *(*[8]float64)(x[8*r:])
		}
		clear(tc[8*m:])
	}
	u := dense.Product{Blocks: groups, CStep: step, AStep: step, BCol: 8, BRow: 1}
	for p := (w - 1) / 8; p >= 0; p-- {
		start, cols := fr.factorPanel(p)
		u.C, u.Cols = t[64*p:], cols
		if p+1 < fr.blocks {
			u.A, u.AHop = t[64*(p+1):], 64
			u.B, u.BHop = fr.l[start+8*cols:], 8*cols
			u.Panels, u.Width = fr.blocks-p-1, 8
			u.Subtract()
		}
		if cols < 8 {
			u.A, u.B = t[64*p+8*cols:], fr.l[start+cols:]
			u.Panels, u.Width = 1, 8-cols
			u.Subtract()
		}
		for c := range groups {
			dense.SolveRightTrans(t[c*step+64*p:], fr.l[start:], cols)
		}
	}
	for c := range groups {
		copy(v.x[8*(c*n+int(node.first)):][:8*w], t[c*step:])
	}
}
