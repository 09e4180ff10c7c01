package geodesic

import (
	"context"
	"math"
	"slices"
	"unsafe"

	"heatskin/mesh"
)

// Options narrow what Spread does. The zero value asks for the whole mesh.
type Options struct {
	// Radius ends the wave: vertices farther than it stay +Inf. 0 is no limit.
	Radius float64
	// Targets end the wave once the distance of each is known. Distances of other
	// places are given only if they are no farther.
	Targets []mesh.Datum
	// Any ends the wave once the nearest of Targets is known.
	Any bool
	// Keep holds all windows, so that At serves any point. Memory then follows the
	// area that the wave has run over, of the order of a kilobyte a triangle.
	Keep bool
	// MaxBytes bounds working memory; 0 is no limit.
	MaxBytes int64
}

// A Wave is the distances that one set of sources gave.
type Wave struct {
	// Distances by vertex; +Inf where no path leads, beyond Reach, and at vertices
	// that lie in no triangle of positive area.
	Distances []float64
	// Targets holds the distance of each of Options.Targets, +Inf if it was not reached.
	Targets []float64
	// Reach is how far the wave ran: distances up to it are exact, others are not known.
	// +Inf if it ran to the end.
	Reach float64
	// Windows counts the windows carried across a triangle, a measure of work.
	Windows int64
	// PeakBytes is the most memory that the wave's own tables took.
	PeakBytes int64

	wave *wave
}

// wave is the state of one propagation.
type wave struct {
	*Solver
	opt    Options
	radius float64

	distance []float64 // by vertex
	sends    []uint8   // by vertex: 0 not yet known, else one of the below
	list     []int32   // by halfedge: the number of its envelope in pool plus 1, 0 if it has none
	waits    []float64 // by halfedge: the least distance of windows that wait to cross; +Inf if none
	pool     pool
	events   eventHeap
	old      []int32 // halfedges that have an envelope
	sweepAt  int     // length of old at which to sweep it
	now      float64 // no window still to cross is nearer than this
	crossed  int64
	tables   int64 // bytes of what is made at the start
	peak     int64

	left, right, merged, spare envelope // scratch

	points  map[int32][]sourcePoint // source points by triangle
	targets targets

	// If lines are to be drawn, else nil:
	parents []parent        // by vertex
	ends    map[int32]int32 // vertices that are sources: which
	lines   map[int32]int32 // halfedges that are sources: which
}

const (
	sendsNot uint8 = 1 + iota
	sendsOn
	sent
)

// Spread lets the wave run from the data over the mesh. The error is a *DatumError, a
// *SizeError, a *MemoryError or ctx.Err(). Time is about that of 10 to 50 runs of Dijkstra's
// algorithm along the edges; memory 50 bytes a triangle and 8 a vertex, plus 48 for
// each window on the wave's front.
func (s *Solver) Spread(ctx context.Context, data []mesh.Datum, opt Options) (*Wave, error) {
	v, err := s.start(data, opt, false)
	if err != nil {
		return nil, err
	}
	if err := v.run(ctx); err != nil {
		return nil, err
	}
	return v.result(), nil
}

// Field is the exact distance of every vertex of m from the data, +Inf where no path
// leads. Options and errors are those of Solver.Spread.
func Field(ctx context.Context, m *mesh.Mesh, data []mesh.Datum, opt Options) ([]float64, error) {
	w, err := NewSolver(m).Spread(ctx, data, opt)
	if err != nil {
		return nil, err
	}
	return w.Distances, nil
}

func (s *Solver) start(data []mesh.Datum, opt Options, lines bool) (*wave, error) {
	if s.extent > 0 && !(s.extent > 1e-70 && s.extent < 1e70) {
		return nil, &SizeError{s.extent}
	}
	n, halfedges := s.mesh.NumVertices(), len(s.mesh.Triangles)
	tables := int64(n)*9 + int64(halfedges)*12
	if lines {
		tables += int64(n) * int64(unsafe.Sizeof(parent{}))
	}
	if opt.MaxBytes > 0 && tables > opt.MaxBytes {
		return nil, &MemoryError{Bytes: tables, Limit: opt.MaxBytes}
	}
	v := &wave{
		Solver: s, opt: opt, radius: opt.Radius, tables: tables,
		distance: make([]float64, n),
		sends:    make([]uint8, n),
		list:     make([]int32, halfedges),
		waits:    make([]float64, halfedges),
	}
	if !(v.radius > 0) {
		v.radius = math.Inf(1)
	}
	if lines {
		v.parents, v.ends, v.lines = make([]parent, n), map[int32]int32{}, map[int32]int32{}
	}
	inf := math.Inf(1)
	for i := range v.distance {
		v.distance[i] = inf
	}
	for i := range v.waits {
		v.waits[i] = inf
	}
	if err := v.aim(opt.Targets); err != nil {
		return nil, err
	}
	if err := v.source(data); err != nil {
		return nil, err
	}
	return v, nil
}

