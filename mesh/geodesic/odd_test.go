package geodesic_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// Pages of a book are flat and share their spine: from page to page the way is that of
// the two unfolded into a plane, whichever of the pages they are.
func TestPagesOfABook(t *testing.T) {
	const pages, n = 5, 6
	m := meshtest.Book(pages, n)
	polar := func(v int) (r, z float64) {
		p := m.Positions[3*v : 3*v+3]
		return math.Hypot(p[0], p[1]), p[2]
	}
	samePage := func(u, v int) bool {
		a, b := m.Positions[3*u:3*u+3], m.Positions[3*v:3*v+3]
		return math.Abs(a[0]*b[1]-a[1]*b[0]) < 1e-9 && a[0]*b[0]+a[1]*b[1] > -1e-9
	}
	for _, source := range []int{2, 20, 57, m.NumVertices() - 1} {
		d := field(t, m, mesh.AtVertex(int32(source)))
		r0, z0 := polar(source)
		for v := range d {
			r, z := polar(v)
			want := math.Hypot(r0+r, z0-z)
			if samePage(source, v) {
				want = math.Hypot(r0-r, z0-z)
			}
			if math.Abs(d[v]-want) > 1e-12 {
				t.Errorf("from %d to %d: got %.17g, want %.17g (unfolded)", source, v, d[v], want)
			}
		}
	}
}

// What is not joined is not reached.
func TestComponents(t *testing.T) {
	a := meshtest.Icosphere(2, 0.1, 1)
	m := meshtest.Join(a, meshtest.Translate(meshtest.Octahedron(1), [3]float64{3, 0, 0}))
	for v, d := range field(t, m, mesh.AtVertex(0)) {
		if reached := !math.IsInf(d, 1); reached != (v < a.NumVertices()) {
			t.Errorf("vertex %d: distance %g", v, d)
		}
	}
	line, err := geodesic.Path(t.Context(), m, []mesh.Datum{mesh.AtVertex(0)}, []mesh.Datum{mesh.AtVertex(int32(a.NumVertices()))})
	if line != nil || err != nil {
		t.Errorf("a line to another component: %v, %v", line, err)
	}
}

