package meshtest

import (
	"math"
	"slices"
)

// A point of the plane.
type planar = [2]float64

// turn is twice the signed area of a, b, c: positive where they turn left.
func turn(a, b, c planar) float64 {
	return (b[0]-a[0])*(c[1]-a[1]) - (b[1]-a[1])*(c[0]-a[0])
}

// earClip triangulates a polygon (outer, counter-clockwise) with holes (clockwise)
// over its own vertices alone, as CAD programs do: the result is full of slivers and
// fans, and is meant to be. All are given by number into points; so are the corners
// returned. Holes are joined to the outer rim by bridges (as D. Eberly, Triangulation
// by ear clipping, describes), from the rightmost hole leftwards. O(n^2).
func earClip(points []planar, outer []int32, holes [][]int32) []int32 {
	ring := slices.Clone(outer)
	rightmost := func(hole []int32) int {
		best := 0
		for i, v := range hole {
			if points[v][0] > points[hole[best]][0] {
				best = i
			}
		}
		return best
	}
	order := slices.Clone(holes)
	slices.SortStableFunc(order, func(a, b []int32) int {
		xa, xb := points[a[rightmost(a)]][0], points[b[rightmost(b)]][0]
		switch {
		case xa > xb:
			return -1
		case xa < xb:
			return 1
		}
		return 0
	})
	for _, hole := range order {
		i := rightmost(hole)
		at := bridge(points, ring, points[hole[i]])
		splice := append(slices.Clone(hole[i:]), hole[:i+1]...)
		splice = append(splice, ring[at])
		ring = slices.Insert(ring, at+1, splice...)
	}
	return clip(points, ring)
}

// bridge is the place in ring whose vertex sees m, which lies inside.
func bridge(points []planar, ring []int32, m planar) int {
	n := len(ring)
	best, at := math.Inf(1), -1
	for i := range ring {
		a, b := points[ring[i]], points[ring[(i+1)%n]]
		if a[1] <= m[1] && m[1] < b[1] { // it goes up: the inside is on its left
			x := a[0] + (m[1]-a[1])*(b[0]-a[0])/(b[1]-a[1])
			if x >= m[0] && x < best {
				best = x
				if at = i; b[0] > a[0] {
					at = (i + 1) % n
				}
			}
		}
	}
	if at < 0 {
		panic("meshtest: earClip: a hole lies outside its polygon")
	}
	// What could hide ring[at] from m is a reflex vertex in the triangle between the
	// ray, the hit and ring[at]; of those the one nearest in angle to the ray is seen.
	hit, p := planar{best, m[1]}, points[ring[at]]
	slope, distance := math.Inf(1), math.Inf(1)
	if p[0] > m[0] {
		slope, distance = math.Abs(p[1]-m[1])/(p[0]-m[0]), p[0]-m[0]
	}
	for i := range ring {
		q := points[ring[i]]
		if q[0] < m[0] || q == p {
			continue
		}
		before, after := points[ring[(i+n-1)%n]], points[ring[(i+1)%n]]
		if !within(m, hit, p, q) || turn(before, q, after) > 0 || !opens(before, q, after, m) {
			continue
		}
		s := math.Abs(q[1]-m[1]) / (q[0] - m[0])
		if s < slope || s == slope && q[0]-m[0] < distance {
			slope, distance, at = s, q[0]-m[0], i
		}
	}
	if points[ring[at]] == p { // bridges pass a vertex several times: take the side that faces m
		for i := range ring {
			if points[ring[i]] == p && opens(points[ring[(i+n-1)%n]], p, points[ring[(i+1)%n]], m) {
				return i
			}
		}
	}
	return at
}

// within tells whether q lies in the triangle a, b, c (of either turn) or on its rim.
func within(a, b, c, q planar) bool {
	u, v, w := turn(a, b, q), turn(b, c, q), turn(c, a, q)
	return u >= 0 && v >= 0 && w >= 0 || u <= 0 && v <= 0 && w <= 0
}

// opens tells whether the inside angle at q, between its neighbours, faces m.
func opens(before, q, after, m planar) bool {
	if turn(before, q, after) > 0 {
		return turn(before, q, m) >= 0 && turn(q, after, m) >= 0
	}
	return turn(before, q, m) >= 0 || turn(q, after, m) >= 0
}

// clip cuts ears off a simple ring (bridges may double its vertices).
func clip(points []planar, ring []int32) []int32 {
	n := len(ring)
	next, prev := make([]int, n), make([]int, n)
	for i := range ring {
		next[i], prev[i] = (i+1)%n, (i+n-1)%n
	}
	at := func(i int) planar { return points[ring[i]] }
	reflex := make([]int, 0, n)
	for i := range ring {
		if turn(at(prev[i]), at(i), at(next[i])) <= 0 {
			reflex = append(reflex, i)
		}
	}
	gone := make([]bool, n)
	isEar := func(i int) bool {
		a, b, c := at(prev[i]), at(i), at(next[i])
		if turn(a, b, c) <= 0 {
			return false
		}
		for _, j := range reflex {
			q := at(j)
			if gone[j] || q == a || q == b || q == c {
				continue
			}
			if within(a, b, c, q) {
				return false
			}
		}
		return true
	}
	triangles := make([]int32, 0, 3*(n-2))
	i, tries, left := 0, 0, n
	for left > 3 {
		if tries > left {
			panic("meshtest: earClip: no ear left")
		}
		if !isEar(i) {
			i, tries = next[i], tries+1
			continue
		}
		p, q := prev[i], next[i]
		triangles = append(triangles, ring[p], ring[i], ring[q])
		next[p], prev[q], gone[i] = q, p, true
		left, tries = left-1, 0
		if left%64 == 0 { // drop what is no longer reflex: it never becomes so again
			reflex = slices.DeleteFunc(reflex, func(j int) bool {
				return gone[j] || turn(at(prev[j]), at(j), at(next[j])) > 0
			})
		}
		i = q
	}
	return append(triangles, ring[prev[i]], ring[i], ring[next[i]])
}
