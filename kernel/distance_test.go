package kernel

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

const degree = math.Pi / 180

// flatTol is the relative error allowed where faces are flat: a front that crosses some
// hundreds of triangles, each an unfolding good to a few ulps.
const flatTol = 1e-11

// placed is m as a surface with the data on it, Delaunay flips included, and its solver.
func placed(t testing.TB, m *mesh.Mesh, data ...mesh.Datum) (*mesh.Surface, *Solver) {
	t.Helper()
	return prepared(t, m, false, data)
}

// resolved is placed on faces cut where the tessellation is coarse, as the command
// cuts them by default.
func resolved(t testing.TB, m *mesh.Mesh, data ...mesh.Datum) (*mesh.Surface, *Solver) {
	t.Helper()
	return prepared(t, m, true, data)
}

func prepared(t testing.TB, m *mesh.Mesh, resolve bool, data []mesh.Datum) (*mesh.Surface, *Solver) {
	t.Helper()
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	if resolve {
		m, data = refinedFor(t, m, FrontEdge(s), data)
		if s, err = mesh.NewSurface(m); err != nil {
			t.Fatal(err)
		}
	}
	if err := s.Place(data); err != nil {
		t.Fatal(err)
	}
	s.Delaunay(s.NumVertices)
	v, err := NewSolver(context.Background(), s, Options{})
	if err != nil {
		t.Fatal(err)
	}
	return s, v
}

// refinedFor cuts the faces of m and finds the data, vertices and points, on the pieces.
func refinedFor(t testing.TB, m *mesh.Mesh, edge float64, data []mesh.Datum) (*mesh.Mesh, []mesh.Datum) {
	t.Helper()
	fine, err := mesh.Refine(context.Background(), m, edge, 1000000)
	if err != nil {
		t.Fatal(err)
	}
	pieces := mesh.NewLocator(fine)
	data = slices.Clone(data)
	for i, d := range data {
		if d.Point != nil {
			place, _ := pieces.Nearest(m.Position(*d.Point))
			data[i] = mesh.AtPoint(place)
		}
	}
	return fine, data
}

// field is the distance of every vertex of m from the nearest of the data.
func field(t testing.TB, m *mesh.Mesh, data ...mesh.Datum) []float64 {
	t.Helper()
	_, v := placed(t, m, data...)
	return ask(t, v, nil)[:m.NumVertices()]
}

func ask(t testing.TB, v *Solver, which []int) []float64 {
	t.Helper()
	res, err := v.Distance(context.Background(), which, DistanceOptions{})
	if err != nil {
		t.Fatal(err)
	}
	return res.Distance
}

