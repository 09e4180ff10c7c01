package mesh

import (
	"cmp"
	"context"
	"math"
	"slices"
)

// Refine gives a mesh of the same surface whose edges are at most maxEdge long. Vertices
// of m keep their numbers, and new ones follow; boundary and crease edges are
// divided where they run. Faces are not tracked: where faces lie in one plane they
// are cut anew, so that slivers do not beget slivers. If no edge is too long the
// result is m itself.
//
// Edges are divided longest first at the division nearest their middle (the part's
// longest edges are bisected as M.-C. Rivara does, Int. J. Numer. Methods Eng. 20,
// 1984), in all their faces at once, and after each step edges between coplanar
// faces are flipped until they are Delaunay (C. L. Lawson, 1977). A flip moves the
// surface by no more than a hundred-thousandth of its faces' heights: lengths change by
// less than 1e-10. O(n log n).
//
// A mesh with a metric is cut to edges of that length by the metric, which the result
// has too, and nothing is flipped: each face lies in the one it was cut from.
//
// At most budget vertices are added; the error is a *BudgetError if that does not do
// (Needed is an estimate, on coarse meshes up to twice too large), or ctx.Err(). Refine panics if maxEdge is not positive and finite.
func Refine(ctx context.Context, m *Mesh, maxEdge float64, budget int) (*Mesh, error) {
	if !(maxEdge > 0 && maxEdge <= math.MaxFloat64) {
		panic("mesh: Refine: the longest edge must be positive and finite")
	}
	// Halfedges must fit int32, and a new vertex brings six of them on a smooth surface.
	budget = max(0, min(budget, (math.MaxInt32-len(m.Triangles))/8))
	r := &refiner{x: m.Positions, t: m.Triangles, metric: m.Metric, limit: maxEdge, most: m.NumVertices() + budget}
	r.glued = glue(m.Triangles, m.NumVertices())
	long := r.longEdges()
	if len(long) == 0 {
		return m, nil
	}
	r.x, r.t = slices.Clone(m.Positions), slices.Clone(m.Triangles)
	if m.Metric != nil {
		r.metric = m.Metric.clone()
	}
	r.back = make([]int32, len(r.glued))
	for h, o := range r.glued {
		r.back[o] = int32(h)
	}
	if r.metric == nil {
		r.flipBefore(long)
	}
	needed := r.estimate()
	if needed > 2.5*float64(budget)+100 { // no use in trying
		return nil, &BudgetError{MaxEdge: maxEdge, Budget: budget, Needed: int(min(needed, math.MaxInt32))}
	}
	more := int(min(needed*1.1, float64(budget))) // two faces a vertex: nothing is copied on the way
	r.x, r.t = slices.Grow(r.x, 3*more), slices.Grow(r.t, 6*more)
	r.glued, r.back = slices.Grow(r.glued, 6*more), slices.Grow(r.back, 6*more)
	for h := range int32(len(r.t)) {
		r.enqueue(h)
	}
	for count := 0; ; count++ {
		h, ok := r.dequeue()
		if !ok {
			break
		}
		if len(r.x)/3 >= r.most {
			return nil, &BudgetError{MaxEdge: maxEdge, Budget: budget, Needed: max(budget+1, int(needed))}
		}
		r.divide(h)
		if count%4096 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
	}
	return &Mesh{Positions: r.x, Triangles: r.t, File: m.File, Metric: r.metric}, ctx.Err()
}

// refiner is a mesh while it is cut. Edges are cycles of halfedges, linked both ways.
type refiner struct {
	x           []float64
	t           []int32
	glued, back []int32
	metric      *Metric // nil: that of space
	limit       float64
	most        int
	queue       [][]longEdge // by length, see enqueue
	longest     int          // no longer queue has entries
	work        []int32      // halfedges whose edges may need a flip
	fan         []int32
	spokes      []spoke
}

// longEdge is an edge that was too long; it may have been flipped away since.
type longEdge struct{ h, a, b int32 }

// length is that of the edge of h, the greatest if its faces do not agree.
func (r *refiner) length(h int32) float64 {
	a, b := r.t[h], r.t[next(h)]
	if r.metric == nil {
		return dist(r.x, a, b)
	}
	longest := r.metric.length(r.x, h/3, a, b)
	for g := r.glued[h]; g != h; g = r.glued[g] {
		longest = max(longest, r.metric.length(r.x, g/3, a, b))
	}
	return longest
}

