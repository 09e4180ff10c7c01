package kernel

import (
	"math"

	"heatskin/internal/parallel"
	"heatskin/mesh"
)

// A front is the state of a wave front that sweeps over a surface. At each vertex
// that it has passed it knows when it arrived (the distance), how curved it was then,
// and from where in the vertex's own frame of angles it came. That is enough to
// continue it through a triangle: near vertex a the distance is
//
//	d(x) = d(a) + (κ|x|² - 2 e·x) / (|e - κx| + 1),
//
// the distance from the point a + e/κ, with e the unit vector back along the ray and
// κ the curvature of the front: κ > 0 spreads from a centre behind, κ = 0 is a plane
// wave, κ < 0 converges. On flat faces this is an unfolding, exact but for rounding;
// on curved skins κ follows the Jacobi equation with the surface's Gaussian curvature
// (do Carmo, Riemannian Geometry, 1992, ch. 5).
type front struct {
	s     *mesh.Surface
	frame *frames

	at   []state // by vertex
	line []bool  // by halfedge: the edge is a source as a whole; nil if there are none
}

const (
	// flatNoise is the disagreement, relative to an edge, that rounding explains.
	flatNoise = 1e-9
	// curvedNoise times K·h², the turn of a frame from one vertex to the next, is the
	// disagreement that discretisation explains. Chosen on spheres, tori and
	// coils of 2 500 to 20 000 vertices: below 2 neighbours on rough meshes fall out with
	// each other, above 8 the two fronts at a cut locus are taken for one.
	curvedNoise = 4
	// rim lets a ray pass an edge's end by this part of the edge, so that a ray through
	// a vertex is found from at least one side.
	rim = 1e-9
	// halfDoubt and shadowDoubt are how much of a disagreement counts as error: of that
	// between the two ends of an edge, of which the better is taken; and of that between a
	// way round a corner and the straight line, were nothing in the way. Fitted to exact
	// distances (TestErrorEstimate).
	halfDoubt, shadowDoubt = 0.5, 0.25
)

// A state is what the front knows at one vertex.
type state struct {
	arrival
	done  bool // may give it on
	fixed bool // a source: not to be changed
}

// An arrival is how the front comes to a vertex.
type arrival struct {
	d     float64 // distance; +Inf where the front has not been
	left  float64 // curvature of the front to the left of the ray; +Inf at a source
	right float64 // to the right: another where the ray has grazed a corner, see alongEdge
	back  float64 // angle of the ray back, in the vertex's frame; NaN where there is none
	noise float64 // how far directions may be off, from the curvature the ray has met
	err   float64 // how far d may be off: what estimates on the way differed by, weighed and added up
	sides sides   // where the front started last, left and right of the ray
	weak  bool    // on the word of one end of an edge only, or round a bend
}

// An origin is the corner that a front last turned round, and the direction, in the
// corner's frame, in which the ray left it. corner is -1 if there is none.
type origin struct {
	corner int32
	exit   float64
}

type sides struct{ left, right origin }

var noOrigin = origin{corner: -1}

// offer takes an arrival if it is earlier, but nothing weak over something that is not:
// what comes too late is mended once more is known, what comes too early spreads.
func (best *arrival) offer(a arrival) {
	if a.weak == best.weak && a.d < best.d || best.weak && !a.weak {
		*best = a
	}
}

func newFront(s *mesh.Surface, f *frames) *front {
	return &front{s: s, frame: f, at: make([]state, s.NumVertices)}
}

// start forgets the last wave and sets the sources: vertices, and edges as a whole.
func (w *front) start(vertices []int32, line []bool) {
	for v := range w.at {
		w.at[v] = state{arrival: nowhere}
	}
	w.line = line
	source := func(v int32) {
		w.at[v] = state{
			arrival: arrival{left: math.Inf(1), right: math.Inf(1), back: math.NaN(), sides: sides{noOrigin, noOrigin}},
			done:    true, fixed: true,
		}
	}
	for _, v := range vertices {
		source(v)
	}
	for h, on := range line {
		if on {
			source(w.s.Vert[h])
			source(w.s.Vert[next(int32(h))])
		}
	}
}

