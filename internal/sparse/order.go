package sparse

import (
	"cmp"
	"context"
	"math"
	"slices"
	"sync"
	"sync/atomic"
)

// Where dissection ends and how wide it looks. Chosen on spheres, tori, coils and plates of 1e4 to 7e5 vertices.
const (
	leafSize    = 100     // pieces up to this size are ordered by minimum degree
	forkSize    = 4096    // pieces from this size on may go to another goroutine
	bandLayers  = 12      // on each side of a cut of a large piece; √m/10 if m vertices are fewer, but 3 at least
	samples     = 256     // points that choose a direction
	hubFactor   = 12      // a vertex with more than 40 + hubFactor·√n neighbours is kept for the end
	severalSize = 10000   // pieces from this size on try two cuts with the flow; 3000 gains 1 % of fill for 20 % of time
	similar     = 1.3     // a cut wider than the narrowest by this factor before the flow is not tried
	spanSize    = 1 << 15 // vertices that one goroutine takes at a time in passes over a large piece
	stubborn    = 4096    // pieces up to this size that no cut helps are ordered by minimum degree as a whole
)

// A dissector orders a graph by nested dissection (J. A. George, SIAM J. Numer. Anal. 10(2), 1973,
// pp. 345–363). A piece is a range of verts; its vertices v have part[v] = 1 + where it begins, those
// of separators above it have 0. Cutting a piece rearranges its range: left, right, separator; at the end verts is the
// order. Pieces share no vertex and no edge, so they can be worked on at the same time.
type dissector struct {
	graph
	verts, queue []int32
	part, level  []int32
	index        []int32
	other        []int32 // levels from the other end, then the difference of both
	side         []uint8
	bestSide     []uint8
	workers      int
	tokens       chan struct{} // one for each goroutine that may still start
	tools        sync.Pool
	wait         sync.WaitGroup
	stop         atomic.Bool
}

// tool is what one goroutine needs beside the shared arrays.
type tool struct {
	cutter     cutter
	md         minimumDegree
	candidates []candidate
	values     []float32
	axes       [6][3]float32 // of the piece that split has seen last
	counts     []int32
}

// dissect returns an order of elimination that keeps the factor of matrices on p sparse, as vertices of a
// renumbered graph in which neighbours are near in memory: perm[k] is the vertex of g eliminated k-th, row
// near[perm[k]] of p. coords, 3 a row, may be nil. The order does not depend on the number of workers.
func dissect(ctx context.Context, p *Pattern, coords []float64, workers int) (g *graph, near, perm []int32, err error) {
	if err := ctx.Err(); err != nil {
		return nil, nil, nil, err
	}
	n := p.Dim()
	var xyz []float32
	if len(coords) == 3*n {
		near, xyz = curveOrder(coords)
	}
	if near == nil {
		near = breadthFirstOrder(p)
	}
	g = renumber(p, near, xyz, workers)
	d := &dissector{graph: *g,
		verts: make([]int32, n), queue: make([]int32, n), part: make([]int32, n), level: make([]int32, n),
		index: make([]int32, n), side: make([]uint8, n), bestSide: make([]uint8, n), other: make([]int32, n), workers: workers, tokens: make(chan struct{}, workers)}
	d.tools.New = func() any { return new(tool) }
	defer context.AfterFunc(ctx, func() { d.stop.Store(true) })()
	for range workers - 1 {
		d.tokens <- struct{}{}
	}
	many := int64(40 + hubFactor*math.Sqrt(float64(n)))
	kept, end := 0, n
	for v := range int32(n) {
		d.index[v] = -1
		if d.ptr[v+1]-d.ptr[v] > many {
			end--
			d.verts[end] = v
			continue
		}
		d.verts[kept] = v
		kept++
		d.part[v] = 1
	}
	d.order(0, int32(kept))
	d.wait.Wait()
	return g, near, d.verts, ctx.Err()
}

// order arranges the piece [lo, hi).
func (d *dissector) order(lo, hi int32) {
	t := d.tools.Get().(*tool)
	defer d.tools.Put(t)
	for hi-lo > leafSize && !d.stop.Load() {
		if d.split(t, lo, hi) {
			return // components, each dealt with
		}
		left, right := d.cut(t, lo, hi)
		if left == 0 {
			d.leaf(t, lo, hi)
			return
		}
		d.give(lo, lo+left)
		lo, hi = lo+left, lo+left+right
	}
	if !d.stop.Load() {
		d.leaf(t, lo, hi)
	}
}

// give has another goroutine order [lo, hi) if one is free, or does it.
func (d *dissector) give(lo, hi int32) {
	if hi-lo >= forkSize {
		select {
		case <-d.tokens:
			d.wait.Go(func() {
				d.order(lo, hi)
				d.tokens <- struct{}{}
			})
			return
		default:
		}
	}
	d.order(lo, hi)
}

