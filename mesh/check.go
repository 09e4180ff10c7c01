package mesh

import "math"

// A Report is what Check found. Lengths are in the file's unit, angles in degrees.
type Report struct {
	File   string `json:"file,omitempty"`
	Format string `json:"format,omitempty"`
	SHA256 string `json:"sha256,omitempty"`

	Vertices         int     `json:"vertices"`
	IsolatedVertices int     `json:"isolated_vertices"` // in no triangle of positive area
	Edges            int     `json:"edges"`             // of faces with three different corners
	Faces            int     `json:"faces"`
	Components       int     `json:"components"` // pieces that share no vertex
	Area             float64 `json:"area"`
	Box              Box     `json:"bounding_box"`

	BoundaryEdges       int          `json:"boundary_edges"`
	BoundaryLoops       []LoopReport `json:"boundary_loops"` // in the order that numbers them
	EulerCharacteristic int          `json:"euler_characteristic"`
	Orientable          bool         `json:"orientable"`
	Genus               *int         `json:"genus"` // handles, all components together; null unless orientable and manifold

	EdgeLength *Spread `json:"edge_length"`
	Angle      *Spread `json:"angle_degrees"` // of triangles' corners
	Bend       *Spread `json:"bend_degrees"`  // of edges with two faces or more; null if there are none

	InconsistentEdges   int `json:"inconsistent_edges"`    // two faces that run along it the same way
	ReversedFaces       int `json:"reversed_faces"`        // fewest to turn for one orientation, where there is one
	NonManifoldEdges    int `json:"non_manifold_edges"`    // more than two faces
	NonManifoldVertices int `json:"non_manifold_vertices"` // faces around them hang together nowhere else
	DuplicateFaces      int `json:"duplicate_faces"`       // three corners of an earlier one
	RepeatedCorners     int `json:"repeated_corner_faces"`
	FlatFaces           int `json:"zero_area_faces"` // three different corners, no area
	FoldedEdges         int `json:"folded_edges"`    // bent by more than 179 degrees
	Slivers             int `json:"sliver_faces"`    // an angle below 1 degree
	NonDelaunayEdges    int `json:"non_delaunay_edges"`

	CoincidentVertices int     `json:"coincident_boundary_vertices"` // those that --weld 0 would join
	WeldTolerance      float64 `json:"weld_tolerance"`               // a length below all boundary edges...
	WeldJoins          int     `json:"weld_joins"`                   // ...and how many boundary vertices it would join

	FitForDistance bool     `json:"fit_for_distance"`
	FitForHeat     bool     `json:"fit_for_heat"`
	Verdict        string   `json:"verdict"`
	Findings       []string `json:"findings"`
	Advice         []string `json:"advice"`
}

// Box is what a part extends over; zero for a mesh without faces.
type Box struct {
	Min [3]float64 `json:"min"`
	Max [3]float64 `json:"max"`
}

// LoopReport is a boundary loop without its vertices.
type LoopReport struct {
	Vertices    int     `json:"vertices"`
	Length      float64 `json:"length"`
	FirstVertex int32   `json:"first_vertex"` // the smallest number in it
	Open        bool    `json:"open,omitempty"`
}

const (
	foldDegrees   = 179.0
	sliverDegrees = 1.0
	// delaunaySlack is how far above a half turn two opposite angles must add up to:
	// the right angles of a square grid, rounded to single precision, do not count.
	delaunaySlack = 1e-6
)

// Check measures a mesh and judges it. It accepts any mesh. O(n log n) at most where
// boundary vertices are looked at in pairs, else O(n): 1 s for 1.3 million faces.
func Check(m *Mesh) *Report {
	r := &Report{
		File: m.File.Name, Format: m.File.Format, SHA256: m.File.SHA256,
		Vertices: m.NumVertices(), Faces: m.NumTriangles(),
		BoundaryLoops: []LoopReport{}, Findings: []string{}, Advice: []string{},
	}
	// Parts beyond what can be squared are measured in another unit.
	outOfRange := m.checkRange()
	unit := 1.0
	if outOfRange != nil {
		m, unit = m.rescaled()
	}
	c := checker{m: m, r: r, glued: glue(m.Triangles, m.NumVertices())}
	c.countFaces()
	c.orientation()
	c.connection()
	c.shape()
	c.loops()
	c.weldHint()
	r.inUnit(unit)
	r.judge(outOfRange, c.componentsWelded())
	return r
}

