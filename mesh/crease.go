package mesh

import (
	"math"
	"slices"

	"heatskin/internal/parallel"
)

// Creases lists the edges whose bend angle is above degrees (flat = 0, folded back =
// 180), each once with its smaller vertex first, in order of the halfedge that names
// the edge first. Bends says what the bend angle is. O(n).
func Creases(m *Mesh, degrees float64) [][2]int32 {
	glued := glue(m.Triangles, m.NumVertices())
	bend := bends(m, glued)
	limit := degrees * math.Pi / 180
	var edges [][2]int32
	eachInnerEdge(glued, func(h int32) {
		if bend[h] > limit {
			a, b := m.Triangles[h], m.Triangles[next(h)]
			edges = append(edges, [2]int32{min(a, b), max(a, b)})
		}
	})
	return edges
}

// eachInnerEdge calls do with the least halfedge of every edge that has two faces or
// more, in rising order. O(n), however many faces share an edge.
func eachInnerEdge(glued []int32, do func(h int32)) {
	seen := map[int32]bool{} // later halfedges of edges with more than two faces
	for h, o := range glued {
		h := int32(h)
		switch {
		case o == h:
		case glued[o] == h:
			if h < o {
				do(h)
			}
		case !seen[h]:
			do(h)
			for ; o != h; o = glued[o] {
				seen[o] = true
			}
		}
	}
}

// Bends gives for each halfedge 3f+k of m the bend angle of its edge, in radians: by
// how much the surface turns there, 0 where it goes on flat and pi where it folds back
// on itself. It is NaN on the boundary. How the two faces are oriented does not matter.
//
// An edge with more than two faces bends as much as the face that goes on least: each
// face is measured against the one that continues it best, and the largest of these
// angles counts. (A stiffener on a plate makes 90 degrees, a face written twice 0.)
//
// A triangle too flat to have a direction (its height is lost in the rounding of its
// coordinates) is looked through: its longest edge counts as flat, and across its
// other edges the face beyond the longest stands for it. O(n), or O(k log k) for an
// edge of k faces.
func Bends(m *Mesh) []float64 { return bends(m, glue(m.Triangles, m.NumVertices())) }

func bends(m *Mesh, glued []int32) []float64 {
	bend := make([]float64, len(m.Triangles))
	noise := m.noise()
	crowded := parallel.Gather(len(bend), func(h int32) bool {
		o := glued[h]
		switch {
		case o == h:
			bend[h] = math.NaN()
		case glued[o] != h:
			return true
		case h < o: // both faces' business, so one of them sees to it
			a, okA := m.into(h, glued, noise)
			b, okB := m.into(o, glued, noise)
			if okA && okB {
				angle := bendBetween(a, b)
				bend[h], bend[o] = angle, angle
			}
		}
		return false
	})
	seen := make(map[int32]bool, len(crowded))
	var directions [][3]float64
	for _, h := range crowded {
		if seen[h] {
			continue
		}
		directions = directions[:0]
		for o := h; !seen[o]; o = glued[o] {
			seen[o] = true
			if d, ok := m.into(o, glued, noise); ok {
				directions = append(directions, d)
			}
		}
		angle := 0.0
		switch {
		case len(directions) == 2:
			angle = bendBetween(directions[0], directions[1])
		case len(directions) > 2:
			angle = leastContinued(directions)
		}
		bend[h] = angle
		for o := glued[h]; o != h; o = glued[o] {
			bend[o] = angle
		}
	}
	return bend
}

// bendBetween is the bend between two faces that go in these directions from their edge.
func bendBetween(a, b [3]float64) float64 {
	return math.Atan2(length3(cross3(a, b)), -dot3(a, b))
}

// noise is the height up to which a triangle has no direction: 16 times what single
// precision rounds off, and a millionth of the part's size, which no file is exact to.
func (m *Mesh) noise() float64 {
	type extent struct {
		box    box3
		double bool // some coordinate does not fit in single precision
	}
	blocks := make([]extent, parallel.NumBlocks(m.NumVertices()))
	parallel.EachBlock(m.NumVertices(), func(block, lo, hi int) {
		e := extent{box: noBox()}
		for v := lo; v < hi; v++ {
			p := point3(m.Positions, int32(v))
			e.box.add(p)
			for _, x := range p {
				e.double = e.double || float64(float32(x)) != x
			}
		}
		blocks[block] = e
	})
	box, double := noBox(), false
	for _, e := range blocks {
		box.add(e.box.lo)
		box.add(e.box.hi)
		double = double || e.double
	}
	noise := 0x1p-20 * box.size()
	if !double {
		for axis := range box.lo {
			noise = max(noise, 0x1p-20*math.Abs(box.lo[axis]), 0x1p-20*math.Abs(box.hi[axis]))
		}
	}
	return noise
}

// into is a vector at a right angle to halfedge h that points into its face, or into
// the face that stands for it where that one is flat; false if none does. It is as
// long as the face is high over h.
func (m *Mesh) into(h int32, glued []int32, noise float64) (d [3]float64, ok bool) {
	t, x := m.Triangles, m.Positions
	a, b := point3(x, t[h]), point3(x, t[next(h)])
	const most = 16 // flat triangles in a row
	for range most {
		corner := 3 * (h / 3)
		p, q, r := point3(x, t[corner]), point3(x, t[corner+1]), point3(x, t[corner+2])
		pq, qr, rp := minus3(q, p), minus3(r, q), minus3(p, r)
		longest, length2 := corner, dot3(pq, pq)
		if l := dot3(qr, qr); l > length2 {
			longest, length2 = corner+1, l
		}
		if l := dot3(rp, rp); l > length2 {
			longest, length2 = corner+2, l
		}
		if n := cross3(pq, rp); dot3(n, n) > noise*noise*length2 {
			e, c := minus3(b, a), minus3(point3(x, t[prev(h)]), a)
			e2 := dot3(e, e)
			along := dot3(c, e) / e2
			return [3]float64{c[0] - along*e[0], c[1] - along*e[1], c[2] - along*e[2]}, e2 > 0
		}
		beyond := glued[longest]
		if longest == h || beyond == longest || glued[beyond] != longest {
			return d, false
		}
		h = beyond
	}
	return d, false
}

// leastContinued takes vectors at right angles to one line and gives the largest of
// their bends, each against that other one which continues it best.
func leastContinued(d [][3]float64) float64 {
	// Angles around the line, counted from the first vector.
	u := d[0]
	axis := [3]float64{}
	for _, v := range d[1:] { // the vector that leaves u's line most clearly gives the turn's sense
		if c := cross3(u, v); dot3(c, c) > dot3(axis, axis) {
			axis = c
		}
	}
	w := cross3(axis, u) // as long as |axis||u|, so it is scaled back below
	scale := length3(axis)
	if scale == 0 {
		scale = 1
	}
	turns := make([]float64, len(d))
	for i, v := range d {
		turns[i] = math.Atan2(dot3(v, w)/scale, dot3(v, u))
	}
	slices.Sort(turns)
	largest := 0.0
	n := len(turns)
	for i, a := range turns {
		opposite := a + math.Pi
		if opposite > math.Pi {
			opposite -= 2 * math.Pi
		}
		at, _ := slices.BinarySearch(turns, opposite)
		best := math.Inf(1)
		for j := at - 2; j <= at+1; j++ { // the neighbours, past i itself
			if k := (j + 2*n) % n; k != i {
				off := math.Abs(turns[k] - opposite)
				best = min(best, off, 2*math.Pi-off)
			}
		}
		largest = max(largest, best)
	}
	return largest
}
