package mesh

import (
	"math"

	"heatskin/internal/parallel"
)

// alongCurve is m with its triangles in the order in which a Morton curve (G. Morton,
// IBM technical report, 1966) passes them, and its vertices as the triangles name them
// first: what is near on the surface is then near in memory, whatever the order of the
// file. A CAD system's is good as a rule; one in random order makes every step of the
// work miss the cache, which costs two to four times the time from some 10^5 vertices
// on. triangle and vertex are the numbers in m; vertices in no triangle are left out. O(n).
func (m *Mesh) alongCurve() (local *Mesh, triangle, vertex []int32) {
	triangle = m.sortedAlongCurve()
	corners := make([]int32, len(m.Triangles))
	parallel.EachBlock(len(triangle), func(_, lo, hi int) {
		for i := lo; i < hi; i++ {
			copy(corners[3*i:3*i+3], m.Triangles[3*triangle[i]:])
		}
	})
	number, vertex := numberByFirst(corners, m.NumVertices())
	positions := make([]float64, 3*len(vertex))
	parallel.EachBlock(len(vertex), func(_, lo, hi int) {
		for v := lo; v < hi; v++ {
			copy(positions[3*v:3*v+3], m.Positions[3*vertex[v]:])
		}
	})
	renumber(corners, corners, number)
	return &Mesh{Positions: positions, Triangles: corners}, triangle, vertex
}

// sortedAlongCurve lists triangles in the order in which a Morton curve passes their
// centres; triangles of one place keep their order. O(n), more where density varies by
// many orders of magnitude.
func (m *Mesh) sortedAlongCurve() (order []int32) {
	items := make([]uint64, m.NumTriangles()) // place on the curve << 32 | triangle
	parallel.EachBlock(len(items), func(_, lo, hi int) {
		for f := lo; f < hi; f++ {
			items[f] = uint64(f)
		}
	})
	m.sortAlongCurve(items, make([]uint64, len(items)), m.box())
	order = make([]int32, len(items))
	parallel.EachBlock(len(items), func(_, lo, hi int) {
		for i := lo; i < hi; i++ {
			order[i] = int32(uint32(items[i]))
		}
	})
	return order
}

const (
	curveBits  = digitBits // of each coordinate: a grid of 1024³ cells
	crowdedRun = 256       // more triangles than this in one cell get a grid of their own
)

// sortAlongCurve sorts items, whose lower halves are triangles in the box.
func (m *Mesh) sortAlongCurve(items, scratch []uint64, box box3) {
	size := box.size()
	if !(size > 1e-300) {
		return
	}
	scale := math.Nextafter(1<<curveBits, 0) / size
	parallel.EachBlock(len(items), func(_, lo, hi int) {
		for i, item := range items[lo:hi] {
			place := uint64(0)
			for axis, c := range m.centre(item) {
				cell := min(max((c-box.lo[axis])*scale, 0), 1<<curveBits-1) // rounding
				place |= spread3(uint64(cell)) << axis
			}
			items[lo+i] = place<<32 | uint64(uint32(item))
		}
	})
	radixSort(items, scratch)
	for i := 0; i < len(items); {
		j := i + 1
		for j < len(items) && items[j]>>32 == items[i]>>32 {
			j++
		}
		if j-i > crowdedRun {
			around := noBox()
			for _, item := range items[i:j] {
				around.add(m.centre(item))
			}
			m.sortAlongCurve(items[i:j], scratch[:j-i], around)
		}
		i = j
	}
}

// centre is that of the triangle of an item.
func (m *Mesh) centre(item uint64) (c [3]float64) {
	t := m.Triangles[3*uint32(item):][:3]
	p, q, r := point3(m.Positions, t[0]), point3(m.Positions, t[1]), point3(m.Positions, t[2])
	for axis := range c {
		c[axis] = p[axis]/3 + q[axis]/3 + r[axis]/3
	}
	return c
}

// spread3 puts two zeros before each of the ten bits of c.
func spread3(c uint64) uint64 {
	c = (c | c<<16) & 0x30000ff
	c = (c | c<<8) & 0x300f00f
	c = (c | c<<4) & 0x30c30c3
	return (c | c<<2) & 0x9249249
}

type box3 struct{ lo, hi [3]float64 }

func noBox() box3 {
	inf := math.Inf(1)
	return box3{lo: [3]float64{inf, inf, inf}, hi: [3]float64{-inf, -inf, -inf}}
}

func (b *box3) add(p [3]float64) {
	for axis, x := range p {
		b.lo[axis], b.hi[axis] = min(b.lo[axis], x), max(b.hi[axis], x)
	}
}

// size is the longest side.
func (b *box3) size() float64 {
	return max(b.hi[0]-b.lo[0], b.hi[1]-b.lo[1], b.hi[2]-b.lo[2])
}

// numberByFirst numbers vertices in the order in which corners name them. number is by
// vertex, -1 where no corner does; vertex is its inverse.
func numberByFirst(corners []int32, numVertices int) (number, vertex []int32) {
	number = make([]int32, numVertices)
	for v := range number {
		number[v] = -1
	}
	vertex = make([]int32, 0, numVertices)
	for _, v := range corners {
		if number[v] < 0 {
			number[v] = int32(len(vertex))
			vertex = append(vertex, v)
		}
	}
	return number, vertex
}

// renumber sets dst[i] to number[src[i]]. dst may be src.
func renumber(dst, src, number []int32) {
	parallel.EachBlock(len(src), func(_, lo, hi int) {
		for i, v := range src[lo:hi] {
			dst[lo+i] = number[v]
		}
	})
}
