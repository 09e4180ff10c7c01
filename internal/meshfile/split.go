package meshfile

import (
	"context"
	"fmt"
	"math"
	"slices"
)

// A polygon is a face of more than three corners, cut as a fan: its triangles are
// (c0, c1, c2), (c0, c2, c3)... from number first on.
type polygon struct{ first, triangles int32 }

// split cuts the faces anew whose fan would overlap itself or hold flat triangles.
func (soup *Soup) split(ctx context.Context) error {
	c := cutter{positions: soup.Positions, spare: spareTests}
	tangled, tangledAt := 0, int32(0)
	work := 0
	for _, p := range soup.polygons {
		if work += int(p.triangles); work > 1<<20 { // a look at the context now and then
			work = 0
			if err := ctx.Err(); err != nil {
				return err
			}
		}
		if !c.cut(soup.Triangles[3*p.first : 3*(p.first+p.triangles)]) {
			if tangled == 0 {
				tangledAt = p.first
			}
			tangled++
		}
	}
	soup.polygons = nil
	if tangled > 0 {
		soup.warn(fmt.Sprintf("faces that cross themselves or are far from flat (%d) come out as overlapping triangles, the first as those from %d on",
			tangled, tangledAt))
	}
	return nil
}

// A cutter cuts polygons into triangles by clipping ears: G. H. Meisters, American
// Mathematical Monthly 82 (1975), pp. 648-651. Corners that are no strict bulges are
// kept in a grid of cells, so that an ear is only held against those near it; that
// is close to linear on outlines as they occur, and bounded where it is not.
type cutter struct {
	positions  []float64
	corner     []int32   // vertex numbers
	x, y       []float64 // corners in the plane of the face, counter-clockwise
	next, prev []int32   // the outline that is left
	minX, minY float64
	perX, perY float64 // cells per length
	side       int     // cells per side
	cell       []int32 // the corners of cell i are dent[cell[i]:cell[i+1]]
	dent       []int32
	tests      int // corners that may still be held against ears in this face
	spare      int // and in all faces together, beyond each one's due
}

// A face of n corners may need n² tests. Each has its due, and all faces together
// a second or so more (a test takes about 3 ns); then a face is cut without looking.
const (
	testsPerCorner = 1000
	spareTests     = 300_000_000
)

// cut replaces a fan by triangles of the same polygon that do not overlap. It is
// false if there are none, or if they were not found within the work allowed.
func (c *cutter) cut(fan []int32) bool {
	k := len(fan)/3 + 2
	c.corner = append(c.corner[:0], fan[0], fan[1])
	for i := 2; i < len(fan); i += 3 {
		c.corner = append(c.corner, fan[i])
	}
	if !c.flatten() {
		return true // no area: nothing to do better
	}
	c.next, c.prev = resize(c.next, k), resize(c.prev, k)
	for i := range k {
		c.next[i], c.prev[i] = int32((i+1)%k), int32((i+k-1)%k)
	}
	if c.convex(k) {
		return true
	}
	if c.sortDents(k); len(c.dent) == 0 {
		return false // it bulges everywhere and goes round more than once
	}
	due := testsPerCorner * k
	c.tests = due + c.spare
	whole := true
	at := int32(0)
	for out := 0; k > 3; out += 3 {
		turned := 0
		for c.tests > 0 && turned <= k && !(c.bulges(at) && c.empty(at)) {
			at = c.next[at]
			turned++
			c.tests--
		}
		whole = whole && c.tests > 0 && turned <= k // else any corner is cut off, to get on
		p, n := c.prev[at], c.next[at]
		fan[out], fan[out+1], fan[out+2] = c.corner[p], c.corner[at], c.corner[n]
		c.next[p], c.prev[n] = n, p
		c.next[at] = -1 // gone
		k--
		at = c.next[n] // not n: ears in turn make wider triangles than ears in a row
	}
	last := len(fan) - 3
	if k == 3 {
		fan[last], fan[last+1], fan[last+2] = c.corner[c.prev[at]], c.corner[at], c.corner[c.next[at]]
	}
	c.spare = max(0, min(c.spare, c.tests))
	return whole
}

// flatten projects the corners along the axis nearest to the face's normal (Newell's:
// the sum of the cross products along the outline, twice the area whatever the
// outline's shape), counter-clockwise. It is false if the face has no area.
func (c *cutter) flatten() bool {
	at := func(i int) []float64 { v := 3 * int(c.corner[i]); return c.positions[v : v+3] }
	origin := at(0)
	var normal [3]float64
	for i := range c.corner {
		a, b := at(i), at((i+1)%len(c.corner))
		for axis := range 3 {
			j, k := (axis+1)%3, (axis+2)%3
			normal[axis] += (a[j]-origin[j])*(b[k]-origin[k]) - (a[k]-origin[k])*(b[j]-origin[j])
		}
	}
	axis := 0
	for i := range 3 {
		if math.Abs(normal[i]) > math.Abs(normal[axis]) {
			axis = i
		}
	}
	if !(math.Abs(normal[axis]) > 0) || math.IsInf(normal[axis], 0) {
		return false
	}
	j, k := (axis+1)%3, (axis+2)%3
	if normal[axis] < 0 {
		j, k = k, j
	}
	c.x, c.y = c.x[:0], c.y[:0]
	for i := range c.corner {
		p := at(i)
		c.x, c.y = append(c.x, p[j]-origin[j]), append(c.y, p[k]-origin[k])
	}
	return true
}