// checker is one mesh under examination.
type checker struct {
	m     *Mesh
	r     *Report
	glued []int32
	rim   []int32 // vertices on boundary loops
	piece disjoint
}

// proper tells whether face f has three different corners.
func (c *checker) proper(f int32) bool {
	t := c.m.Triangles[3*f : 3*f+3]
	return t[0] != t[1] && t[1] != t[2] && t[2] != t[0]
}

// countFaces counts edges and odd faces.
func (c *checker) countFaces() {
	t, r := c.m.Triangles, c.r
	hasValue := make([]bool, c.m.NumVertices())
	for f := range int32(c.m.NumTriangles()) {
		u, v, w := t[3*f], t[3*f+1], t[3*f+2]
		switch {
		case !c.proper(f):
			r.RepeatedCorners++
			continue
		case hasArea(c.m.Positions, u, v, w):
			hasValue[u], hasValue[v], hasValue[w] = true, true, true
		default:
			r.FlatFaces++
		}
		for h := 3 * f; h < 3*f+3; h++ {
			if c.glued[h] == h {
				r.BoundaryEdges++
			}
		}
	}
	for _, has := range hasValue {
		if !has {
			r.IsolatedVertices++
		}
	}
	inner := 0
	eachInnerEdge(c.glued, func(h int32) {
		inner++
		o := c.glued[h]
		switch {
		case c.glued[o] != h:
			r.NonManifoldEdges++
		case t[h] == t[o]:
			r.InconsistentEdges++
		}
	})
	r.Edges = r.BoundaryEdges + inner
	r.DuplicateFaces = c.duplicates()
}

// duplicates counts faces that have the corners of an earlier one. Such faces meet
// on all three edges: only where one glued edge leads to the same third corner is
// the table asked.
func (c *checker) duplicates() (count int) {
	t := c.m.Triangles
	seen := map[[3]int32]bool{}
	for f := range int32(c.m.NumTriangles()) {
		h := 3 * f
		o := c.glued[h]
		if o == h || c.glued[o] == h && t[prev(o)] != t[prev(h)] {
			continue
		}
		u, v, w := t[h], t[h+1], t[h+2]
		least, most := min(u, v, w), max(u, v, w)
		key := [3]int32{least, u ^ v ^ w ^ least ^ most, most}
		if seen[key] {
			count++
		}
		seen[key] = true
	}
	return count
}

// orientation walks over edges with two faces and sees whether faces can be turned
// to agree, and how many would have to be.
func (c *checker) orientation() {
	t := c.m.Triangles
	c.r.Orientable = true
	const kept, turned = 1, 2
	side := make([]int8, c.m.NumTriangles())
	var stack []int32
	for first := range int32(len(side)) {
		if side[first] != 0 {
			continue
		}
		side[first] = kept
		stack = append(stack[:0], first)
		faces, other := 0, 0
		for len(stack) > 0 {
			f := stack[len(stack)-1]
			stack = stack[:len(stack)-1]
			faces++
			if side[f] == turned {
				other++
			}
			for h := 3 * f; h < 3*f+3; h++ {
				o := c.glued[h]
				if o == h || c.glued[o] != h {
					continue
				}
				want := side[f]
				if t[h] == t[o] {
					want = kept + turned - want
				}
				switch g := o / 3; side[g] {
				case 0:
					side[g] = want
					stack = append(stack, g)
				case want:
				default:
					c.r.Orientable = false
				}
			}
		}
		c.r.ReversedFaces += min(other, faces-other)
	}
	if !c.r.Orientable {
		c.r.ReversedFaces = 0
	}
}