// leaf orders a piece that is not cut any more.
func (d *dissector) leaf(t *tool, lo, hi int32) {
	if hi-lo > stubborn {
		return // no small separator, so its factor is dense in any order
	}
	t.md.sort(&d.graph, d.verts[lo:hi], d.part, lo+1, d.index)
	for _, v := range d.verts[lo:hi] {
		d.index[v] = -1
	}
}

// split searches the piece by breadth, from a far end, and leaves its vertices in queue[lo:hi] by level. Where
// the piece falls into components it orders them, small ones several at a time, and returns true.
func (d *dissector) split(t *tool, lo, hi int32) bool {
	verts, queue := d.verts[lo:hi], d.queue[lo:hi]
	id := lo + 1
	start := d.farEnd(t, lo, hi)
	reached := d.search(start, verts, queue, id)
	if int(reached) == len(verts) {
		if d.xyz == nil { // start again from the last vertex: nearer to the ends of a long piece
			d.search(queue[reached-1], verts, queue, id)
		}
		return false
	}
	ends := []int32{reached}
	for _, v := range verts {
		if d.level[v] < 0 {
			reached = d.grow(d.level, v, queue, reached, id)
			ends = append(ends, reached)
		}
	}
	copy(verts, queue)
	begin := int32(0)
	for k := 0; k < len(ends); {
		end := ends[k]
		for k++; k < len(ends) && ends[k]-begin <= leafSize; k++ {
			end = ends[k]
		}
		for _, v := range verts[begin:end] {
			d.part[v] = id + begin
		}
		if end-begin <= leafSize {
			d.leaf(t, lo+begin, lo+end)
		} else {
			d.give(lo+begin, lo+end)
		}
		begin = end
	}
	return true
}

// search numbers the levels of a piece from start and returns how many vertices it reached.
func (d *dissector) search(start int32, verts, queue []int32, id int32) int32 {
	return d.searchInto(d.level, start, verts, queue, id)
}

func (d *dissector) searchInto(level []int32, start int32, verts, queue []int32, id int32) int32 {
	for _, v := range verts {
		level[v] = -1
	}
	return d.grow(level, start, queue, 0, id)
}

func (d *dissector) grow(level []int32, start int32, queue []int32, tail, id int32) int32 {
	part := d.part
	level[start] = 0
	queue[tail] = start
	head := tail
	tail++
	for ; head < tail; head++ {
		v := queue[head]
		next := level[v] + 1
		for _, w := range d.adj[d.ptr[v]:d.ptr[v+1]] {
			if part[w] == id && level[w] < 0 {
				level[w] = next
				queue[tail] = w
				tail++
			}
		}
	}
	return tail
}

// cut parts the connected piece [lo, hi), which split has just searched, into left, right and separator, in this order
// in verts, and returns the sizes of the first two: 0 if the piece is better left whole. Three cuts stand as
// candidates; large pieces try the best two with the flow.
func (d *dissector) cut(t *tool, lo, hi int32) (left, right int32) {
	verts, queue := d.verts[lo:hi], d.queue[lo:hi]
	id := lo + 1
	m := len(verts)
	t.candidates = t.candidates[:0]
	width, at := levelCut(t, queue, d.level)
	t.candidates = append(t.candidates, candidate{width: width, level: at, kind: byLevel})
	if d.xyz != nil {
		d.planeCut(t, verts)
	}
	d.differenceCut(t, verts, queue, id)
	for k := range t.candidates {
		if c := &t.candidates[k]; c.kind != byLevel {
			d.setSides(verts, *c)
			c.width = d.border(verts, id)
		}
	}
	slices.SortStableFunc(t.candidates, func(a, b candidate) int { return cmp.Compare(a.width, b.width) })
	tries := t.candidates[:1]
	if next := t.candidates[1:]; m >= severalSize && len(next) > 0 && next[0].width < similar*tries[0].width {
		tries = t.candidates[:2]
	}
	side, best := d.side, math.Inf(1)
	var count [3]int32
	for _, c := range tries {
		d.setSides(verts, c)
		t.cutter.separate(&d.graph, verts, d.part, id, d.side, d.index, int(max(3, min(math.Sqrt(float64(m))/10, bandLayers))))
		var n [3]int32
		for _, v := range verts {
			n[d.side[v]]++
		}
		if p := penalty(float64(n[separator]), (float64(n[leftSide])+float64(n[separator])/2)/float64(m)); p < best {
			best, count = p, n
			if len(tries) > 1 {
				side = d.bestSide
				for _, v := range verts {
					side[v] = d.side[v]
				}
			}
		}
	}
	if small := min(count[leftSide], count[rightSide]); small == 0 || int(count[separator]) > 8*int(small)+leafSize || m <= stubborn && 3*int(count[separator]) > m {
		return 0, 0
	}
	next := [3]int32{0, count[leftSide], count[leftSide] + count[rightSide]}
	ids := [3]int32{id, id + count[leftSide], 0}
	for _, v := range verts {
		s := side[v]
		d.part[v] = ids[s]
		queue[next[s]] = v
		next[s]++
	}
	copy(verts, queue)
	return count[leftSide], count[rightSide]
}