func (r *refiner) collapsed(h int32) bool {
	a, b, c := r.t[h], r.t[next(h)], r.t[prev(h)]
	return a == b || b == c || c == a
}

// longEdges lists the halfedges of faces that have an edge to be divided.
func (r *refiner) longEdges() (long []int32) {
	for f := int32(0); f < int32(len(r.t)); f += 3 {
		if !r.collapsed(f) && r.parts(max(r.length(f), r.length(f+1), r.length(f+2))) > 1 {
			long = append(long, f, f+1, f+2)
		}
	}
	return long
}

// enqueue notes the edge of h if it is too long, once per edge at least. Lengths
// within a quarter octave count as equal, which spares a heap.
func (r *refiner) enqueue(h int32) {
	if r.collapsed(h) || r.glued[h] < h && r.glued[r.glued[h]] == h {
		return
	}
	length := r.length(h)
	if r.parts(length) < 2 {
		return
	}
	k := max(0, int(4*(math.Log2(length)-math.Log2(r.limit))))
	for len(r.queue) <= k {
		r.queue = append(r.queue, nil)
	}
	r.queue[k] = append(r.queue[k], longEdge{h, r.t[h], r.t[next(h)]})
	r.longest = max(r.longest, k)
}

func (r *refiner) dequeue() (h int32, ok bool) {
	for r.longest >= 0 && len(r.queue) > 0 {
		q := r.queue[r.longest]
		if len(q) == 0 {
			r.longest--
			continue
		}
		e := q[len(q)-1]
		r.queue[r.longest] = q[:len(q)-1]
		u, v := r.t[e.h], r.t[next(e.h)]
		if u == e.a && v == e.b || u == e.b && v == e.a {
			return e.h, true
		}
	}
	r.longest = 0
	return 0, false
}

// parts is into how many parts an edge is to be divided in the end.
func (r *refiner) parts(length float64) float64 { return math.Ceil(length / r.limit * (1 - 1e-12)) }

// divide puts a vertex on the edge of h and cuts all its faces there.
func (r *refiner) divide(h int32) {
	a, b := r.t[h], r.t[next(h)]
	if a > b {
		a, b = b, a // the same division whichever face asks
	}
	n := r.parts(r.length(h))
	s := math.Floor(n/2) / n
	middle := int32(len(r.x) / 3)
	for axis := range int32(3) {
		p, q := r.x[3*a+axis], r.x[3*b+axis]
		r.x = append(r.x, p+s*(q-p))
	}
	if dist(r.x, a, middle) == 0 || dist(r.x, middle, b) == 0 { // shorter than the coordinates can tell
		r.x = r.x[:3*middle]
		return
	}
	if r.metric != nil {
		r.metric.divide(a, b, s)
	}
	// Face (u, v, c) becomes (u, m, c) under its own number and (m, v, c) under a new one.
	var first, second int32 = -1, -1 // last halfedge linked between a and m, and between m and b
	r.work, r.spokes = r.work[:0], r.spokes[:0]
	for e := h; ; {
		following := r.glued[e]
		u, v, c := r.t[e], r.t[next(e)], r.t[prev(e)]
		r.t[next(e)] = middle
		g := int32(len(r.t))
		r.t = append(r.t, middle, v, c)
		if r.metric != nil {
			r.metric.inherit(e / 3)
		}
		r.glued = append(r.glued, g, g+1, g+2)
		r.back = append(r.back, g, g+1, g+2)
		r.replace(next(e), g+1)
		r.link(next(e), g+2)
		r.glued[e], r.back[e] = e, e
		ofA, ofB := e, g
		if u != a {
			ofA, ofB = g, e
		}
		first, second = r.join(first, ofA), r.join(second, ofB)
		r.work = append(r.work, prev(e), g+1)
		r.spokes = append(r.spokes, spoke{c, g + 2})
		r.enqueueEdge(g + 1) // it goes by another name now
		r.enqueueEdge(g + 2)
		if e = following; e == h {
			break
		}
	}
	r.enqueueEdge(first)
	r.enqueueEdge(second)
	r.joinSpokes()
	if r.metric == nil {
		r.flipAround(middle)
	}
}

// spoke is a new edge from a dividing vertex to the corner opposite, by one halfedge.
type spoke struct{ corner, h int32 }