// nowhere is the state of a vertex that the front has not come to.
var nowhere = arrival{d: math.Inf(1), back: math.NaN(), sides: sides{noOrigin, noOrigin}, weak: true}

// sweep takes the vertices in the given order once, each from those before it.
func (w *front) sweep(order []int32) {
	for v := range w.at {
		w.at[v].done = w.at[v].fixed
	}
	for _, v := range order {
		if !w.at[v].fixed {
			a := w.arrive(v)
			w.at[v].arrival, w.at[v].done = a, !math.IsInf(a.d, 1)
		}
	}
}

// mend takes up whatever a vertex later in the order could have told an earlier one:
// values go down until none can. First weak ones, now that all is known, are found
// anew, and what lies behind those that came too early. It returns how many changed.
func (w *front) mend(order []int32) (changed int) {
	var queue vertexHeap
	queued := make([]bool, len(w.at))
	misled := make([]bool, len(w.at)) // a neighbour came too early
	try := func(v int32, anew bool) bool {
		now := &w.at[v]
		if now.fixed {
			return false
		}
		a := w.arrive(v)
		if !w.better(v, a, anew) && !(anew && misled[v] && a.d != now.d) {
			return false
		}
		later := a.d > now.d+w.slack(v)
		now.arrival, now.done = a, true
		changed++
		if later {
			for _, h := range w.frame.out(v) {
				misled[w.s.Vert[next(h)]], misled[w.s.Vert[prev(h)]] = true, true
			}
		}
		return true
	}
	wake := func(v int32) {
		for _, h := range w.frame.out(v) {
			for _, u := range [2]int32{w.s.Vert[next(h)], w.s.Vert[prev(h)]} {
				if !queued[u] && !w.at[u].fixed && w.at[u].d > w.at[v].d-w.s.Length[h] {
					queued[u] = true
					queue.push(w.at[v].d, u)
				}
			}
		}
	}
	// Most vertices stay: those are told apart first, all at once, against a state that
	// does not change meanwhile.
	stays := make([]bool, len(w.at))
	parallel.EachBlock(len(order), func(_, lo, hi int) {
		for _, v := range order[lo:hi] {
			stays[v] = w.at[v].fixed || !w.better(v, w.arrive(v), true)
		}
	})
	for _, v := range order {
		if (!stays[v] || misled[v]) && try(v, true) {
			wake(v)
		}
	}
	for looks := 0; len(queue) > 0 && looks < 60*len(w.at); looks++ {
		v := queue.pop()
		queued[v] = false
		if try(v, false) {
			wake(v)
		}
	}
	return changed
}

// better tells whether an arrival at v is to be taken in place of what is there: it is
// earlier, or what is there is weak and to be found anew.
func (w *front) better(v int32, a arrival, anew bool) bool {
	now := &w.at[v]
	return a.d < now.d-w.slack(v) || anew && now.weak && a.d != now.d
}

// slack is how much lower a value must be to be taken up: more than rounding, and more
// than the spread of equally good values on a curved skin, of which the least is no
// better than the first.
func (w *front) slack(v int32) float64 {
	if math.IsInf(w.at[v].d, 1) {
		return 0
	}
	return 1e-13*w.at[v].d + w.at[v].noise*w.frame.edge[v]
}

// arrive continues the front to vertex v: the least value over its triangles.
func (w *front) arrive(v int32) arrival {
	best := nowhere
	for _, h := range w.frame.out(v) {
		h1, h2 := next(h), prev(h)
		a, b := w.s.Vert[h1], w.s.Vert[h2]
		if w.at[a].done {
			w.alongEdge(&best, v, a, h, w.frame.at[h1]+w.frame.wide[h1], w.frame.at[h])
		}
		if w.at[b].done {
			w.alongEdge(&best, v, b, h2, w.frame.at[h2], w.frame.at[h]+w.frame.wide[h])
		}
		if w.at[a].done || w.at[b].done {
			w.throughEdge(&best, v, a, b, h)
		}
	}
	return best
}

