package mesh_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

func linearMetric(m *mesh.Mesh) []float64 {
	g := make([]float64, len(m.Positions))
	for v := range m.NumVertices() {
		x, y := m.Positions[3*v], m.Positions[3*v+1]
		g[3*v], g[3*v+1], g[3*v+2] = 1+3*x, 0.4*y, 2-x+y
	}
	return g
}

// Edge lengths are ∫ √(g(ẋ, ẋ)), here by gonum's Gauss-Legendre rule with 40 points, and a
// refinement of the mesh sees the same metric.
func TestChartMetricLengths(t *testing.T) {
	m := meshtest.Plate(1, 1, 5, 4, 0.3, 3)
	var err error
	if m.Metric, err = mesh.NewChartMetric(m, linearMetric(m)); err != nil {
		t.Fatal(err)
	}
	fine, err := mesh.Refine(context.Background(), m, 0.1, 10_000)
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range []*mesh.Mesh{m, fine} {
		s, err := mesh.NewSurface(m)
		if err != nil {
			t.Fatal(err)
		}
		for h := range s.Vert {
			next := h - h%3 + (h+1)%3
			a, b := s.Positions[3*s.Vert[h]:][:2], s.Positions[3*s.Vert[next]:][:2]
			dx, dy := b[0]-a[0], b[1]-a[1]
			want := quad.Fixed(func(u float64) float64 {
				x, y := a[0]+u*dx, a[1]+u*dy
				return math.Sqrt((1+3*x)*dx*dx + 0.8*y*dx*dy + (2-x+y)*dy*dy)
			}, 0, 1, 40, nil, 0)
			if got := s.Length[h]; math.Abs(got-want) > 1e-13 { // some ulps of the rule's sum
				t.Fatalf("from %v to %v: length %.16g, want %.16g", a, b, got, want)
			}
			if m == fine && s.Length[h] > 0.1 {
				t.Fatalf("an edge of %g is left, want at most 0.1", s.Length[h])
			}
		}
	}
}

// With a tensor the mass stays the area in space, and the energy of a linear function is
// ∇u·D∇u times it (both by hand), before and after refinement and flips.
func TestTensorEnergy(t *testing.T) {
	const along, across, angle = 10.0, 0.5, 0.7
	m := meshtest.Plate(3, 2, 6, 5, 0.3, 5)
	n := m.NumTriangles()
	way, a, b := make([]float64, 3*n), make([]float64, n), make([]float64, n)
	sin, cos := math.Sincos(angle)
	for f := range n {
		way[3*f], way[3*f+1], way[3*f+2] = 4*cos, 4*sin, 9 // the part off the plane does not count
		a[f], b[f] = along, across
	}
	var err error
	if m.Metric, err = mesh.NewTensorMetric(m, way, a, b); err != nil {
		t.Fatal(err)
	}
	fine, err := mesh.Refine(context.Background(), m, 0.2, 10_000)
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range []*mesh.Mesh{m, fine} {
		s, err := mesh.NewSurface(m)
		if err != nil {
			t.Fatal(err)
		}
		s.Delaunay(s.NumFaces())
		l := s.Laplacian()
		u := make([]float64, s.NumVertices)
		for v := range u {
			u[v] = 2*s.Positions[3*v] - s.Positions[3*v+1]
		}
		lu := make([]float64, len(u))
		l.MulVecTo(lu, u)
		energy, area := 0.0, 0.0
		for v, m := range s.LumpedMass() {
			energy += u[v] * lu[v]
			area += m
		}
		p, q := 2*cos-sin, -2*sin-cos
		want := 6 * (along*p*p + across*q*q)
		if math.Abs(area-6) > 1e-12 || math.Abs(energy-want) > 1e-10*want { // sums of some thousand terms
			t.Errorf("area %.15g, want 6; energy %.15g, want %.15g", area, energy, want)
		}
		for k, w := range l.Off {
			if w > 0 {
				t.Fatalf("entry %d is %g: the sign pattern is lost", k, w)
			}
		}
	}
}