// run carries windows on, nearest first, until none is left or all that was asked
// for is known.
//
// All windows that wait on a halfedge cross together when the nearest of them is the
// nearest of all. By then nearly all that will come through that halfedge have come:
// on smooth meshes less than one window in a thousand crosses in vain.
func (v *wave) run(ctx context.Context) error {
	halfedges := int32(len(v.waits))
	inf := math.Inf(1)
	for turn := 0; len(v.events) > 0; turn++ {
		if turn%1024 == 0 {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := v.weigh(); err != nil {
				return err
			}
		}
		if len(v.old) > v.sweepAt && !v.opt.Keep {
			v.sweep()
		}
		e := v.events.pop()
		if e.id < halfedges {
			if e.key != v.waits[e.id] {
				continue // came forward since, and has crossed
			}
			if v.now = e.key; v.done() {
				return nil
			}
			v.waits[e.id] = inf
			v.cross(e.id)
		} else if vertex := e.id - halfedges; v.sends[vertex] == sendsOn && e.key == v.distance[vertex] {
			if v.now = e.key; v.done() {
				return nil
			}
			v.sends[vertex] = sent
			v.send(vertex)
		}
	}
	v.now = inf
	return nil
}

// sweep forgets the envelopes that no window can touch any more: all that is still
// to come is farther than any point of the halfedge.
func (v *wave) sweep() {
	kept := v.old[:0]
	for _, h := range v.old {
		if v.waits[h] < math.Inf(1) || v.bound(h) >= v.now {
			kept = append(kept, h)
		} else {
			v.pool.drop(v.list[h] - 1)
			v.list[h] = 0
		}
	}
	v.old = kept
	v.sweepAt = max(256, len(kept)+len(kept)/4)
}

// bound is a distance that no point of halfedge h exceeds: one goes there from its
// ends.
func (v *wave) bound(h int32) float64 {
	t := v.mesh.Triangles
	return (v.distance[t[h]] + v.distance[t[following(h)]] + v.edgeLength(h)) / 2
}

// weigh compares working memory with the limit.
func (v *wave) weigh() error {
	bytes := v.tables + v.pool.size + int64(cap(v.pool.lists))*32 + int64(cap(v.events))*16 + int64(cap(v.old))*4
	v.peak = max(v.peak, bytes)
	if v.opt.MaxBytes > 0 && bytes > v.opt.MaxBytes {
		return &MemoryError{Bytes: bytes, Limit: v.opt.MaxBytes, Reach: v.now}
	}
	return nil
}

// result reads the wave off.
func (v *wave) result() *Wave {
	w := &Wave{Distances: v.distance, Reach: min(v.now, v.radius), Windows: v.crossed, PeakBytes: v.peak, wave: v}
	for i, d := range v.distance {
		if d > w.Reach || !(d < math.Inf(1)) || !v.hasArea(int32(i)) {
			v.distance[i] = math.Inf(1)
		}
	}
	w.Targets = v.targetDistances(w.Reach)
	if !v.opt.Keep {
		w.wave = nil
	}
	v.events, v.old, v.waits = nil, nil, nil
	return w
}

// At is the exact distance of any point of the mesh, +Inf where no path leads or beyond
// Reach. It needs a wave spread with Options.Keep, and panics without. Its cost is that
// of the windows on three edges. It may be called from several goroutines.
func (w *Wave) At(p mesh.Point) float64 {
	v := w.wave
	if v == nil {
		panic("geodesic: Wave.At needs Options.Keep")
	}
	d := math.Inf(1)
	for k := range int32(3) {
		d = min(d, w.Distances[v.mesh.Triangles[3*p.Triangle+k]]+v.toCorner(p.Triangle, p.Weights, k))
	}
	for _, q := range v.points[p.Triangle] {
		d = min(d, v.apart(p.Triangle, p.Weights, q.weights))
	}
	for h := 3 * p.Triangle; h < 3*p.Triangle+3; h++ {
		if v.list[h] == 0 {
			continue
		}
		l := v.lay(h)
		x, y := l.point(h, p.Weights)
		windows := v.pool.lists[v.list[h]-1]
		for i := range windows {
			if s, ok := windows[i].straight(x, y, l.length); ok {
				d = min(d, s)
			}
		}
	}
	if d > w.Reach {
		return math.Inf(1)
	}
	return d
}