// alongEdge takes the front from q along an edge to v. Where the ray to q runs on along
// that edge the front just goes on; if q is a corner that casts a shadow (a saddle, a
// re-entrant rim) the ray grazes it, and on the dark side the front is one that starts
// at q. It starts anew at q on both sides at a source and in the shadow, and indeed
// everywhere else: a path that bends at q is real, so its length can be too long, but
// never too short, and is kept only until something better comes.
func (w *front) alongEdge(best *arrival, v, q, edge int32, fromQ, fromV float64) {
	length := w.s.Length[edge]
	anew := origin{q, fromQ}
	if w.source(q) {
		anew = noOrigin
	}
	a := arrival{d: w.at[q].d + length, left: 1 / length, right: 1 / length, back: fromV, sides: sides{anew, anew}}
	if a.d >= best.d && !best.weak {
		return
	}
	if !w.source(q) {
		toLeft, toRight := w.ahead(q, edge, fromQ)
		tol := flatNoise + curvedNoise*w.at[q].noise
		straightLeft, straightRight := math.Abs(toLeft-math.Pi) <= tol, math.Abs(toRight-math.Pi) <= tol
		if straightRight || straightLeft && toRight < math.Pi {
			a.right, a.sides.right = w.at[q].right/max(1+w.at[q].right*length, 1e-9), w.at[q].sides.right
		}
		if straightLeft || straightRight && toLeft < math.Pi {
			a.left, a.sides.left = w.at[q].left/max(1+w.at[q].left*length, 1e-9), w.at[q].sides.left
		}
		if angle := min(toLeft, toRight); !straightLeft && !straightRight && angle < math.Pi {
			a.weak = true
			// Straightened, were there nothing in the way, it would be this much shorter.
			r := ray{kappa: max(w.at[q].left, w.at[q].right), ex: 1}
			sin, cos := math.Sincos(angle)
			if straight := r.at(length*cos, length*sin); straight < length { // NaN if its centre is q
				a.err = shadowDoubt * (length - straight)
			}
		}
	}
	a.left, a.right = w.bend(a.left, length, v), w.bend(a.right, length, v)
	a.noise = max(w.at[q].noise, w.frame.turning[v])
	a.err += w.at[q].err
	best.offer(a)
}

// source tells whether the front starts at q: it has no ray to it.
func (w *front) source(q int32) bool { return math.IsInf(w.at[q].left, 1) }

// ahead is the angle between the ray back at q and an edge there, which leaves at the
// given angle of q's frame: round the left side of the ray, and round the right.
func (w *front) ahead(q, edge int32, angle float64) (left, right float64) {
	if w.frame.kind[q] == odd {
		either := w.frame.search(w.s, q, w.at[q].back, edge, false)
		return either, either
	}
	return w.frame.turn(q, angle, w.at[q].back), w.frame.turn(q, w.at[q].back, angle)
}

// bend corrects the curvature of a front that reached v over the given length on a
// plane by what Gaussian curvature K does to it on the way: to first order in K, with
// J the Jacobi field, dκ = -K ∫ J² ds / J(v)².
func (w *front) bend(kappa, length float64, v int32) float64 {
	x := kappa * length
	return kappa - w.frame.curvature[v]*length*(1-x+x*x/3)
}