// Layers of different diffusivity keep the sign pattern, though no edge between them may
// be flipped: such edges are split.
func TestDelaunayBetweenDensities(t *testing.T) {
	m := meshtest.Plate(2, 2, 9, 9, 0.35, 11)
	n := m.NumTriangles()
	way, a, b := make([]float64, 3*n), make([]float64, n), make([]float64, n)
	rng := rand.New(rand.NewPCG(1, 2))
	for f := range n {
		way[3*f] = 1
		a[f] = math.Exp(4 * rng.Float64())
		b[f] = a[f]
	}
	var err error
	if m.Metric, err = mesh.NewTensorMetric(m, way, a, b); err != nil {
		t.Fatal(err)
	}
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	if s.Mismatch > 1e-14 {
		t.Errorf("isotropic tensors disagree on lengths by %g", s.Mismatch)
	}
	s.Delaunay(10 * s.NumFaces())
	if s.Splits == 0 || s.Unmended > 0 || len(s.Density) != s.NumFaces() {
		t.Errorf("%d splits, %d left, %d densities for %d faces", s.Splits, s.Unmended, len(s.Density), s.NumFaces())
	}
	for k, w := range s.Laplacian().Off {
		if w > 0 {
			t.Fatalf("entry %d is %g: the sign pattern is lost", k, w)
		}
	}
}

// Where two plies meet, edges take the root mean square of what either says.
func TestTensorsThatDisagree(t *testing.T) {
	m := meshtest.Plate(1, 1, 1, 1, 0, 0) // two triangles and a diagonal
	metric, err := mesh.NewArrivalMetric(m, []float64{1, 1, 0, 1, -1, 0}, []float64{4, 4}, []float64{1, 1})
	if err != nil {
		t.Fatal(err)
	}
	m.Metric = metric
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	for h := range s.Vert {
		if s.Boundary(int32(h)) {
			continue
		}
		// The diagonal, of length √2, lies along the fibres of one and across those of the other.
		want := math.Sqrt((2.0/4 + 2.0/1) / 2)
		if math.Abs(s.Length[h]-want) > 1e-14 {
			t.Errorf("diagonal %g, want %g", s.Length[h], want)
		}
	}
	if off := 1 - math.Sqrt(0.5/1.25); math.Abs(s.Mismatch-off) > 1e-14 {
		t.Errorf("mismatch %g, want %g", s.Mismatch, off)
	}
}