// turn is twice the area of the triangle of three corners.
func (c *cutter) turn(p, q, r int32) float64 {
	return (c.x[q]-c.x[p])*(c.y[r]-c.y[p]) - (c.x[r]-c.x[p])*(c.y[q]-c.y[p])
}

// bulges tells whether corner i of the outline left turns strictly to the left.
// Coordinates in single precision put corners on a straight edge off it by 6e-8 of
// the edge; a sine below 1e-6 counts as straight, so that no sliver comes of it.
func (c *cutter) bulges(i int32) bool {
	p, n := c.prev[i], c.next[i]
	lengths := math.Hypot(c.x[i]-c.x[p], c.y[i]-c.y[p]) * math.Hypot(c.x[n]-c.x[i], c.y[n]-c.y[i])
	return c.turn(p, i, n) > 1e-6*lengths
}

// convex tells whether the outline bulges everywhere and goes round once.
func (c *cutter) convex(k int) bool {
	descents := 0 // times that x turns from rising to falling: once per round
	for i := range int32(k) {
		if !c.bulges(i) {
			return false
		}
		if c.x[i] >= c.x[c.prev[i]] && c.x[c.next[i]] < c.x[i] {
			descents++
		}
	}
	return descents <= 1
}

// sortDents sorts the corners that do not bulge into the grid. Clipping an ear never
// makes a bulge of a simple outline a dent, so no others can lie inside an ear.
func (c *cutter) sortDents(k int) {
	c.minX, c.minY = slices.Min(c.x), slices.Min(c.y)
	count := 0
	for i := range int32(k) {
		if !c.bulges(i) {
			count++
		}
	}
	c.side = max(1, int(math.Sqrt(float64(count))))
	c.perX = float64(c.side) / (slices.Max(c.x) - c.minX)
	c.perY = float64(c.side) / (slices.Max(c.y) - c.minY)
	c.cell = resize(c.cell, c.side*c.side+1)
	clear(c.cell)
	c.dent = resize(c.dent, count)
	place := func(i int32) int { return c.row(c.y[i])*c.side + c.column(c.x[i]) }
	for i := range int32(k) {
		if !c.bulges(i) {
			c.cell[place(i)+1]++
		}
	}
	for i := range c.side * c.side {
		c.cell[i+1] += c.cell[i]
	}
	for i := int32(k) - 1; i >= 0; i-- { // from the back, which leaves cell[i+1] at cell i's start
		if !c.bulges(i) {
			at := place(i) + 1
			c.cell[at]--
			c.dent[c.cell[at]] = i
		}
	}
	copy(c.cell, c.cell[1:])
	c.cell[c.side*c.side] = int32(count)
}

func (c *cutter) column(x float64) int { return clampCell((x-c.minX)*c.perX, c.side) }
func (c *cutter) row(y float64) int    { return clampCell((y-c.minY)*c.perY, c.side) }

// clampCell is the cell of a coordinate, whatever overflow made of it.
func clampCell(x float64, side int) int {
	if !(x > 0) {
		return 0
	}
	return int(min(x, float64(side-1)))
}

// empty tells whether no other corner lies in the closed triangle at corner i, but
// for those in the very place of its corners (outlines touch themselves where a
// bridge leads to a hole).
func (c *cutter) empty(i int32) bool {
	p, n := c.prev[i], c.next[i]
	left, right := c.column(min(c.x[p], c.x[i], c.x[n])), c.column(max(c.x[p], c.x[i], c.x[n]))
	low, high := c.row(min(c.y[p], c.y[i], c.y[n])), c.row(max(c.y[p], c.y[i], c.y[n]))
	for row := low; row <= high; row++ {
		from, to := c.cell[row*c.side+left], c.cell[row*c.side+right+1]
		c.tests -= 1 + right - left + int(to-from)
		for _, q := range c.dent[from:to] {
			if c.next[q] < 0 || c.same(q, p) || c.same(q, i) || c.same(q, n) {
				continue
			}
			if c.turn(p, i, q) >= 0 && c.turn(i, n, q) >= 0 && c.turn(n, p, q) >= 0 {
				return false
			}
		}
	}
	return true
}

func (c *cutter) same(a, b int32) bool { return c.x[a] == c.x[b] && c.y[a] == c.y[b] }

// resize is a slice of n values that uses s's memory where it suffices.
func resize[T any](s []T, n int) []T {
	return slices.Grow(s[:0], n)[:n]
}