// throughEdge takes the front through the edge ab of the face (v, a, b) of h: v→a.
//
// Where both ends know the front, and one foretells what the other has, they are
// passed by the same front: its direction follows from d(a) and d(b), and its
// curvature from both. Where they disagree, two fronts meet between a and b (the
// cut locus) or one end lies in a shadow; then each goes on with what it knows alone.
func (w *front) throughEdge(best *arrival, v, a, b, h int32) {
	h1, h2 := next(h), prev(h)
	length, la, lb := w.s.Length[h1], w.s.Length[h], w.s.Length[h2]
	// The plane of the face: a = (0, 0), b = (length, 0), v = (x, y) above.
	tri := triangle{length: length, x: (length + (la-lb)*(la+lb)/length) / 2}
	tri.y = math.Sqrt(max(0, (la-tri.x)*(la+tri.x)))
	if tri.y == 0 {
		return
	}
	if w.line != nil && w.line[h1] {
		if tri.x >= 0 && tri.x <= length {
			kappa := w.bend(0, tri.y, v)
			best.offer(arrival{
				d: tri.y, left: kappa, right: kappa, back: w.frame.at[h] + tri.angleAtV(tri.x),
				noise: w.frame.turning[v], sides: sides{noOrigin, noOrigin},
			})
		}
		return
	}
	var ra, rb ray
	var knowsA, knowsB bool
	da, db, noise := math.Inf(1), math.Inf(1), w.frame.turning[v]
	if w.at[a].done {
		da, noise = w.at[a].d, max(noise, w.at[a].noise)
		ra, knowsA = w.rayAt(a, w.at[a].right, w.at[a].sides.right, w.gap(a, h1, w.at[a].back, w.frame.at[h1]), 0)
	}
	if w.at[b].done {
		db, noise = w.at[b].d, max(noise, w.at[b].noise)
		rb, knowsB = w.rayAt(b, w.at[b].left, w.at[b].sides.left, w.gap(b, h1, w.frame.at[h2]+w.frame.wide[h2], w.at[b].back), length)
	}
	if min(da, db) >= best.d && !best.weak {
		return // the front passes this edge when it is past v
	}
	pass := passage{v: v, h: h, tri: tri, noise: noise, near: min(da, db), weak: !w.at[a].done || !w.at[b].done}
	if pass.weak {
		if knowsA {
			w.offer(best, pass, ra, ra)
		}
		if knowsB {
			w.offer(best, pass, rb, rb)
		}
		return
	}
	tol := length*(flatNoise+curvedNoise*noise) + 1e-12*max(da, db)
	tooA, tooB := math.NaN(), math.NaN() // what each end foretells in excess at the other
	if knowsA {
		tooA = ra.at(length, 0) - db
	}
	if knowsB {
		tooB = rb.at(0, 0) - da
	}
	okA, okB := math.Abs(tooA) <= tol, math.Abs(tooB) <= tol
	okA = okA && ra.aim(db, length)
	okB = okB && rb.aim(da, -length)
	switch {
	case okA && okB:
		w.offer(best, pass, ra, rb)
	case okA:
		pass.doubt = halfDoubt * math.Abs(tooA)
		w.offer(best, pass, ra, ra)
	case okB:
		pass.doubt = halfDoubt * math.Abs(tooB)
		w.offer(best, pass, rb, rb)
	default:
		// An end that has more than the other end's front foretells lies in its shadow.
		switch {
		case !knowsA:
		case tooA < -tol:
			w.roundCorner(best, pass, ra, rb, knowsB, -1, tol)
		default:
			w.offer(best, pass, ra, ra)
		}
		switch {
		case !knowsB:
		case tooB < -tol:
			w.roundCorner(best, pass, rb, ra, knowsA, 1, tol)
		default:
			w.offer(best, pass, rb, rb)
		}
	}
}

// roundCorner offers v what comes to it where r, the front at one end of the edge, has
// the other end in its shadow: the front there has turned round corners, and which of
// them v is lit by tells their string. side is 1 if the corners lie on the left of r
// (the dark end is a), -1 if on the right.
//
// The corners are laid into the plane one by one, backwards from the dark end: the ray
// back at a corner, the length to the one before, and the angle that the string makes
// there on the lit side are known. v is lit by the first that sees it past the next.
func (w *front) roundCorner(best *arrival, p passage, r, dark ray, known bool, side, tol float64) {
	if !known || !(dark.kappa > 0) {
		return // nothing is known of what stands between
	}
	past := func(x, y float64) bool { // v is on the lit side of the ray of r past (x, y)
		dx, dy := r.kappa*(x-r.x)-r.ex, r.kappa*y-r.ey
		return side*(dx*(p.tri.y-y)-dy*(p.tri.x-x)) <= 0
	}
	var lit corner // the one that v is lit by
	known = false  // whether that has been found
	at := corner{dark.from, dark.x + dark.ex/dark.kappa, dark.ey / dark.kappa, dark.x, 0}
	first, reached := at, dark.d
	const mostCorners = 200
	for range mostCorners {
		c := at.from.corner
		if c < 0 || math.Abs(w.at[c].d+math.Hypot(at.ax-at.x, at.ay-at.y)-reached) > 4*tol {
			break // not a string of corners, or one of them has been reached another way since
		}
		reached = w.at[c].d
		if math.Abs(r.at(at.x, at.y)-w.at[c].d) <= 4*tol { // on the front of r itself
			if past(at.x, at.y) {
				w.offer(best, p, r, r)
				return
			}
			if !known {
				lit = at
			}
			w.offerCorner(best, p, lit, max(r.err, dark.err))
			return
		}
		before, kappa, gap := w.at[c].sides.left, w.at[c].left, 0.0
		if side > 0 {
			gap = w.frame.turn(c, w.at[c].back, at.from.exit)
		} else {
			before, kappa = w.at[c].sides.right, w.at[c].right
			gap = w.frame.turn(c, at.from.exit, w.at[c].back)
		}
		if !(gap < 3*math.Pi) || !(kappa > 0) || math.IsInf(kappa, 1) {
			break
		}
		// The ray back at the corner: the string's direction, turned by gap on the lit side.
		sin, cos := math.Sincos(-side * gap)
		length := math.Hypot(at.ax-at.x, at.ay-at.y)
		ux, uy := (at.ax-at.x)/length, (at.ay-at.y)/length
		bx, by := ux*cos-uy*sin, ux*sin+uy*cos
		if !known && side*(-bx*(p.tri.y-at.y)+by*(p.tri.x-at.x)) > 0 {
			lit, known = at, true
		}
		at = corner{before, at.x + bx/kappa, at.y + by/kappa, at.x, at.y}
	}
	if past(first.x, first.y) { // what stands next to the dark end will do, for want of better
		p.doubt = shadowDoubt * (dark.d - r.at(dark.x, 0))
		w.offer(best, p, r, r)
	}
}

