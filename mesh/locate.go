package mesh

import (
	"math"
	"sync"
	"sync/atomic"
)

// A Locator finds the point of a mesh that is nearest to a place in space. The first
// few places are looked up by going through all triangles, which takes less time than
// building the tree of boxes that serves many. It may serve several goroutines at once.
type Locator struct {
	m     *Mesh
	faces []int32 // the triangles with an area
	slack float64 // what rounding may add to a distance
	asked atomic.Int32
	build sync.Once
	tree  *boxTree
}

// scans is how many places are looked up without the tree: building it takes as long
// as 50 scans (BenchmarkNewLocator, BenchmarkScan; 1.3 million triangles).
const scans = 32

// NewLocator prepares for m, which must have a triangle with an area. O(n); the tree,
// once it is needed, O(n log n).
func NewLocator(m *Mesh) *Locator {
	l := &Locator{m: m, faces: make([]int32, 0, m.NumTriangles())}
	t := m.Triangles
	for f := range int32(m.NumTriangles()) {
		if hasArea(m.Positions, t[3*f], t[3*f+1], t[3*f+2]) {
			l.faces = append(l.faces, f)
		}
	}
	largest := 0.0
	for _, x := range m.Positions {
		largest = max(largest, math.Abs(x))
	}
	l.slack = 16 * 0x1p-52 * largest
	return l
}

// Triangles is the number of triangles that the Locator looks at: those with an area.
func (l *Locator) Triangles() int { return len(l.faces) }

// Nearest gives the point of the surface nearest to p and how far off p lies. The
// point is exact to rounding, also on slivers; of several equally near ones it is on the
// triangle of the least number. Weights at a vertex or on an edge are exactly 1 and
// 0, or 0. Some microseconds for a place near the surface, once there have been a few.
// It panics if p is not finite or no triangle of the mesh has an area.
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
	s := search{m: l.m, p: p, slack: l.slack, best: math.Inf(1), limit: math.Inf(1)}
	if l.asked.Load() < scans {
		l.asked.Add(1)
		s.scan(l.faces)
	} else {
		l.build.Do(func() {
			l.tree = newBoxTree(len(l.faces), func(i int32) (lo, hi [3]float64) { return l.m.bounds(l.faces[i]) })
		})
		s.descend(l.tree, l.faces)
	}
	if p != asked { // farther than can be squared
		d := minus3(asked, l.m.Position(s.at))
		return s.at, math.Hypot(math.Hypot(d[0], d[1]), d[2])
	}
	return s.at, math.Sqrt(s.best)
}

// farAway is as far as distances can be squared; parts are smaller (RangeError).
const farAway = 1e150

func (m *Mesh) bounds(f int32) (lo, hi [3]float64) {
	a, b, c := point3(m.Positions, m.Triangles[3*f]), point3(m.Positions, m.Triangles[3*f+1]), point3(m.Positions, m.Triangles[3*f+2])
	for k := range 3 {
		lo[k], hi[k] = min(a[k], b[k], c[k]), max(a[k], b[k], c[k])
	}
	return lo, hi
}

// search is one place's way through the triangles. A box is passed over only if it is
// farther than the best so far by more than rounding could pretend: then every way through
// them ends at the same point.
type search struct {
	m     *Mesh
	p     [3]float64
	slack float64
	at    Point
	best  float64 // distance squared
	limit float64 // the same with the slack on it
}

func (s *search) try(f int32) {
	w, d2 := s.m.nearestOn(f, s.p)
	if d2 < s.best || d2 == s.best && f < s.at.Triangle {
		s.best, s.at = d2, Point{Triangle: f, Weights: w}
		reach := math.Sqrt(d2) + s.slack
		s.limit = reach * reach * (1 + 0x1p-48)
	}
}

// scan goes through all triangles, by their boxes first.
func (s *search) scan(faces []int32) {
	t, x := s.m.Triangles, s.m.Positions
	for _, f := range faces {
		a, b, c := t[3*f], t[3*f+1], t[3*f+2]
		sum := 0.0
		for axis, p := range s.p {
			u, v, w := x[int(3*a)+axis], x[int(3*b)+axis], x[int(3*c)+axis]
			if off := max(min(u, v, w)-p, p-max(u, v, w)); off > 0 {
				if sum += off * off; sum > s.limit {
					break
				}
			}
		}
		if sum <= s.limit {
			s.try(f)
		}
	}
}

func (s *search) descend(t *boxTree, faces []int32) {
	type visit struct {
		node, from, to int32
		gap2           float64
	}
	var room [64]visit // twice the depth of a tree of 2^31 items
	stack := append(room[:0], visit{0, 0, int32(len(t.items)), t.gap2(0, &s.p)})
	for len(stack) > 0 {
		v := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		if v.gap2 > s.limit {
			continue
		}
		if v.to-v.from <= leafItems {
			for _, i := range t.items[v.from:v.to] {
				s.try(faces[i])
			}
			continue
		}
		mid := int32((int(v.from) + int(v.to)) / 2)
		near := visit{2*v.node + 1, v.from, mid, t.gap2(int(2*v.node+1), &s.p)}
		far := visit{2*v.node + 2, mid, v.to, t.gap2(int(2*v.node+2), &s.p)}
		if far.gap2 < near.gap2 {
			near, far = far, near
		}
		stack = append(stack, far, near)
	}
}

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