func build(t *testing.T, positions []float64, triangles ...int32) *mesh.Mesh {
	t.Helper()
	m, err := mesh.New(positions, triangles)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// straight demands the straight line between all vertices of a flat convex mesh.
func straight(t *testing.T, m *mesh.Mesh, tol float64) {
	t.Helper()
	for u := range m.NumVertices() {
		d := field(t, m, mesh.AtVertex(int32(u)))
		for v := range d {
			want := gap(m.Positions[3*u:], m.Positions[3*v:])
			if !(math.Abs(d[v]-want) <= tol) {
				t.Fatalf("from %d to %d: got %.17g, want %.17g", u, v, d[v], want)
			}
		}
	}
}

// Triangles without area must let the wave through as if they were not there.
func TestTrianglesWithoutArea(t *testing.T) {
	t.Run("cap", func(t *testing.T) {
		// Vertex 2 lies on the side 0-1 of the triangle below; 0 1 2 fills the gap.
		for _, off := range []float64{0, 1e-18, 1e-16, 1e-14, 1e-11} {
			m := build(t, []float64{0, 0, 0, 2, 0, 0, 0.7, off, 0, 1, 1, 0, 1.2, -1, 0},
				0, 2, 3, 2, 1, 3, 1, 0, 4, 0, 1, 2)
			// The gap opens a ridge no higher than off.
			straight(t, m, 1e-14+2*off)
		}
	})
	t.Run("nested caps", func(t *testing.T) {
		m := build(t, []float64{0, 0, 0, 2, 0, 0, 0.7, 0, 0, 1, 1, 0, 1.2, -1, 0, 1.4, 0, 0, 0.9, 0, 0},
			0, 2, 3, 2, 6, 3, 6, 5, 3, 5, 1, 3, 1, 0, 4, 0, 1, 2, 2, 1, 5, 2, 5, 6)
		straight(t, m, 1e-14)
	})
	t.Run("needles", func(t *testing.T) {
		// A plate cut open and sewn up again with triangles that have a side of length 0.
		straight(t, sewn(0.2), 1e-13)
	})
	t.Run("doubled", func(t *testing.T) {
		m := meshtest.Plate(1, 1, 4, 4, 0.2, 4)
		twice := build(t, m.Positions, append(append([]int32(nil), m.Triangles...), m.Triangles...)...)
		straight(t, twice, 1e-13)
	})
	t.Run("repeated corner", func(t *testing.T) {
		m := meshtest.Plate(1, 1, 4, 4, 0.2, 4)
		more := append([]int32{0, 1, 1, 2, 2, 2, 3, 4, 3}, m.Triangles...)
		straight(t, build(t, m.Positions, more...), 1e-13)
	})
	t.Run("hair", func(t *testing.T) {
		// Vertex 3 hangs on a triangle without area: it is on no surface.
		m := build(t, []float64{0, 0, 0, 1, 0, 0, 0, 1, 0, 2, 0, 0}, 0, 1, 2, 0, 1, 3)
		d := field(t, m, mesh.AtVertex(2))
		if !math.IsInf(d[3], 1) || d[1] != math.Sqrt2 {
			t.Errorf("got %v", d)
		}
	})
	t.Run("all", func(t *testing.T) {
		m := build(t, []float64{1, 1, 1, 1, 1, 1, 1, 1, 1, 2, 2, 2}, 0, 1, 2, 0, 1, 3)
		if _, err := geodesic.Field(t.Context(), m, []mesh.Datum{mesh.AtVertex(0)}, geodesic.Options{}); err == nil {
			t.Error("a source on no surface: want an error")
		}
	})
}

// sewn is a plate of 2 by 2 with a slit sewn up by triangles without area.
func sewn(jitter float64) *mesh.Mesh {
	slit := meshtest.SlitPlate(6, 1.0/3, 5.0/3, jitter, 4)
	m := sew(slit)
	if m.NumTriangles() == slit.NumTriangles() {
		panic("nothing was sewn")
	}
	return m
}

// sew joins vertices in one place by triangles without area along a slit.
func sew(m *mesh.Mesh) *mesh.Mesh {
	twin := map[int32]int32{}
	for u := range m.NumVertices() {
		for v := range u {
			if gap(m.Positions[3*u:], m.Positions[3*v:]) == 0 {
				twin[int32(v)] = int32(u)
			}
		}
	}
	triangles := append([]int32(nil), m.Triangles...)
	for f := range m.NumTriangles() {
		for k := range 3 {
			a, b := m.Triangles[3*f+k], m.Triangles[3*f+(k+1)%3]
			if m.Positions[3*a] != 1 || m.Positions[3*b] != 1 {
				continue
			}
			a2, twoA := twin[a]
			b2, twoB := twin[b]
			switch { // only triangles at the left lip have edges between first copies
			case twoA && twoB:
				triangles = append(triangles, b, a, a2, b, a2, b2)
			case twoA && !isTwin(twin, b):
				triangles = append(triangles, b, a, a2)
			case twoB && !isTwin(twin, a):
				triangles = append(triangles, b, a, b2)
			}
		}
	}
	sewn, err := mesh.New(m.Positions, triangles)
	if err != nil {
		panic(err)
	}
	return sewn
}

func isTwin(twin map[int32]int32, v int32) bool {
	for _, u := range twin {
		if u == v {
			return true
		}
	}
	return false
}

// Two tips that touch in one vertex: the wave must pass through it.
func TestTouchingInOneVertex(t *testing.T) {
	m := build(t, []float64{0, 0, 0, 1, 1, 1, 1, -1, 1, -1, 0, 1, 1, 1, -1, 1, -1, -1, -1, 0, -1},
		0, 1, 2, 0, 2, 3, 0, 3, 1, 0, 4, 5, 0, 5, 6, 0, 6, 4)
	d := field(t, m, mesh.AtVertex(1))
	near(t, "through the vertex", d[6], math.Sqrt(3)+math.Sqrt(2), 1e-15)
}

func TestRefusals(t *testing.T) {
	m := meshtest.Octahedron(1)
	bad := mesh.Point{Triangle: 0, Weights: [3]float64{1, 1, 0}}
	for name, d := range map[string]mesh.Datum{
		"no such vertex":   {Name: "no such vertex", Vertex: 99},
		"negative":         {Name: "negative", Vertex: -3},
		"no such triangle": {Name: "no such triangle", Vertex: -1, Point: &mesh.Point{Triangle: 1000}},
		"weights":          {Name: "weights", Vertex: -1, Point: &bad},
		"nan":              {Name: "nan", Vertex: -1, Point: &mesh.Point{Weights: [3]float64{math.NaN(), 0, 1}}},
		"no such edge":     {Name: "no such edge", Vertex: -1, Edges: [][2]int32{{0, 1}}},
	} {
		_, err := geodesic.Field(t.Context(), m, []mesh.Datum{d}, geodesic.Options{})
		var bad *geodesic.DatumError
		if !errors.As(err, &bad) || bad.Name != name {
			t.Errorf("%s: got %v", name, err)
		}
		if _, err = geodesic.Path(t.Context(), m, []mesh.Datum{mesh.AtVertex(0)}, []mesh.Datum{d}); !errors.As(err, &bad) {
			t.Errorf("%s as a target: got %v", name, err)
		}
	}
	var size *geodesic.SizeError
	if _, err := geodesic.Field(t.Context(), meshtest.Scale(m, 1e200), []mesh.Datum{mesh.AtVertex(0)}, geodesic.Options{}); !errors.As(err, &size) {
		t.Errorf("a mesh 1e200 across: got %v", err)
	}
}

// The limit is kept, and the error says how far the wave came.
func TestMemoryLimit(t *testing.T) {
	m := meshtest.Icosphere(5, 0.2, 1)
	s := geodesic.NewSolver(m)
	source := []mesh.Datum{mesh.AtVertex(0)}
	full, err := s.Spread(t.Context(), source, geodesic.Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, share := range []int64{1000, 2} {
		_, err := s.Spread(t.Context(), source, geodesic.Options{MaxBytes: full.PeakBytes / share})
		var limit *geodesic.MemoryError
		if !errors.As(err, &limit) {
			t.Fatalf("1/%d of what it takes: got %v", share, err)
		}
		if share == 2 && !(limit.Reach > 0 && limit.Reach < math.Pi) {
			t.Errorf("reach %g", limit.Reach)
		}
	}
	if _, err := s.Spread(t.Context(), source, geodesic.Options{MaxBytes: full.PeakBytes}); err != nil {
		t.Error(err)
	}
}

func TestInterrupted(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := geodesic.Field(ctx, meshtest.Octahedron(1), []mesh.Datum{mesh.AtVertex(0)}, geodesic.Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
}

// An early stop gives the same distances as far as it goes, and nothing beyond.
func TestEarlyStop(t *testing.T) {
	m := meshtest.Icosphere(5, 0.25, 1)
	s := geodesic.NewSolver(m)
	source := []mesh.Datum{mesh.AtVertex(0)}
	full, err := s.Spread(t.Context(), source, geodesic.Options{})
	if err != nil {
		t.Fatal(err)
	}
	// How many windows cross is the work done. Those that any exact method keeps are 25.4
	// a face here; hardly any more may cross in vain.
	if work := float64(full.Windows) / float64(m.NumTriangles()); work > 25.6 {
		t.Errorf("%g windows a face", work)
	}
	var target int32 // a tenth of the way to the far side
	for v, d := range full.Distances {
		if math.Abs(d-math.Pi/10) < math.Abs(full.Distances[target]-math.Pi/10) {
			target = int32(v)
		}
	}
	near, err := s.Spread(t.Context(), source, geodesic.Options{Targets: []mesh.Datum{mesh.AtVertex(target)}})
	if err != nil {
		t.Fatal(err)
	}
	if near.Targets[0] != full.Distances[target] {
		t.Errorf("target: got %v, want %v", near.Targets[0], full.Distances[target])
	}
	// The disc is 2.4 % of the sphere.
	if share := float64(near.Windows) / float64(full.Windows); share > 0.05 {
		t.Errorf("a tenth of the way took %g of the windows", share)
	}
	disc, err := s.Spread(t.Context(), source, geodesic.Options{Radius: 0.5})
	if err != nil {
		t.Fatal(err)
	}
	for v, d := range full.Distances {
		for what, w := range map[string]*geodesic.Wave{"target": near, "radius": disc} {
			want := d
			if d > w.Reach {
				want = math.Inf(1)
			}
			if w.Distances[v] != want {
				t.Fatalf("%s: vertex %d: got %v, want %v", what, v, w.Distances[v], want)
			}
		}
	}
	if disc.Reach != 0.5 {
		t.Errorf("reach %v", disc.Reach)
	}
	if share := float64(disc.Windows) / float64(full.Windows); share > 0.05 { // 6 % of the sphere, where it has few windows
		t.Errorf("a radius of 0.5 took %g of the windows", share)
	}
	any, err := s.Spread(t.Context(), source, geodesic.Options{Any: true,
		Targets: []mesh.Datum{mesh.AtVertex(target), mesh.AtVertex(int32(m.NumVertices() - 1))}})
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(any.Targets) != fmt.Sprint([]float64{full.Distances[target], math.Inf(1)}) || any.Windows > near.Windows {
		t.Errorf("any: got %v with %d windows", any.Targets, any.Windows)
	}
}
