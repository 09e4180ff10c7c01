package mesh

import (
	"cmp"
	"math"
	"math/bits"
	"slices"
	"sync"
)

// A boxTree is a balanced binary tree of boxes over items (points or triangles).
// Node 0 holds all of them; the children of node i are 2i+1 and 2i+2, and halve its
// range of items at the middle. A node of at most leafItems items is a leaf.
type boxTree struct {
	items []int32   // leaf by leaf
	boxes []float64 // 6 per node: the three least coordinates, then the three greatest
}

const leafItems = 4

// entry is an item while the tree is built: kept whole, since chasing numbers
// through memory would cost more than moving 32 bytes.
type entry struct {
	centre [3]float64
	item   int32
}

// newBoxTree builds the tree over count items, bounds giving each one's box. It is
// split at the median along the longest axis of the items' centres. O(n log n), on
// several cores; the tree does not depend on how many.
func newBoxTree(count int, bounds func(i int32) (lo, hi [3]float64)) *boxTree {
	entries := make([]entry, count)
	for i := range entries {
		lo, hi := bounds(int32(i))
		e := &entries[i]
		e.item = int32(i)
		for axis := range 3 {
			e.centre[axis] = lo[axis]/2 + hi[axis]/2
		}
	}
	t := &boxTree{items: make([]int32, count), boxes: make([]float64, 6*nodesFor(count))}
	var build func(node, from, to int)
	build = func(node, from, to int) {
		part := entries[from:to]
		if len(part) <= leafItems {
			lo, hi := emptyBox()
			for i, e := range part {
				t.items[from+i] = e.item
				l, h := bounds(e.item)
				for axis := range 3 {
					lo[axis], hi[axis] = min(lo[axis], l[axis]), max(hi[axis], h[axis])
				}
			}
			copy(t.boxes[6*node:], lo[:])
			copy(t.boxes[6*node+3:], hi[:])
			return
		}
		lo, hi := emptyBox()
		for i := range part {
			for axis, x := range part[i].centre {
				lo[axis], hi[axis] = min(lo[axis], x), max(hi[axis], x)
			}
		}
		axis := 0
		for a := 1; a < 3; a++ {
			if hi[a]-lo[a] > hi[axis]-lo[axis] {
				axis = a
			}
		}
		mid := (from + to) / 2
		selectEntry(part, mid-from, axis)
		if len(part) > 1<<15 {
			var left sync.WaitGroup
			left.Go(func() { build(2*node+1, from, mid) })
			build(2*node+2, mid, to)
			left.Wait()
		} else {
			build(2*node+1, from, mid)
			build(2*node+2, mid, to)
		}
		a, b, c := t.boxes[6*node:6*node+6], t.boxes[12*node+6:12*node+12], t.boxes[12*node+12:12*node+18]
		for k := range 3 {
			a[k], a[k+3] = min(b[k], c[k]), max(b[k+3], c[k+3])
		}
	}
	if count > 0 {
		build(0, 0, count)
	}
	return t
}

// nodesFor is the number of heap places that count items need: ranges of one level
// differ by one item at most, so all leaves lie on the two last levels.
func nodesFor(count int) int {
	levels := 1
	for size := count; size > leafItems; size = (size + 1) / 2 {
		levels++
	}
	return 1<<levels - 1
}

func emptyBox() (lo, hi [3]float64) {
	inf := math.Inf(1)
	return [3]float64{inf, inf, inf}, [3]float64{-inf, -inf, -inf}
}

// selectEntry puts the k-th smallest along axis at place k, smaller ones before it
// and greater ones after (C. A. R. Hoare, Find, 1961). Where the pivots keep failing
// it sorts, so that no input makes it quadratic.
func selectEntry(e []entry, k, axis int) {
	for tries := 4 * bits.Len(uint(len(e))); len(e) > 1; tries-- {
		if tries == 0 {
			slices.SortFunc(e, func(a, b entry) int { return cmp.Compare(a.centre[axis], b.centre[axis]) })
			return
		}
		a, b, c := e[0].centre[axis], e[len(e)/2].centre[axis], e[len(e)-1].centre[axis]
		pivot := max(min(a, b), min(max(a, b), c))
		i, j := 0, len(e)-1
		for i <= j {
			for e[i].centre[axis] < pivot {
				i++
			}
			for e[j].centre[axis] > pivot {
				j--
			}
			if i <= j {
				e[i], e[j] = e[j], e[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			e = e[:j+1]
		case k >= i:
			e, k = e[i:], k-i
		default:
			return
		}
	}
}

// gap2 is the square of the distance from p to the node's box, 0 inside.
func (t *boxTree) gap2(node int, p *[3]float64) float64 {
	return gap2(p, (*[3]float64)(t.boxes[6*node:]), (*[3]float64)(t.boxes[6*node+3:]))
}

func gap2(p, lo, hi *[3]float64) float64 {
	x := max(lo[0]-p[0], p[0]-hi[0], 0)
	y := max(lo[1]-p[1], p[1]-hi[1], 0)
	z := max(lo[2]-p[2], p[2]-hi[2], 0)
	return x*x + y*y + z*z
}

// between gives the squares of the least and the greatest distance that points of
// two nodes' boxes can have.
func (t *boxTree) between(i, j int) (least, greatest float64) {
	a, b := t.boxes[6*i:6*i+6], t.boxes[6*j:6*j+6]
	for k := range 3 {
		near := max(b[k]-a[k+3], a[k]-b[k+3], 0)
		far := max(b[k+3]-a[k], a[k+3]-b[k])
		least += near * near
		greatest += far * far
	}
	return least, greatest
}