// A corner that a front has turned round, laid into the plane of a face at (x, y); its
// front left it towards (ax, ay), which is where from.exit points in its own frame.
type corner struct {
	from         origin
	x, y, ax, ay float64
}

// offerCorner takes what a front that starts anew at the corner foretells at v.
func (w *front) offerCorner(best *arrival, p passage, c corner, err float64) {
	dx, dy := p.tri.x-c.x, p.tri.y-c.y
	radius := math.Hypot(dx, dy)
	value := w.at[c.from.corner].d + radius
	x := c.x - dx*c.y/dy
	if value >= best.d && !best.weak || c.y >= 0 || x < -rim*p.tri.length || x > (1+rim)*p.tri.length {
		return
	}
	c.from.exit += math.Atan2((c.ax-c.x)*dy-(c.ay-c.y)*dx, (c.ax-c.x)*dx+(c.ay-c.y)*dy)
	kappa := w.bend(1/radius, math.Hypot(x-p.tri.x, p.tri.y), p.v)
	best.offer(arrival{
		d: value, left: kappa, right: kappa, back: w.frame.at[p.h] + p.tri.angleAtV(x),
		noise: p.noise, err: err, sides: sides{c.from, c.from}, weak: p.weak,
	})
}

// gap is the angle at q, counter-clockwise, between the ray back and an edge that the
// front may enter a face through; from and to are those two in q's frame.
func (w *front) gap(q, edge int32, from, to float64) float64 {
	if w.frame.kind[q] == odd {
		return w.frame.search(w.s, q, w.at[q].back, edge, true)
	}
	return w.frame.turn(q, from, to)
}

// A passage is one way that the front may come to v: through the far edge of the face
// of h.
type passage struct {
	v, h  int32
	tri   triangle
	noise float64
	near  float64 // distance of the nearer end of the edge
	weak  bool    // one end of the edge is not known yet
	doubt float64 // what a value on the word of one end may be off by
}

// offer takes what the ray r foretells at v (or its mean with the ray s of the other
// end) if it crosses the edge.
func (w *front) offer(best *arrival, p passage, r, s ray) {
	x, ok := r.crossing(p.tri)
	if !ok {
		return
	}
	value, kappa := r.reach(p.tri)
	err := r.err + p.doubt
	if s != r {
		xs, ok := s.crossing(p.tri)
		if !ok {
			return
		}
		// Weighted by nearness to the crossing: each end knows the front best near itself.
		x = (x + xs) / 2
		share := 1 - min(max(x/p.tri.length, 0), 1)
		other, otherKappa := s.reach(p.tri)
		err = share*r.err + (1-share)*s.err + math.Abs(value-other)
		value = share*value + (1-share)*other
		kappa = share*kappa + (1-share)*otherKappa
	}
	if value >= best.d && !best.weak || p.near >= value {
		return // an edge farther than v may have its front from v
	}
	from := r.from
	if s.from.corner >= 0 && x > p.tri.length/2 {
		r, from = s, s.from
	}
	if from.corner >= 0 {
		from.exit += r.angleFrom(p.tri)
	}
	kappa = w.bend(kappa, math.Hypot(x-p.tri.x, p.tri.y), p.v)
	best.offer(arrival{
		d: value, left: kappa, right: kappa, back: w.frame.at[p.h] + p.tri.angleAtV(x),
		noise: p.noise, err: err, sides: sides{from, from}, weak: p.weak,
	})
}