// connection counts components and pinched vertices, and takes Euler's sum.
func (c *checker) connection() {
	t, n := c.m.Triangles, c.m.NumVertices()
	c.piece = newDisjoint(n)
	used := make([]bool, n)
	proper := 0
	for f := range int32(c.m.NumTriangles()) {
		if c.proper(f) {
			proper++
			u, v, w := t[3*f], t[3*f+1], t[3*f+2]
			used[u], used[v], used[w] = true, true, true
			c.piece.union(u, v)
			c.piece.union(v, w)
		}
	}
	vertices := 0
	for v := range int32(n) {
		if used[v] {
			vertices++
			if c.piece.find(v) == v {
				c.r.Components++
			}
		}
	}
	c.r.EulerCharacteristic = vertices - c.r.Edges + proper

	// Corners of one vertex that hang together over edges make one fan.
	corners := newDisjoint(len(t))
	for h, o := range c.glued {
		h := int32(h)
		if o == h {
			continue
		}
		a, b := o, next(o) // the corners of o at h's ends
		if t[a] != t[h] {
			a, b = b, a
		}
		corners.union(h, a)
		corners.union(next(h), b)
	}
	fans := make([]int8, n)
	for h, v := range t {
		if c.proper(int32(h/3)) && corners.find(int32(h)) == int32(h) {
			if fans[v]++; fans[v] == 2 {
				c.r.NonManifoldVertices++
			} else if fans[v] > 2 {
				fans[v] = 3
			}
		}
	}
}

// shape measures lengths, angles, bends and areas.
func (c *checker) shape() {
	t, x := c.m.Triangles, c.m.Positions
	angles := make([]float64, len(t)) // by corner
	lengths := make([]float64, 0, c.r.Edges)
	lo, hi := emptyBox()
	for f := range int32(c.m.NumTriangles()) {
		if !c.proper(f) {
			continue
		}
		h := 3 * f
		p, q, r := point3(x, t[h]), point3(x, t[h+1]), point3(x, t[h+2])
		for axis := range lo {
			lo[axis] = min(lo[axis], p[axis], q[axis], r[axis])
			hi[axis] = max(hi[axis], p[axis], q[axis], r[axis])
		}
		pq, qr, rp := minus3(q, p), minus3(r, q), minus3(p, r)
		double := length3(cross3(pq, rp))
		c.r.Area += double / 2
		angles[h] = math.Atan2(double, -dot3(pq, rp))
		angles[h+1] = math.Atan2(double, -dot3(pq, qr))
		angles[h+2] = math.Atan2(double, -dot3(qr, rp))
		if min(angles[h], angles[h+1], angles[h+2]) < sliverDegrees*math.Pi/180 {
			c.r.Slivers++
		}
		for k, e := range [3][3]float64{pq, qr, rp} {
			if c.glued[h+int32(k)] == h+int32(k) {
				lengths = append(lengths, length3(e))
			}
		}
	}
	if lo[0] <= hi[0] {
		c.r.Box = Box{Min: lo, Max: hi}
	}
	bend := bends(c.m, c.glued)
	bent := make([]float64, 0, len(bend)/2)
	eachInnerEdge(c.glued, func(h int32) {
		lengths = append(lengths, dist(x, t[h], t[next(h)]))
		degrees := bend[h] * 180 / math.Pi
		bent = append(bent, degrees)
		if degrees > foldDegrees {
			c.r.FoldedEdges++
		}
		if o := c.glued[h]; c.glued[o] == h && angles[prev(h)]+angles[prev(o)] > math.Pi+delaunaySlack {
			c.r.NonDelaunayEdges++
		}
	})
	kept := angles[:0]
	for h, a := range angles {
		if c.proper(int32(h / 3)) {
			kept = append(kept, a*180/math.Pi)
		}
	}
	if len(kept) > 0 {
		c.r.Angle = spread(kept)
		c.r.EdgeLength = spread(lengths)
	}
	if len(bent) > 0 {
		c.r.Bend = spread(bent)
	}
}

