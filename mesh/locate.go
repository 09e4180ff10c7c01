package mesh

import (
	"math"
	"slices"
)

// A Locator finds the point of a mesh that is nearest to a place in space. It holds
// a tree of boxes around the triangles that have an area. It may serve several
// goroutines at once.
type Locator struct {
	m     *Mesh
	faces []int32 // of tree item
	tree  *boxTree
}

// NewLocator builds the tree. O(n log n): 0.4 s for 1.3 million triangles. The mesh
// must have a triangle with an area.
func NewLocator(m *Mesh) *Locator {
	l := &Locator{m: m}
	t := m.Triangles
	for f := range int32(m.NumTriangles()) {
		if hasArea(m.Positions, t[3*f], t[3*f+1], t[3*f+2]) {
			l.faces = append(l.faces, f)
		}
	}
	l.faces = slices.Clip(l.faces)
	l.tree = newBoxTree(len(l.faces), func(i int32) (lo, hi [3]float64) {
		f := l.faces[i]
		lo, hi = emptyBox()
		for _, v := range t[3*f : 3*f+3] {
			for axis, x := range m.Positions[3*v : 3*v+3] {
				lo[axis], hi[axis] = min(lo[axis], x), max(hi[axis], x)
			}
		}
		return lo, hi
	})
	return l
}

// Nearest gives the point of the surface nearest to p and how far off p lies. The
// point is exact to rounding, also on slivers; of several equally near ones it is on the
// triangle of the least number. Weights at a vertex or on an edge are exactly 1 and
// 0, or 0. Some microseconds for a place near the surface. It panics if p is not finite
// or no triangle of the mesh has an area.
func (l *Locator) Nearest(p [3]float64) (at Point, gap float64) {
	if len(l.faces) == 0 {
		panic("mesh: Nearest: no triangle of the mesh has an area")
	}
	asked := p
	for axis, x := range p {
		if x-x != 0 {
			panic("mesh: Nearest: the place is not finite")
		}
		p[axis] = max(-farAway, min(farAway, x))
	}
	type visit struct {
		node, from, to int32
		gap2           float64
	}
	var room [64]visit // twice the depth of a tree of 2^31 items
	stack := append(room[:0], visit{0, 0, int32(len(l.faces)), l.tree.gap2(0, &p)})
	best := math.Inf(1)
	at.Triangle = -1
	for len(stack) > 0 {
		v := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		if v.gap2 > best {
			continue
		}
		if v.to-v.from <= leafItems {
			for _, i := range l.tree.items[v.from:v.to] {
				f := l.faces[i]
				w, d2 := l.m.nearestOn(f, p)
				if d2 < best || d2 == best && f < at.Triangle {
					best, at = d2, Point{Triangle: f, Weights: w}
				}
			}
			continue
		}
		mid := int32((int(v.from) + int(v.to)) / 2)
		near := visit{2*v.node + 1, v.from, mid, l.tree.gap2(int(2*v.node+1), &p)}
		far := visit{2*v.node + 2, mid, v.to, l.tree.gap2(int(2*v.node+2), &p)}
		if far.gap2 < near.gap2 {
			near, far = far, near
		}
		stack = append(stack, far, near)
	}
	if p != asked { // farther than can be squared
		d := minus3(asked, l.m.Position(at))
		return at, math.Hypot(math.Hypot(d[0], d[1]), d[2])
	}
	return at, math.Sqrt(best)
}

// farAway is as far as distances can be squared; parts are smaller (RangeError).
const farAway = 1e150

// nearestOn gives the weights of the point of triangle f nearest to p, and the
// distance squared. The triangle is measured from its longest edge, along it and
// across: unlike a ratio of areas, that stays exact however flat the triangle is.
func (m *Mesh) nearestOn(f int32, p [3]float64) (w [3]float64, d2 float64) {
	t, x := m.Triangles[3*f:3*f+3], m.Positions
	corners := [3][3]float64{point3(x, t[0]), point3(x, t[1]), point3(x, t[2])}
	k, longest := 0, 0.0
	for i := range corners {
		e := minus3(corners[(i+1)%3], corners[i])
		if l := dot3(e, e); l > longest {
			k, longest = i, l
		}
	}
	i, j := (k+1)%3, (k+2)%3
	a, b, c := corners[k], corners[i], corners[j]
	ab, ac, ap := minus3(b, a), minus3(c, a), minus3(p, a)
	along, s := dot3(ac, ab)/longest, dot3(ap, ab)/longest
	var up, q [3]float64 // c's height over a-b, and p seen from its foot on a-b
	for axis := range up {
		up[axis] = ac[axis] - along*ab[axis]
		q[axis] = ap[axis] - s*ab[axis]
	}
	if height2 := dot3(up, up); height2 > 0 {
		wc := dot3(q, up) / height2
		wb := s - wc*along
		if wa := 1 - wb - wc; wa > 0 && wb > 0 && wc > 0 {
			var r [3]float64
			for axis := range r {
				r[axis] = q[axis] - wc*up[axis]
			}
			w[k], w[i], w[j] = wa, wb, wc
			return w, dot3(r, r)
		}
	}
	d2 = math.Inf(1)
	for i := range corners {
		j := (i + 1) % 3
		// From the smaller vertex, so that both faces of an edge get the same numbers.
		u, v := i, j
		if t[u] > t[v] {
			u, v = v, u
		}
		e, up := minus3(corners[v], corners[u]), minus3(p, corners[u])
		s, e2 := dot3(up, e), dot3(e, e)
		var r [3]float64
		var weights [3]float64
		switch {
		case s <= 0 || e2 == 0:
			weights[u], r = 1, up
		case s >= e2:
			weights[v], r = 1, minus3(p, corners[v])
		default:
			s /= e2
			weights[u], weights[v] = 1-s, s
			for axis := range r {
				r[axis] = up[axis] - s*e[axis]
			}
		}
		if g := dot3(r, r); g < d2 {
			d2, w = g, weights
		}
	}
	return w, d2
}

// Triangles is the number of triangles that a Locator looks at: those with an area.
func (l *Locator) Triangles() int { return len(l.faces) }