func TestMetricsAreRefused(t *testing.T) {
	m := meshtest.Plate(1, 1, 2, 2, 0, 0)
	good := linearMetric(m)
	for _, tc := range []struct {
		vertex int
		g      [3]float64
	}{
		{4, [3]float64{1, 1, 1}},
		{0, [3]float64{-1, 0, -1}},
		{8, [3]float64{0, 0, 1}},
		{3, [3]float64{1, math.NaN(), 1}},
		{3, [3]float64{1, 0, math.Inf(1)}},
		{3, [3]float64{1e200, 2e200, 1e200}},
	} {
		g := append([]float64(nil), good...)
		copy(g[3*tc.vertex:], tc.g[:])
		var wrong *mesh.MetricError
		if _, err := mesh.NewChartMetric(m, g); !errors.As(err, &wrong) || wrong.Vertex != tc.vertex || !strings.Contains(err.Error(), "positive definite") {
			t.Errorf("g = %v at vertex %d: got error %v", tc.g, tc.vertex, err)
		}
	}
	var bent *mesh.NotFlatError
	solid := meshtest.Paraboloid(1, 2, 0, 0)
	if _, err := mesh.NewChartMetric(solid, make([]float64, len(solid.Positions))); !errors.As(err, &bent) {
		t.Errorf("a paraboloid as a chart: got error %v", err)
	}
	n := m.NumTriangles()
	for _, tc := range []struct {
		way           [3]float64
		along, across float64
		good          bool
	}{
		{[3]float64{1, 0, 0}, 2, 1, true},
		{[3]float64{1e-200, 0, 0}, 2, 1, true}, // a direction has no length
		{[3]float64{0, 0, 1}, 2, 2, true},      // nor does it matter where they are equal
		{[3]float64{0, 0, 1}, 2, 1, false},
		{[3]float64{0, 0, 0}, 2, 1, false},
		{[3]float64{1, 0, 0}, 0, 1, false},
		{[3]float64{1, 0, 0}, 1, -1, false},
		{[3]float64{1, 0, 0}, math.NaN(), 1, false},
		{[3]float64{1, 0, 0}, math.Inf(1), 1, false},
	} {
		way, a, b := make([]float64, 3*n), make([]float64, n), make([]float64, n)
		for f := range n {
			way[3*f+1], a[f], b[f] = 1, 3, 1
		}
		copy(way[9:], tc.way[:])
		a[3], b[3] = tc.along, tc.across
		_, err := mesh.NewTensorMetric(m, way, a, b)
		var wrong *mesh.MetricError
		if tc.good && err != nil || !tc.good && (!errors.As(err, &wrong) || wrong.Triangle != 3) {
			t.Errorf("%v: got error %v", tc, err)
		}
	}
	// Squares of lengths must stay within double precision.
	g := make([]float64, len(good))
	for v := range m.NumVertices() {
		g[3*v], g[3*v+2] = 1e300, 1e300
	}
	var err error
	if m.Metric, err = mesh.NewChartMetric(m, g); err != nil {
		t.Fatal(err)
	}
	var size *mesh.RangeError
	if _, err := mesh.NewSurface(m); !errors.As(err, &size) {
		t.Errorf("lengths of 1e150: got error %v", err)
	}
}

// Tensors at random, from triangle to triangle, make lengths that fit no triangle and edges
// of which no flip is allowed: operators must stay finite, and lose the sign pattern
// only where Unmended says so.
func TestTensorsAtRandom(t *testing.T) {
	for name, m := range shapes() {
		for _, ratio := range []float64{3, 1e3, 1e8} {
			n := m.NumTriangles()
			way, a, b := make([]float64, 3*n), make([]float64, n), make([]float64, n)
			rng := rand.New(rand.NewPCG(1, 2))
			for f := range n {
				for axis := range 3 {
					way[3*f+axis] = rng.NormFloat64()
				}
				a[f], b[f] = 1e-5*math.Pow(ratio, rng.Float64()), 1e-5
			}
			for _, kind := range []func(*mesh.Mesh, []float64, []float64, []float64) (*mesh.Metric, error){mesh.NewTensorMetric, mesh.NewArrivalMetric} {
				metric, err := kind(m, way, a, b)
				if err != nil {
					t.Fatalf("%s: %v", name, err)
				}
				s, err := mesh.NewSurface(&mesh.Mesh{Positions: m.Positions, Triangles: m.Triangles, Metric: metric})
				if err != nil {
					t.Fatalf("%s: %v", name, err)
				}
				if err := s.Place([]mesh.Datum{mesh.AtPoint(mesh.Point{Triangle: 1, Weights: [3]float64{0.3, 0.3, 0.4}})}); err != nil {
					t.Fatalf("%s: %v", name, err)
				}
				s.Delaunay(s.NumFaces())
				for v, area := range s.LumpedMass() {
					if !(area > 0) {
						t.Fatalf("%s, jumps by %g: vertex %d has the area %g", name, ratio, v, area)
					}
				}
				for _, w := range s.Laplacian().Off {
					if math.IsNaN(w) || math.IsInf(w, 0) || w > 0 && s.Unmended == 0 {
						t.Fatalf("%s, jumps by %g: an entry is %g, %d edges are left", name, ratio, w, s.Unmended)
					}
				}
			}
		}
	}
}
