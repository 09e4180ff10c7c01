package mesh

import (
	"math"

	"heatskin/internal/parallel"
)

// roundEdge is the bend, in radians, up to which an edge counts as a chord of a curved
// skin; sharper ones are edges of the part. A circle of nine sides is still round.
const roundEdge = 40 * math.Pi / 180

// ChordError estimates by how much, relatively, distances along the flat triangles
// differ from those along the curved skin that they are inscribed in, from the bends
// between them: the mean over area and over directions. Around a circle, where
// neighbouring chords bend by θ, it is θ²/24 (arc against chord); a cylinder has half
// of that, its axis being straight. It is nothing that a solver could mend: only a
// finer tessellation of the part could. O(n).
//
// Each triangle gets the curvature tensor II of its bends, an edge of length l that
// bends by θ counting θ·l across itself, half of it on either side (D. Cohen-Steiner
// and J.-M. Morvan, Restricted Delaunay triangulations and normal cycle, 2003). The
// skin lies over the triangle by the quadratic z that is 0 at its corners, with
// q = II(e, e) for the edges e: to second order a path on it is longer by
// z̄·tr(II)/2 - mean|∇z|²/4, where z̄ = (q1+q2+q3)/24.
func ChordError(m *Mesh) float64 {
	m, _, _ = m.alongCurve()
	glued := glue(m.Triangles, m.NumVertices())
	bends := bends(m, glued)
	type sums struct{ over, area float64 }
	blocks := make([]sums, parallel.NumBlocks(m.NumTriangles()))
	parallel.EachBlock(m.NumTriangles(), func(block, lo, hi int) {
		s := &blocks[block]
		for f := int32(lo); f < int32(hi); f++ {
			over, area := m.chordError(f, glued, bends)
			s.over += over * area
			s.area += area
		}
	})
	var all sums
	for _, s := range blocks {
		all.over += s.over
		all.area += s.area
	}
	if all.area == 0 {
		return 0
	}
	return all.over / all.area
}

// chordError is that of triangle f, and its area: 0 where it has none.
func (m *Mesh) chordError(f int32, glued []int32, bends []float64) (over, area float64) {
	t := m.Triangles[3*f : 3*f+3]
	if !hasArea(m.Positions, t[0], t[1], t[2]) {
		return 0, 0
	}
	normal, area := m.facing(f)
	var bend, length [3]float64
	var along [3][3]float64
	for k := range int32(3) {
		h := 3*f + k
		along[k] = minus3(m.corner(next(h)), m.corner(h))
		length[k] = length3(along[k])
		g := glued[h]
		if g == h || glued[g] != h || !(bends[h] <= roundEdge) {
			continue // no chord of a curved skin
		}
		bend[k] = bends[h]
		if dot3(normal, minus3(m.corner(prev(g)), m.corner(g))) > 0 {
			bend[k] = -bend[k] // hollow
		}
	}
	return overhang(along, length, bend, normal, area), area
}

// overhang is the relative length, over all directions, that a path gains by running
// over the skin that a triangle with these edges and bends is inscribed in.
func overhang(along [3][3]float64, length, bend [3]float64, normal [3]float64, area float64) float64 {
	var q [3]float64
	trace := 0.0
	for k, b := range bend {
		if b == 0 {
			continue
		}
		across := cross3(normal, along[k]) // of the edge's own length
		c := b / (2 * area * length[k])    // ½ l θ / area, over the length squared
		trace += c * length[k] * length[k]
		for i := range q {
			p := dot3(across, along[i])
			q[i] += c * p * p
		}
	}
	rise := (q[0] + q[1] + q[2]) / 24
	slopes := 0.0
	for i := range q {
		slope := (q[(i+1)%3] + q[(i+2)%3] - q[i]) / 4 * length[i] / (2 * area)
		slopes += slope * slope / 3
	}
	return math.Abs(rise*trace/2 - slopes/4)
}

// facing is the unit normal of triangle f, and its area.
func (m *Mesh) facing(f int32) (normal [3]float64, area float64) {
	n := cross3(minus3(m.corner(3*f+1), m.corner(3*f)), minus3(m.corner(3*f+2), m.corner(3*f)))
	size := length3(n)
	return [3]float64{n[0] / size, n[1] / size, n[2] / size}, size / 2
}

// corner is where the tail of halfedge h lies.
func (m *Mesh) corner(h int32) [3]float64 {
	return point3(m.Positions, m.Triangles[h])
}