// hasArea tells whether vertex i lies in a triangle of positive area.
func (s *Solver) hasArea(i int32) bool {
	for _, h := range s.corners(i) {
		if !s.flat(h) {
			return true
		}
	}
	return false
}

// lower sets the distance of a vertex to d, if that is less, and says so.
func (v *wave) lower(vertex int32, d float64) bool {
	if !(d < v.distance[vertex]) || d > v.radius {
		return false
	}
	old := v.distance[vertex]
	v.distance[vertex] = d
	if v.sends[vertex] == 0 {
		v.sends[vertex] = sendsNot
		if v.sendsOn(vertex) {
			v.sends[vertex] = sendsOn
		}
	}
	if v.sends[vertex] == sendsOn || v.sends[vertex] == sent && d < old*(1-tie) {
		v.sends[vertex] = sendsOn
		v.events.push(event{d, int32(len(v.waits)) + vertex})
	}
	return true
}

// send lets the wave out of a vertex into all its triangles.
func (v *wave) send(vertex int32) {
	d := v.distance[vertex]
	for _, out := range v.corners(vertex) {
		h := following(out) // opposite the vertex
		l := v.lay(h)
		v.fromCorner(vertex, l.a, d+v.between(vertex, l.a))
		v.fromCorner(vertex, l.b, d+v.between(vertex, l.b))
		if !l.degenerate {
			v.emitWhole(h, &l, window{b1: l.length, x: l.x, y: l.y, far: d})
		}
	}
}

// emitWhole sends one window out of the triangle of layout l through halfedge h itself.
func (v *wave) emitWhole(h int32, l *layout, w window) {
	g := v.gate(h, l.a, l.b, l.length, &v.left)
	v.emit(&g, &w)
	v.deliver(&g)
}

// A gate is an edge that windows leave a triangle by. They gather in run, in order
// from tail to head, before the envelopes across take them in together.
type gate struct {
	h          int32 // halfedge of the triangle left
	tail, head int32
	length     float64
	thin       float64
	noise      float64 // what round-off may do to distances on the edge near a source
	dt, dh     float64 // distances of tail and head
	bound      float64 // no point of the edge is farther
	least      float64 // least distance of the windows in run
	run        *envelope
	hasTargets bool
}

func (v *wave) gate(h, tail, head int32, length float64, run *envelope) gate {
	g := gate{h: h, tail: tail, head: head, length: length, thin: narrow * length, noise: blur * length,
		least: math.Inf(1), run: run}
	*run = (*run)[:0]
	v.rate(&g)
	g.hasTargets = v.targets.edges != nil && v.targets.edges[h] != nil
	return g
}

// rate brings the gate's distances up to date.
func (v *wave) rate(g *gate) {
	g.dt, g.dh = v.distance[g.tail], v.distance[g.head]
	g.bound = min((g.dt+g.dh+g.length)/2, v.radius)
}

// emit lets a window into the gate's run, unless it is plain that no shortest path
// goes through it: a way along the edge from one of its ends to the window's far end
// is as short, or all of the edge is as near.
func (v *wave) emit(g *gate, w *window) {
	if w.reaches(w.b1, (g.dt+w.b1)*(1-blur)-g.noise) || w.reaches(w.b0, (g.dh+(g.length-w.b0))*(1-blur)-g.noise) {
		return
	}
	t := w.nearest()
	if w.reaches(t, g.bound) {
		return
	}
	if !w.reaches(t, g.least) {
		g.least = w.at(t)
	}
	if g.hasTargets {
		v.hitEdge(g, w)
	}
	g.run.add(*w, g.thin, &v.spare)
}

// deliver gives the run of a gate to the halfedges across.
func (v *wave) deliver(g *gate) {
	if len(*g.run) == 0 {
		return
	}
	ahead := true // the run is in order from tail to head
	for p := v.glue[g.h]; p != g.h; p = v.glue[p] {
		if (v.mesh.Triangles[p] == g.tail) != ahead {
			ahead = !ahead
			slices.Reverse(*g.run)
			for i, w := range *g.run {
				(*g.run)[i] = w.turned(g.length)
			}
		}
		v.receive(p, *g.run, g.thin)
		if g.least < v.waits[p] {
			v.waits[p] = g.least
			v.events.push(event{g.least, p})
		}
	}
}