// joinSpokes makes one edge of those that lead to the same corner: a face written
// twice goes on being the same face twice.
func (r *refiner) joinSpokes() {
	if n := len(r.spokes); n > 2 {
		slices.SortFunc(r.spokes, func(a, b spoke) int { return cmp.Or(cmp.Compare(a.corner, b.corner), cmp.Compare(a.h, b.h)) })
	}
	for i := 1; i < len(r.spokes); i++ {
		if a, b := r.spokes[i-1], r.spokes[i]; a.corner == b.corner {
			m, n := r.glued[a.h], r.glued[b.h]
			r.glued[a.h], r.back[n] = n, a.h
			r.glued[b.h], r.back[m] = m, b.h
		}
	}
}

// join adds lone halfedge h to the edge that last belongs to, if any.
func (r *refiner) join(last, h int32) int32 {
	if last >= 0 {
		n := r.glued[last]
		r.glued[last], r.back[h] = h, last
		r.glued[h], r.back[n] = n, h
	}
	return h
}

// link makes an edge of two halfedges.
func (r *refiner) link(h, o int32) {
	r.glued[h], r.back[h] = o, o
	r.glued[o], r.back[o] = h, h
}

// replace puts h in old's place around its edge, and leaves old alone.
func (r *refiner) replace(old, h int32) {
	n, p := r.glued[old], r.back[old]
	if n == old {
		r.glued[h], r.back[h] = h, h
		return
	}
	r.glued[p], r.back[h] = h, p
	r.glued[h], r.back[n] = n, h
	r.glued[old], r.back[old] = old, old
}

// enqueueEdge enqueues the edge whichever of its halfedges h is.
func (r *refiner) enqueueEdge(h int32) {
	r.enqueue(min(h, r.glued[h]))
}

// flipAround makes the edges in work Delaunay again. All of them lie opposite the new
// vertex, as do those that flips put in their place.
func (r *refiner) flipAround(middle int32) {
	for len(r.work) > 0 {
		h := r.work[len(r.work)-1]
		r.work = r.work[:len(r.work)-1]
		o := r.glued[h]
		if o == h || r.glued[o] != h || !r.flippable(h, o) || r.reaches(h/3, middle, r.t[prev(o)]) {
			continue
		}
		r.flip(h, o)
		r.work = append(r.work, h, next(o))
		r.enqueueEdge(prev(h))
		r.enqueueEdge(h) // these go by another name now
		r.enqueueEdge(o)
	}
}

// reaches tells whether vertices middle and x are joined already: sheets that lie on
// each other must not come to share an edge. It goes through the faces around middle,
// starting from face f.
func (r *refiner) reaches(f, middle, x int32) bool {
	const many = 64 // then rather leave the edge as it is
	r.fan = append(r.fan[:0], f)
	for i := 0; i < len(r.fan); i++ {
		for h := 3 * r.fan[i]; h < 3*r.fan[i]+3; h++ {
			u, v := r.t[h], r.t[next(h)]
			if u != middle && v != middle {
				continue
			}
			if u == x || v == x {
				return true
			}
			for o := r.glued[h]; o != h; o = r.glued[o] {
				known := false
				for _, g := range r.fan {
					known = known || g == o/3
				}
				if !known {
					if len(r.fan) == many {
						return true
					}
					r.fan = append(r.fan, o/3)
				}
			}
		}
	}
	return false
}

// flatness is how far apart the diagonals of two faces may pass, relative to the
// least height over them, if the faces count as one plane: a path's length then
// changes by half the square of it.
const flatness = 1e-5

// flippable tells whether the edge of h and o, which has these two faces only, may be
// flipped without moving the surface, and is not Delaunay.
func (r *refiner) flippable(h, o int32) bool {
	t := r.t
	a, b, c, d := t[h], t[next(h)], t[prev(h)], t[prev(o)]
	if t[o] != b || c == d { // turned against each other, or one face twice
		return false
	}
	u, v, w, x := point3(r.x, a), point3(r.x, b), point3(r.x, c), point3(r.x, d)
	e, f := minus3(v, u), minus3(x, w)
	uw, vw, ux, vx := minus3(w, u), minus3(w, v), minus3(x, u), minus3(x, v)
	n, o2 := cross3(e, uw), cross3(ux, e) // twice the areas, both towards the same side if flat
	areaW, areaX := length3(n), length3(o2)
	cosW, cosX := dot3(uw, vw), dot3(ux, vx) // each times the same lengths as its area
	if !(areaW*cosX+areaX*cosW < -1e-9*(areaW*math.Abs(cosX)+areaX*math.Abs(cosW))) {
		return false
	}
	if dot3(n, o2) <= 0 {
		return false
	}
	p, q := cross3(vx, f), cross3(f, ux) // the faces after the flip: (x, v, w) and (w, u, x)
	if dot3(p, n) <= 0 || dot3(q, n) <= 0 {
		return false
	}
	across := length3(cross3(e, f))
	apart := math.Abs(dot3(e, cross3(uw, ux)))
	heights := min(min(areaW, areaX)/length3(e), min(length3(p), length3(q))/length3(f))
	return apart <= flatness*heights*across
}