// exactly is the exact distance over the flat triangles, from mesh/geodesic.
func exactly(t testing.TB, m *mesh.Mesh, data ...mesh.Datum) []float64 {
	t.Helper()
	d, err := geodesic.Field(context.Background(), m, data, geodesic.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// A misfit is how far a field is off, relative to what it should be, over all vertices
// at a positive distance.
type misfit struct {
	mean, most float64
	at         int // the vertex of the largest
}

func compare(got []float64, want func(v int) float64) (m misfit) {
	count := 0
	for v, d := range got {
		w := want(v)
		if !(w > 0) || math.IsInf(w, 1) && math.IsInf(d, 1) {
			continue
		}
		e := math.Abs(d-w) / w
		m.mean += e
		count++
		if !(e <= m.most) {
			m.most, m.at = e, v
		}
	}
	m.mean /= float64(count)
	return m
}

func (m misfit) String() string {
	return fmt.Sprintf("mean %.3g %%, largest %.3g %% at vertex %d", 100*m.mean, 100*m.most, m.at)
}

func spot(m *mesh.Mesh, v int) [3]float64 { return [3]float64(m.Positions[3*v : 3*v+3]) }

func apart3(p, q [3]float64) float64 {
	return math.Hypot(math.Hypot(p[0]-q[0], p[1]-q[1]), p[2]-q[2])
}

// Flat faces, whatever the triangles: the front is unfolded and only rounding is left.
func TestDistanceIsExactOnFlatFaces(t *testing.T) {
	t.Run("square", func(t *testing.T) { // straight lines
		t.Parallel()
		for _, n := range []int{100, 200} {
			m := meshtest.Plate(1, 1, n, n, 0.24, 2)
			from := n/3*(n+1) + n/2
			flatMatch(t, m, field(t, m, mesh.AtVertex(int32(from))), func(v int) float64 { return apart3(spot(m, v), spot(m, from)) })
		}
	})
	t.Run("stretched-square", func(t *testing.T) { // triangles 30 times longer than wide
		t.Parallel()
		m := meshtest.Plate(1, 30, 60, 60, 0.24, 2)
		flatMatch(t, m, field(t, m, mesh.AtVertex(1830)), func(v int) float64 { return apart3(spot(m, v), spot(m, 1830)) })
	})
	t.Run("box", func(t *testing.T) { // 45 000 vertices, from the middle of a face
		t.Parallel()
		m := meshtest.Box(2, 1, 0.5, [3]int{160, 80, 40}, 0.24, 3)
		want := exactly(t, m, mesh.AtVertex(20000))
		flatMatch(t, m, field(t, m, mesh.AtVertex(20000)), func(v int) float64 { return want[v] })
	})
	t.Run("book", func(t *testing.T) { // three faces at every edge of the spine: any two pages unfold to a plane
		t.Parallel()
		const n, from = 24, 300
		m := meshtest.Book(3, n)
		page := func(v int) int { return (v - (n + 1)) / (n * (n + 1)) } // of vertices beyond the spine
		across := func(v int) float64 { return math.Hypot(spot(m, v)[0], spot(m, v)[1]) }
		flatMatch(t, m, field(t, m, mesh.AtVertex(from)), func(v int) float64 {
			over := across(from) + across(v)
			if v <= n || page(v) == page(from) {
				over = math.Abs(across(from) - across(v))
			}
			if v <= n {
				over = across(from)
			}
			return math.Hypot(over, spot(m, from)[2]-spot(m, v)[2])
		})
	})
	t.Run("tube", func(t *testing.T) { // 5 000 edges long: t = h² would leave double precision
		t.Parallel()
		const sides, rows = 12, 5000
		side := 2 * math.Sin(math.Pi/sides)
		m := meshtest.Cylinder(1, side*rows, sides, rows, 0.2, 3)
		_, solver := placed(t, m, mesh.AtVertex(0))
		res, err := solver.Distance(context.Background(), nil, DistanceOptions{})
		if err != nil {
			t.Fatal(err)
		}
		flatMatch(t, m, res.Distance[:m.NumVertices()], func(v int) float64 {
			column := v / (rows + 1)
			return math.Hypot(side*float64(min(column, sides-column)), spot(m, v)[2]-spot(m, 0)[2])
		})
		// u falls like exp(-d/√t) and has to stay above 1e-308 = exp(-709).
		if reach := side * rows / math.Sqrt(res.Times[0]); !(reach < 700) {
			t.Errorf("the tube is %.0f times √t long, want less than 700", reach)
		}
	})
}

func flatMatch(t *testing.T, m *mesh.Mesh, got []float64, want func(v int) float64) {
	t.Helper()
	if miss := compare(got, want); !(miss.most <= flatTol) {
		t.Errorf("%d vertices: %v (got %v, want %v)", m.NumVertices(), miss, got[miss.at], want(miss.at))
	}
}

// A whole edge sends its front out in parallel lines, so d is exact beside it too.
func TestDistanceFromWholeEdges(t *testing.T) {
	t.Parallel()
	t.Run("plate", func(t *testing.T) { // from the side y = 0 the distance is y
		m := meshtest.Plate(2, 1, 60, 30, 0.24, 5)
		var side [][2]int32
		for i := range int32(60) {
			side = append(side, [2]int32{i * 31, (i + 1) * 31})
		}
		flatMatch(t, m, field(t, m, mesh.AtEdges(side)), func(v int) float64 { return spot(m, v)[1] })
	})
	t.Run("part-of-a-side", func(t *testing.T) { // a segment: parallel in front, circles round its ends
		m := meshtest.Plate(2, 1, 60, 30, 0.24, 5)
		var side [][2]int32
		for i := int32(20); i < 40; i++ {
			side = append(side, [2]int32{i * 31, (i + 1) * 31})
		}
		low, high := spot(m, 20*31)[0], spot(m, 40*31)[0]
		flatMatch(t, m, field(t, m, mesh.AtEdges(side)), func(v int) float64 {
			p := spot(m, v)
			return math.Hypot(max(0, low-p[0], p[0]-high), p[1])
		})
	})
	t.Run("crease", func(t *testing.T) { // an edge of a box, against exact propagation
		m := meshtest.Box(2, 1, 0.5, [3]int{48, 24, 12}, 0.24, 3)
		var edge [][2]int32
		for _, e := range mesh.Creases(m, 30) {
			if p, q := spot(m, int(e[0])), spot(m, int(e[1])); p[1]+q[1]+p[2]+q[2] == 0 {
				edge = append(edge, e)
			}
		}
		if len(edge) != 48 {
			t.Fatalf("the crease has %d edges, want 48", len(edge))
		}
		want := exactly(t, m, mesh.AtEdges(edge))
		flatMatch(t, m, field(t, m, mesh.AtEdges(edge)), func(v int) float64 { return want[v] })
	})
	t.Run("rim", func(t *testing.T) { // the outer rim of a flat ring: a polygon, so distance to its nearest side
		m := meshtest.Frustum(90*degree, 0.5, 2, 48, 24)
		loop := mesh.BoundaryLoops(m)[0]
		want := exactly(t, m, mesh.AtEdges(loop.Edges()))
		flatMatch(t, m, field(t, m, mesh.AtEdges(loop.Edges())), func(v int) float64 { return want[v] })
	})
	t.Run("hole", func(t *testing.T) { // and its inner rim, whose corners point into the ring
		m := meshtest.Frustum(90*degree, 0.5, 2, 48, 24)
		loop := mesh.BoundaryLoops(m)[1]
		want := exactly(t, m, mesh.AtEdges(loop.Edges()))
		flatMatch(t, m, field(t, m, mesh.AtEdges(loop.Edges())), func(v int) float64 { return want[v] })
	})
}

// Points inside triangles and on edges are sources like any other.
func TestDistanceFromPointsInside(t *testing.T) {
	t.Parallel()
	m := meshtest.Plate(1, 1, 20, 20, 0.24, 2)
	for i, w := range [][3]float64{{1. / 3, 1. / 3, 1. / 3}, {0.98, 0.01, 0.01}, {0.5, 0.5, 0}, {0.1, 1e-6, 0.9 - 1e-6}, {1e-4, 1e-4, 1 - 2e-4}} {
		p := mesh.Point{Triangle: int32(301 + i), Weights: w}
		at := m.Position(p)
		for v, d := range field(t, m, mesh.AtPoint(p)) {
			// Not relative: a point a millionth of an edge from a corner or an edge cuts needles
			// whose lengths are good to rounding of the edge, not of themselves.
			if want := apart3(spot(m, v), at); !(math.Abs(d-want) <= flatTol) {
				t.Fatalf("point %d, vertex %d: got %v, want %v", i, v, d, want)
			}
		}
	}
}

// medley is what fronts meet with: corners, curvature, noise and a rim. All of it is
// jittered, so that no four vertices lie on a circle and flips have no ties to break.
func medley() *mesh.Mesh {
	return meshtest.Join(scanned(meshtest.Box(2, 1, 0.5, [3]int{24, 12, 6}, 0.24, 3), 0.003), meshtest.ShakenSphere(4, 2),
		meshtest.Paraboloid(1, 24, 0.24, 1), meshtest.SlitPlate(12, 0.5, 1.5, 0.24, 1),
		meshtest.Stretch(meshtest.LPlate(12, 0.24, 1), 1, 30, 1)) // slivers, where the heat order errs and is mended
}

var medleyData = []mesh.Datum{mesh.AtVertex(17), mesh.AtVertex(1200), mesh.AtVertex(3700), mesh.AtVertex(4300), mesh.AtVertex(5000)}

// Lengths are relative and vertices without names: what does not change the shape
// changes distances by rounding only. (A value is the sum of some hundred steps, each of
// which may double an error of the one before where rays graze a corner: hence not 1e-15.)
func TestDistanceDependsOnShapeOnly(t *testing.T) {
	t.Parallel()
	m := medley()
	n := m.NumVertices()
	want := field(t, m, medleyData...)
	perm := meshtest.Permutation(n, 9)
	renamed := make([]mesh.Datum, len(medleyData))
	for i, d := range medleyData {
		renamed[i] = mesh.AtVertex(perm[d.Vertex])
	}
	for _, tc := range []struct {
		name  string
		m     *mesh.Mesh
		scale float64
		data  []mesh.Datum
	}{
		{"small", meshtest.Scale(m, 1e-3), 1e-3, medleyData},
		{"large", meshtest.Scale(m, 1e6), 1e6, medleyData},
		{"rotated", meshtest.Rotate(m, [3]float64{1, 2, 3}, 1), 1, medleyData},
		{"moved", meshtest.Translate(m, [3]float64{3, -2, 1}), 1, medleyData},
		{"reversed", meshtest.Reverse(m, 1, 1), 1, medleyData},
		{"half-reversed", meshtest.Reverse(m, 0.5, 1), 1, medleyData},
		{"shuffled", meshtest.Shuffle(m, 4), 1, medleyData},
		{"renumbered", meshtest.Renumber(m, perm), 1, renamed},
	} {
		got := field(t, tc.m, tc.data...)
		miss := compare(want, func(v int) float64 {
			if tc.name == "renumbered" {
				v = int(perm[v])
			}
			return got[v] / tc.scale
		})
		t.Logf("%s: %v", tc.name, miss)
		if !(miss.most <= 1e-11) {
			t.Errorf("%s: %v", tc.name, miss)
		}
	}
}

// A surface without orientation has a seam, which lies elsewhere if its triangles are
// written otherwise, and there the front goes by the faces alone. Results may change by
// the error of the method, no more.
func TestDistanceOnReversedMoebiusBand(t *testing.T) {
	t.Parallel()
	m := meshtest.MoebiusBand(60, 8)
	want := exactly(t, m, mesh.AtVertex(128))
	for _, turned := range []float64{0, 0.5, 1} {
		_, v := resolved(t, meshtest.Reverse(m, turned, 1), mesh.AtVertex(128))
		miss := compare(ask(t, v, nil)[:m.NumVertices()], func(v int) float64 { return want[v] })
		t.Logf("reversed by %g: %v", turned, miss)
		if !(miss.mean <= 1e-3 && miss.most <= 1e-2) { // three times what they are
			t.Errorf("reversed by %g: %v", turned, miss)
		}
	}
}

// The distance from several sources is the least of the distances from each.
func TestDistanceFromSeveralSources(t *testing.T) {
	t.Parallel()
	for _, tc := range []struct {
		name string
		m    *mesh.Mesh
		tol  float64
	}{
		{"box", meshtest.Box(2, 1, 0.5, [3]int{40, 20, 10}, 0.24, 3), flatTol},
		{"plate", meshtest.Plate(1, 1, 50, 50, 0.24, 3), flatTol},
		{"sphere", meshtest.ShakenSphere(4, 1), 1e-3}, // twice what it is, and below the error of a field
		{"torus", meshtest.Torus(2, 1, 72, 36, 0.2, 1), 4e-3},
	} {
		n := tc.m.NumVertices()
		data := []mesh.Datum{mesh.AtVertex(int32(n / 7)), mesh.AtVertex(int32(n / 2)), mesh.AtVertex(int32(n - 5))}
		_, v := placed(t, tc.m, data...)
		least := make([]float64, n)
		for i := range data {
			for u, d := range ask(t, v, []int{i})[:n] {
				if i == 0 || d < least[u] {
					least[u] = d
				}
			}
		}
		miss := compare(ask(t, v, nil)[:n], func(v int) float64 { return least[v] })
		t.Logf("%s: %v", tc.name, miss)
		if !(miss.most <= tc.tol) {
			t.Errorf("%s: %v", tc.name, miss)
		}
	}
}

// Nothing reaches another component, and a source in each serves each.
func TestDistanceOnComponents(t *testing.T) {
	t.Parallel()
	a, b := meshtest.Plate(1, 1, 20, 20, 0.2, 1), meshtest.Plate(3, 2, 30, 20, 0.2, 2)
	m := meshtest.Join(a, meshtest.Translate(b, [3]float64{0, 0, 0.01}))
	n := a.NumVertices()
	_, v := placed(t, m, mesh.AtVertex(0), mesh.AtVertex(int32(n)))
	for u, d := range ask(t, v, []int{0})[:m.NumVertices()] {
		if math.IsInf(d, 1) != (u >= n) {
			t.Fatalf("vertex %d: distance %v", u, d)
		}
	}
	flatMatch(t, m, ask(t, v, nil)[:m.NumVertices()], func(v int) float64 {
		if v < n {
			return apart3(spot(m, v), spot(m, 0))
		}
		return apart3(spot(m, v), spot(m, n))
	})
}

// Straight line <= distance <= way along the edges; the distance is a metric. The front
// is off by up to slack on curved skins.
func TestDistanceIsAMetric(t *testing.T) {
	t.Parallel()
	for _, tc := range []struct {
		name  string
		m     *mesh.Mesh
		slack float64
	}{
		{"box", meshtest.Box(2, 1, 0.5, [3]int{24, 12, 6}, 0.24, 3), flatTol},
		{"slit-plate", meshtest.SlitPlate(12, 0.5, 1.5, 0.24, 1), flatTol},
		{"cone", meshtest.Cone(30*degree, 2, 40, 20), flatTol},
		{"sphere", meshtest.ShakenSphere(4, 1), 1e-3}, // three times what it is
		{"moebius", meshtest.MoebiusBand(100, 12), 1e-2},
	} {
		n := tc.m.NumVertices()
		var data []mesh.Datum
		for i := range 8 {
			data = append(data, mesh.AtVertex(int32((2*i+1)*n/16)))
		}
		_, v := placed(t, tc.m, data...)
		fields := make([][]float64, len(data))
		var upper, lower, lopsided, triangle float64
		for i, d := range data {
			fields[i] = ask(t, v, []int{i})[:n]
			edges := alongEdges(tc.m, int(d.Vertex))
			for u, x := range fields[i] {
				upper = max(upper, x/max(edges[u], 1e-300)-1)
				if u != int(d.Vertex) {
					lower = max(lower, 1-x/apart3(spot(tc.m, u), spot(tc.m, int(d.Vertex))))
				}
			}
		}
		for i, a := range data {
			for j := range i {
				there, back := fields[i][data[j].Vertex], fields[j][a.Vertex]
				lopsided = max(lopsided, math.Abs(there-back)/there)
				for u := range n {
					triangle = max(triangle, (there-fields[i][u]-fields[j][u])/there)
				}
			}
		}
		t.Logf("%s: above the way along edges by %.2g, below the straight line by %.2g, there and back differ by %.2g, triangle inequality missed by %.2g (relative)", tc.name, upper, lower, lopsided, triangle)
		if max(upper, lower, lopsided, triangle) > tc.slack {
			t.Errorf("%s: want %g at most", tc.name, tc.slack)
		}
	}
}

// alongEdges is the distance along the edges of m: repeated relaxation (Bellman and
// Ford), too plain to share a slip with the front.
func alongEdges(m *mesh.Mesh, from int) []float64 {
	d := make([]float64, m.NumVertices())
	for v := range d {
		d[v] = math.Inf(1)
	}
	d[from] = 0
	for changed := true; changed; {
		changed = false
		for h, u := range m.Triangles {
			v := m.Triangles[next(int32(h))]
			l := apart3(spot(m, int(u)), spot(m, int(v)))
			for _, e := range [2][2]int32{{u, v}, {v, u}} {
				if x := d[e[0]] + l; x < d[e[1]] {
					d[e[1]] = x
					changed = true
				}
			}
		}
	}
	return d
}

// A distance does not depend on how many threads worked it out, bit for bit.
func TestDistanceIsTheSameOnAnyThreads(t *testing.T) {
	t.Parallel()
	m := medley()
	s, one := placed(t, m, medleyData...)
	want := ask(t, one, nil)
	v, err := NewSolver(context.Background(), s, Options{Workers: 3})
	if err != nil {
		t.Fatal(err)
	}
	for u, d := range ask(t, v, nil) {
		if math.Float64bits(d) != math.Float64bits(want[u]) {
			t.Fatalf("vertex %d: %v with three workers, %v without", u, d, want[u])
		}
	}
}

// What Distance refuses it refuses with a typed error.
func TestDistanceRefuses(t *testing.T) {
	t.Parallel()
	m := meshtest.Plate(1, 1, 4, 4, 0, 1)
	_, none := placed(t, m)
	_, one := placed(t, m, mesh.AtVertex(0))
	for _, tc := range []struct {
		name string
		v    *Solver
		opt  DistanceOptions
	}{
		{"no source", none, DistanceOptions{}},
		{"negative smoothing", one, DistanceOptions{Smoothing: -1}},
		{"infinite smoothing", one, DistanceOptions{Smoothing: math.Inf(1)}},
		{"NaN smoothing", one, DistanceOptions{Smoothing: math.NaN()}},
	} {
		_, err := tc.v.Distance(context.Background(), nil, tc.opt)
		var refused *OptionError
		if !errors.As(err, &refused) {
			t.Errorf("%s: got %v, want an *OptionError", tc.name, err)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := one.Distance(ctx, nil, DistanceOptions{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: got %v", err)
	}
}

// The smooth variant rounds off the ridges of the cut locus, and is close elsewhere: a
// mean of 0.09 % on the square and 0.10 % on the sphere, where the method as published
// has 0.6 % and 1.5 %.
func TestDistanceSmooth(t *testing.T) {
	t.Parallel()
	square := meshtest.Plate(1, 1, 100, 100, 0.24, 2)
	const middle = 33*101 + 50
	sphere := meshtest.ShakenSphere(5, 1)
	for _, tc := range []struct {
		name string
		m    *mesh.Mesh
		from int
		want func(v int) float64
		mean float64
	}{
		{"square", square, middle, func(v int) float64 { return apart3(spot(square, v), spot(square, middle)) }, 1.5e-3},
		{"sphere", sphere, 0, greatCircle(sphere, 0), 1.5e-3},
	} {
		_, v := placed(t, tc.m, mesh.AtVertex(int32(tc.from)))
		res, err := v.Distance(context.Background(), nil, DistanceOptions{Smooth: true})
		if err != nil {
			t.Fatal(err)
		}
		miss := compare(res.Distance[:tc.m.NumVertices()], tc.want)
		t.Logf("%s: %v", tc.name, miss)
		if !(miss.mean <= tc.mean) {
			t.Errorf("%s: %v; want a mean of %g %% at most", tc.name, miss, 100*tc.mean)
		}
	}
}

// A power of two scales every length without rounding, so no bit of a distance may
// change but its exponent: any constant that has a unit would show.
func TestDistanceHasNoUnit(t *testing.T) {
	t.Parallel()
	m := meshtest.Join(meshtest.Cone(30*degree, 2, 30, 10), perforated(4, 8)())
	data := []mesh.Datum{mesh.AtVertex(7), mesh.AtVertex(310)}
	_, v := resolved(t, m, data...)
	want := ask(t, v, nil)
	for _, exponent := range []int{-12, 20} {
		_, v := resolved(t, meshtest.Scale(m, math.Ldexp(1, exponent)), data...)
		for u, d := range ask(t, v, nil) {
			if back := math.Ldexp(d, -exponent); back != want[u] {
				t.Fatalf("scaled by 2^%d: vertex %d at %v, and at %v unscaled", exponent, u, back, want[u])
			}
		}
	}
}