// A candidate is a way to cut a piece in two.
type candidate struct {
	kind  int
	level int32      // byLevel, byDifference: the last on the left side
	axis  [3]float32 // byPlane: its normal
	at    float32    // byPlane: where
	width float64    // vertices at the cut, made larger where it is unbalanced
}

const (
	byLevel = iota
	byDifference
	byPlane
)

func (d *dissector) setSides(verts []int32, c candidate) {
	d.spans(verts, func(_ int, verts []int32) {
		for _, v := range verts {
			var right bool
			switch c.kind {
			case byLevel:
				right = d.level[v] > c.level
			case byDifference:
				right = d.other[v] > c.level
			default:
				right = d.along(c.axis, v) >= c.at
			}
			d.side[v] = leftSide
			if right {
				d.side[v] = rightSide
			}
		}
	})
}

// spans calls do for all of verts, in several goroutines if they are many.
func (d *dissector) spans(verts []int32, do func(first int, verts []int32)) {
	if len(verts) <= 2*spanSize {
		do(0, verts)
		return
	}
	inParallel(d.workers, (len(verts)+spanSize-1)/spanSize, func(_, i int) {
		first := i * spanSize
		do(first, verts[first:min(first+spanSize, len(verts))])
	})
}

// border returns the smaller number of vertices on one side with a neighbour on the other, weighed by balance.
func (d *dissector) border(verts []int32, id int32) float64 {
	var count, border [2]int
	var lock sync.Mutex
	d.spans(verts, func(_ int, verts []int32) {
		var n, b [2]int
		for _, v := range verts {
			s := d.side[v]
			n[s]++
			for _, w := range d.adj[d.ptr[v]:d.ptr[v+1]] {
				if d.part[w] == id && d.side[w] != s {
					b[s]++
					break
				}
			}
		}
		lock.Lock()
		for s := range 2 {
			count[s] += n[s]
			border[s] += b[s]
		}
		lock.Unlock()
	})
	if count[0] == 0 || count[1] == 0 {
		return math.Inf(1)
	}
	return penalty(float64(min(border[0], border[1])), float64(count[0])/float64(len(verts)))
}

// differenceCut adds the cut along the line of equal distance, or nearly so, from both ends of the piece, which is
// straighter than a level.
func (d *dissector) differenceCut(t *tool, verts, queue []int32, id int32) {
	d.searchInto(d.other, queue[len(queue)-1], verts, queue, id)
	for _, v := range verts {
		d.other[v] = d.level[v] - d.other[v]
	}
	least, most := d.other[verts[0]], d.other[verts[0]]
	for _, v := range verts {
		least, most = min(least, d.other[v]), max(most, d.other[v])
	}
	t.counts = resize(t.counts, int(most-least)+1)
	clear(t.counts)
	for _, v := range verts {
		t.counts[d.other[v]-least]++
	}
	before := int32(0)
	for l, c := range t.counts {
		before += c
		if int(before) >= len(verts)/2 {
			t.candidates = append(t.candidates, candidate{kind: byDifference, level: least + int32(l)})
			return
		}
	}
}

// levelCut chooses the level after which to cut: one with few vertices, between 0.3 and 0.7 of the piece. It returns
// its width, made larger where the cut is unbalanced.
func levelCut(t *tool, queue, level []int32) (width float64, at int32) {
	last := level[queue[len(queue)-1]]
	t.counts = resize(t.counts, int(last)+1)
	clear(t.counts)
	for _, v := range queue {
		t.counts[level[v]]++
	}
	width = math.Inf(1)
	before, m := 0, float64(len(queue))
	for l, c := range t.counts {
		share := (float64(before) + float64(c)/2) / m
		before += int(c)
		if c := penalty(float64(c), share); c < width && l < int(last) && share > 0.35 && share < 0.65 {
			width, at = c, int32(l)
		}
	}
	return width, at
}

// penalty weighs the size of a separator by the balance of the sides, the smaller having the given share.
func penalty(size, share float64) float64 {
	share = min(share, 1-share)
	return size * 0.25 / max(share*(1-share), 1e-6)
}