// triangle is a face laid into the plane: a = (0, 0), b = (length, 0), v = (x, y).
type triangle struct{ length, x, y float64 }

// angleAtV is the angle at v from the corner a to the point x on the edge ab.
func (t triangle) angleAtV(x float64) float64 {
	return math.Atan2(t.y*x, t.x*(t.x-x)+t.y*t.y)
}

// A ray is the front near one end of an edge ab, in the frame of the face beyond: it
// passed (x, 0) at d with curvature kappa, coming from direction (ex, ey), ey < 0.
type ray struct {
	d, kappa, x, ex, ey, err float64
	from                     origin
}

// rayAt lays the front at q, which is at (x, 0), into the frame of a face that it
// enters through an edge. gap is the angle at q between the ray back and that edge, on
// the far side. It is not known where the ray does not come through the edge, and at
// sources.
func (w *front) rayAt(q int32, kappa float64, from origin, gap, x float64) (r ray, known bool) {
	if !(gap < math.Pi) || math.IsInf(kappa, 1) { // NaN: no direction
		return ray{}, false
	}
	sin, cos := math.Sincos(gap)
	if x > 0 {
		cos = -cos
	}
	return ray{d: w.at[q].d, kappa: kappa, x: x, ex: cos, ey: -sin, err: w.at[q].err, from: from}, true
}

// at is the distance that the ray foretells at (x, y).
func (r ray) at(x, y float64) float64 {
	x -= r.x
	return r.d + (r.kappa*(x*x+y*y)-2*(r.ex*x+r.ey*y))/(math.Hypot(r.ex-r.kappa*x, r.ey-r.kappa*y)+1)
}

// aim turns the ray so that it foretells the value other at the edge's other end,
// which is at the given signed distance; false if no direction does.
func (r *ray) aim(other, length float64) bool {
	rise := other - r.d
	e := (r.kappa*length*length - rise*(2+r.kappa*rise)) / (2 * length)
	if !(math.Abs(e) < 1) {
		return false
	}
	r.ex, r.ey = e, -math.Sqrt((1-e)*(1+e))
	return true
}

// crossing is where on the edge the ray to v passes; false if it passes beside it.
func (r ray) crossing(t triangle) (x float64, ok bool) {
	ahead := r.kappa*t.y - r.ey
	if !(ahead > 0) {
		return 0, false // the front converges before it gets to v
	}
	x = r.x + (r.ex*t.y-r.ey*(t.x-r.x))/ahead
	return x, x >= -rim*t.length && x <= (1+rim)*t.length
}

// reach is the distance that the ray foretells at v, and the front's curvature there
// as long as all is flat.
func (r ray) reach(t triangle) (value, kappa float64) {
	x := t.x - r.x
	rho := math.Hypot(r.ex-r.kappa*x, r.ey-r.kappa*t.y)
	value = r.d + (r.kappa*(x*x+t.y*t.y)-2*(r.ex*x+r.ey*t.y))/(rho+1)
	return value, r.kappa / max(rho, 1e-9)
}

// angleFrom is the angle, at the ray's centre, from the ray to v, counter-clockwise.
func (r ray) angleFrom(t triangle) float64 {
	dx, dy := r.kappa*(t.x-r.x)-r.ex, r.kappa*t.y-r.ey
	return math.Atan2(-r.ex*dy+r.ey*dx, -r.ex*dx-r.ey*dy)
}

func next(h int32) int32 {
	if h%3 == 2 {
		return h - 2
	}
	return h + 1
}

func prev(h int32) int32 {
	if h%3 == 0 {
		return h + 2
	}
	return h - 1
}