// loops lists the boundary and, where all is well enough, counts the handles.
func (c *checker) loops() {
	r := c.r
	for _, l := range boundaryLoops(c.m, c.glued) {
		r.BoundaryLoops = append(r.BoundaryLoops, LoopReport{
			Vertices: len(l.Vertices), Length: l.Length, FirstVertex: l.Vertices[0], Open: l.Open,
		})
		c.rim = append(c.rim, l.Vertices...)
	}
	if r.Orientable && r.NonManifoldEdges == 0 && r.NonManifoldVertices == 0 {
		genus := (2*r.Components - r.EulerCharacteristic - len(r.BoundaryLoops)) / 2
		r.Genus = &genus
	}
}

// weldHint looks for boundary vertices that lie on each other, or nearly so: cracks
// that the file did not mean, or slits that it did.
func (c *checker) weldHint() {
	if len(c.rim) == 0 {
		return
	}
	// Vertices in two loops count once.
	seen := make(map[int32]bool, len(c.rim))
	points := make([]float64, 0, 3*len(c.rim))
	vertices := c.rim[:0]
	for _, v := range c.rim {
		if !seen[v] {
			seen[v] = true
			vertices = append(vertices, v)
			points = append(points, c.m.Positions[3*v:3*v+3]...)
		}
	}
	number := make([]int32, len(vertices))
	distinct := weldExactly(number, points, nil)
	c.r.CoincidentVertices = len(vertices) - len(distinct)/3

	size := 0.0
	for axis := range 3 {
		size = max(size, c.r.Box.Max[axis]-c.r.Box.Min[axis])
	}
	shortest := math.Inf(1)
	for h, o := range c.glued {
		if h := int32(h); o == h && c.proper(h/3) {
			if l := dist(c.m.Positions, c.m.Triangles[h], c.m.Triangles[next(h)]); l > 0 {
				shortest = min(shortest, l)
			}
		}
	}
	c.r.WeldTolerance = min(1e-5*size, shortest/4)
	root := joinNear(points, c.r.WeldTolerance)
	for i, first := range root {
		if int(first) != i {
			c.r.WeldJoins++
			c.piece.union(vertices[i], vertices[first])
		}
	}
}

// componentsWelded is the number of components were the hint followed.
func (c *checker) componentsWelded() (count int) {
	seen := make(map[int32]bool)
	for f := range int32(c.m.NumTriangles()) {
		if c.proper(f) {
			if v := c.piece.find(c.m.Triangles[3*f]); !seen[v] {
				seen[v] = true
				count++
			}
		}
	}
	return count
}

// rescaled is m in a unit in which it measures about 1, and that unit.
func (m *Mesh) rescaled() (*Mesh, float64) {
	largest := 0.0
	for _, x := range m.Positions {
		largest = max(largest, math.Abs(x))
	}
	_, exponent := math.Frexp(largest)
	positions := make([]float64, len(m.Positions))
	for i, x := range m.Positions {
		positions[i] = math.Ldexp(x, -exponent)
	}
	return &Mesh{Positions: positions, Triangles: m.Triangles, File: m.File}, math.Ldexp(1, exponent)
}

// inUnit turns lengths that were measured in another unit into the file's. What
// would be infinite is the largest number: JSON knows no infinity.
func (r *Report) inUnit(unit float64) {
	if unit == 1 {
		return
	}
	scale := func(x *float64, times int) {
		for range times {
			*x = max(-math.MaxFloat64, min(math.MaxFloat64, *x*unit))
		}
	}
	scale(&r.Area, 2)
	scale(&r.WeldTolerance, 1)
	for axis := range 3 {
		scale(&r.Box.Min[axis], 1)
		scale(&r.Box.Max[axis], 1)
	}
	for i := range r.BoundaryLoops {
		scale(&r.BoundaryLoops[i].Length, 1)
	}
	if e := r.EdgeLength; e != nil {
		for _, x := range []*float64{&e.Min, &e.P1, &e.P25, &e.Median, &e.P75, &e.P99, &e.Max, &e.Mean} {
			scale(x, 1)
		}
	}
}