// farEnd returns a vertex to search from: far along the longest direction, or just the first.
func (d *dissector) farEnd(t *tool, lo, hi int32) int32 {
	verts := d.verts[lo:hi]
	if d.xyz == nil {
		return verts[0]
	}
	t.axes = d.axes(verts)
	far, best := verts[0], float32(math.Inf(1))
	step := max(1, len(verts)/samples)
	for k := 0; k < len(verts); k += step {
		v := verts[k]
		if f := d.along(t.axes[0], v); f < best {
			far, best = v, f
		}
	}
	return far
}

func (d *dissector) along(axis [3]float32, v int32) float32 {
	p := d.xyz[3*v:][:3]
	return axis[0]*p[0] + axis[1]*p[1] + axis[2]*p[2]
}

// planeCut adds the cut by the plane through the median of the piece across the direction in which the middle tenth
// of its vertices is spread widest, so that the cut meets the fewest.
func (d *dissector) planeCut(t *tool, verts []int32) {
	step := max(1, len(verts)/samples)
	var across [3]float32
	widest := float32(0)
	for _, axis := range t.axes {
		t.values = t.values[:0]
		for k := 0; k < len(verts); k += step {
			t.values = append(t.values, d.along(axis, verts[k]))
		}
		n := len(t.values)
		if spread := quickSelect(t.values, n*11/20) - quickSelect(t.values, n*9/20); spread > widest {
			across, widest = axis, spread
		}
	}
	if widest == 0 {
		return
	}
	t.values = resize(t.values, len(verts))
	d.spans(verts, func(first int, verts []int32) {
		for i, v := range verts {
			t.values[first+i] = d.along(across, v)
		}
	})
	t.candidates = append(t.candidates, candidate{kind: byPlane, axis: across, at: quickSelect(t.values, len(verts)/2)})
}

// axes returns the principal axes of some of the vertices, the longest first, then the coordinate axes, along which many parts are built.
func (d *dissector) axes(verts []int32) (axes [6][3]float32) {
	var mean [3]float64
	var c [3][3]float64
	step := max(1, len(verts)/samples)
	count := 0.0
	for k := 0; k < len(verts); k += step {
		p := d.xyz[3*verts[k]:][:3]
		for i := range 3 {
			mean[i] += float64(p[i])
		}
		count++
	}
	for i := range 3 {
		mean[i] /= count
	}
	for k := 0; k < len(verts); k += step {
		p := d.xyz[3*verts[k]:][:3]
		for i := range 3 {
			for j := range 3 {
				c[i][j] += (float64(p[i]) - mean[i]) * (float64(p[j]) - mean[j])
			}
		}
	}
	v := [3][3]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}
	for range 8 { // Jacobi's rotations; eight sweeps are more than enough for three by three
		for p := range 2 {
			for q := p + 1; q < 3; q++ {
				if c[p][q] == 0 {
					continue
				}
				theta := (c[q][q] - c[p][p]) / (2 * c[p][q])
				tan := 1 / (math.Abs(theta) + math.Sqrt(theta*theta+1))
				if theta < 0 {
					tan = -tan
				}
				cos := 1 / math.Sqrt(tan*tan+1)
				sin := tan * cos
				for k := range 3 {
					c[k][p], c[k][q] = cos*c[k][p]-sin*c[k][q], sin*c[k][p]+cos*c[k][q]
				}
				for k := range 3 {
					c[p][k], c[q][k] = cos*c[p][k]-sin*c[q][k], sin*c[p][k]+cos*c[q][k]
				}
				for k := range 3 {
					v[k][p], v[k][q] = cos*v[k][p]-sin*v[k][q], sin*v[k][p]+cos*v[k][q]
				}
			}
		}
	}
	by := []int{0, 1, 2}
	slices.SortStableFunc(by, func(i, j int) int {
		switch {
		case c[i][i] > c[j][j]:
			return -1
		case c[i][i] < c[j][j]:
			return 1
		}
		return 0
	})
	for a, k := range by {
		for i := range 3 {
			axes[a][i] = float32(v[i][k])
		}
	}
	axes[3][0], axes[4][1], axes[5][2] = 1, 1, 1
	return axes
}

// quickSelect rearranges values and returns the one of rank k, from 0.
func quickSelect(values []float32, k int) float32 {
	lo, hi := 0, len(values)-1
	for lo < hi {
		a, b, c := values[lo], values[(lo+hi)/2], values[hi]
		pivot := max(min(a, b), min(max(a, b), c))
		i, j := lo, hi
		for i <= j {
			for values[i] < pivot {
				i++
			}
			for values[j] > pivot {
				j--
			}
			if i <= j {
				values[i], values[j] = values[j], values[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return values[k]
		}
	}
	return values[k]
}