// flip turns the edge u-v of faces (u, v, w) and (v, u, x) to w-x: they become
// (x, v, w) and (w, u, x). prev(h) and prev(o) are then its halfedges.
func (r *refiner) flip(h, o int32) {
	hp, op := prev(h), prev(o)
	w, x := r.t[hp], r.t[op]
	r.t[h], r.t[o] = x, w
	r.replace(op, h)
	r.replace(hp, o)
	r.link(hp, op)
}

// flipBefore makes the surface Delaunay, within its planes, around faces that are to
// be divided.
func (r *refiner) flipBefore(long []int32) {
	free := r.freePairs()
	r.work = append(r.work[:0], long...)
	for most := 20 * len(r.t); len(r.work) > 0 && most > 0; most-- { // Lawson's flips end; rounding might not
		h := r.work[len(r.work)-1]
		r.work = r.work[:len(r.work)-1]
		o := r.glued[h]
		if o == h || r.glued[o] != h || !r.flippable(h, o) || !free(r.t[prev(h)], r.t[prev(o)]) {
			continue
		}
		r.flip(h, o)
		r.work = append(r.work, h, next(h), o, next(o))
	}
	r.work = r.work[:0]
}

// freePairs gives a function that tells whether no edge joins two vertices, and takes
// it that one does from then on. (Sheets that lie on each other must not come to share an edge.)
func (r *refiner) freePairs() func(a, b int32) bool {
	n := len(r.x) / 3
	start := make([]int32, n+1)
	each := func(do func(lo, hi int32)) {
		for h, o := range r.glued {
			if h := int32(h); o >= h { // most edges once
				a, b := r.t[h], r.t[next(h)]
				do(min(a, b), max(a, b))
			}
		}
	}
	each(func(lo, _ int32) { start[lo+1]++ })
	for v := range n {
		start[v+1] += start[v]
	}
	ends := make([]int32, start[n])
	fill := slices.Clone(start[:n])
	each(func(lo, hi int32) {
		ends[fill[lo]] = hi
		fill[lo]++
	})
	for v := range n {
		slices.Sort(ends[start[v]:start[v+1]])
	}
	added := map[[2]int32]bool{}
	return func(a, b int32) bool {
		a, b = min(a, b), max(a, b)
		if _, found := slices.BinarySearch(ends[start[a]:start[a+1]], b); found || added[[2]int32{a, b}] {
			return false
		}
		added[[2]int32{a, b}] = true
		return true
	}
}

// estimate is about how many vertices have to be added: those on edges, and as many
// inside a face as fit between them.
func (r *refiner) estimate() (needed float64) {
	for f := int32(0); f < int32(len(r.t)); f += 3 {
		if r.collapsed(f) {
			continue
		}
		onEdges := 0.0
		for h := f; h < f+3; h++ {
			n := r.parts(r.length(h)) - 1
			onEdges += n
			if r.glued[h] <= h { // the last around its edge, or alone
				needed += n
			}
		}
		if onEdges > 0 {
			u, v, w := point3(r.x, r.t[f]), point3(r.x, r.t[f+1]), point3(r.x, r.t[f+2])
			area := length3(cross3(minus3(v, u), minus3(w, u))) / 2
			if r.metric != nil {
				area = triangleArea(r.length(f), r.length(f+1), r.length(f+2))
			}
			needed += max(0, area/(areaShare*r.limit*r.limit)-onEdges/2-0.5)
		}
	}
	return needed
}

// areaShare is the area per vertex of a refined plane, in squares of the longest
// edge, as measured (TestRefineBudget holds it to that).
const areaShare = 0.45