// receive merges a run into the envelope of h.
func (v *wave) receive(h int32, run envelope, thin float64) {
	i := v.list[h] - 1
	if i < 0 {
		v.list[h] = v.pool.add(run) + 1
		v.old = append(v.old, h)
		return
	}
	have := v.pool.lists[i]
	merged := v.merged[:0]
	for len(have) > 0 || len(run) > 0 {
		if len(run) == 0 || len(have) > 0 && have[0].b0 <= run[0].b0 {
			merged.add(have[0], thin, &v.spare)
			have = have[1:]
		} else {
			merged.add(run[0], thin, &v.spare)
			run = run[1:]
		}
	}
	v.merged = merged
	v.pool.set(i, merged)
}

// cross carries the windows on h that have not been yet across its triangle.
func (v *wave) cross(h int32) {
	l := v.lay(h)
	if l.degenerate {
		return
	}
	v.fromCorner(l.a, l.c, v.distance[l.a]+l.toA)
	v.fromCorner(l.b, l.c, v.distance[l.b]+l.toB)
	left := v.gate(l.gateA, l.a, l.c, l.toA, &v.left)
	right := v.gate(l.gateB, l.c, l.b, l.toB, &v.right)
	watched := v.targets.faces != nil && v.targets.faces[h/3] != nil
	slack, thin := slackShare*l.length, narrow*l.length
	windows := v.pool.lists[v.list[h]-1]
	for i := range windows {
		w := &windows[i]
		if w.flags&crossed != 0 {
			continue
		}
		v.crossed++
		if watched {
			v.hitFace(h, &l, w)
		}
		apex, ok := w.hit(l.x, l.y)
		if !ok {
			w.flags |= crossed
			continue
		}
		if apex >= w.b0-slack && apex <= w.b1+slack {
			v.throughWindow(h, &l, w)
			v.rate(&left)
			v.rate(&right)
		}
		b0, b1 := w.b0, w.b1
		if w.y <= thin && w.x >= b0-thin && w.x <= b1+thin && w.flags&parallel == 0 {
			// The source lies on the edge: all its rays leave from one point, which
			// round-off must not put outside.
			b0, b1 = min(b0, max(w.x-thin, 0)), max(b1, min(w.x+thin, l.length))
		}
		if b0 < apex && l.toA > 0 {
			out := window{far: w.far, flags: w.flags}
			if w.flags&parallel != 0 {
				out.x = w.x*l.uax + w.y*l.uay
				out.y = w.y*l.uax - w.x*l.uay
			} else {
				out.x = w.x*l.uax - w.y*l.uay
				out.y = max(w.x*l.uay+w.y*l.uax, 0)
			}
			out.b0 = land(w, b0, b0, l.uax, -l.uay, l.toA)
			out.b1 = l.toA
			if b1 < apex {
				out.b1 = land(w, b1, b1, l.uax, -l.uay, l.toA)
			}
			if out.b1 > out.b0 {
				v.emit(&left, &out)
			}
		}
		if b1 > apex && l.toB > 0 {
			out := window{far: w.far, flags: w.flags}
			if w.flags&parallel != 0 {
				// The axis from C to B is (ubx, -uby).
				out.x = w.x*l.ubx - w.y*l.uby
				out.y = w.y*l.ubx + w.x*l.uby
				out.far += w.x*l.x + w.y*l.y
			} else {
				out.x = l.toB - ((l.length-w.x)*l.ubx - w.y*l.uby)
				out.y = max((l.length-w.x)*l.uby+w.y*l.ubx, 0)
			}
			out.b1 = l.toB - land(w, b1, l.length-b1, l.ubx, l.uby, l.toB)
			if b0 > apex {
				out.b0 = l.toB - land(w, b0, l.length-b0, l.ubx, l.uby, l.toB)
			}
			if out.b1 > out.b0 {
				v.emit(&right, &out)
			}
		}
		w.flags |= crossed
	}
	v.deliver(&left)
	v.deliver(&right)
}

// land is where w's ray through b, at distance arm from a corner, meets the edge that
// leaves the corner in direction (ux, |uy|) from AB, measured from there. uy is
// negative at A, positive at B.
func land(w *window, b, arm, ux, uy, length float64) float64 {
	p, q := w.ray(b)
	switch {
	case arm <= 0:
		return 0
	case uy == 0: // in the line AB
		if ux > 0 {
			return min(arm/ux, length)
		}
		return length
	case q == 0:
		return 0
	}
	if d := q*ux + p*uy; d > 0 {
		return min(arm*(q/d), length)
	}
	return length
}

// slackShare is how far (of the halfedge) a vertex may lie beside a window's rays and
// still be given its distance: windows that end at a vertex may gape there by
// round-off. What is wrong with such a distance is of second order in the gap where
// the vertex bends paths, and loses against a better one where it does not.
const slackShare = 1e-12
