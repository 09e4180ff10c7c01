package mesh_test

import (
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// shapes are surfaces of every kind that the operators must carry.
func shapes() map[string]*mesh.Mesh {
	return map[string]*mesh.Mesh{
		"sphere":     meshtest.Icosphere(3, 0.25, 1),
		"plate":      meshtest.Plate(1, 1, 12, 12, 0.35, 2),
		"box":        meshtest.Box(2, 1, 0.5, [3]int{8, 4, 2}, 0.3, 3),
		"bare-box":   meshtest.Box(3, 2, 1, [3]int{1, 1, 1}, 0, 3),
		"needles":    meshtest.Stretch(meshtest.Icosphere(2, 0.25, 4), 1, 1, 1e-3),
		"long-plate": meshtest.Stretch(meshtest.Plate(1, 1, 10, 10, 0.35, 5), 1, 1e-4, 1),
		"moebius":    meshtest.MoebiusBand(30, 3),
		"book":       meshtest.Book(3, 5),
		"reversed":   meshtest.Reverse(meshtest.Torus(2, 1, 24, 12, 0.25, 6), 0.5, 7),
		"two-parts":  meshtest.Join(meshtest.Icosphere(1, 0, 8), meshtest.Translate(meshtest.Disc(5), [3]float64{5, 0, 0})),
	}
}

// A flip keeps the metric, so everything that the metric alone decides must stay:
// the area, and the sum of angles at every vertex (Gauss–Bonnet sees both).
func TestDelaunayKeepsTheMetric(t *testing.T) {
	for name, m := range shapes() {
		t.Run(name, func(t *testing.T) {
			s, err := mesh.NewSurface(m)
			if err != nil {
				t.Fatal(err)
			}
			area, angles := measures(s)
			s.Delaunay(20 * m.NumTriangles())
			checkGlue(t, s)
			if s.Unmended > 0 {
				t.Errorf("%d edges keep a negative weight", s.Unmended)
			}
			after, turned := measures(s)
			const tol = 1e-9 // sums of some hundred arctangents, needles of aspect 1e-4 among them
			if math.Abs(after-area) > tol*area {
				t.Errorf("area %.17g after %d flips and %d splits, was %.17g", after, s.Flips, s.Splits, area)
			}
			for v, a := range angles {
				if math.Abs(turned[v]-a) > 1e-6 {
					t.Errorf("angles at vertex %d add up to %.12g, were %.12g", v, turned[v], a)
				}
			}
			l := s.Laplacian()
			for i := range l.Diag {
				row := l.Diag[i]
				for k := l.Ptr[i]; k < l.Ptr[i+1]; k++ {
					row += l.Off[k]
					if l.Off[k] > 0 {
						t.Fatalf("L[%d][%d] = %g, want <= 0", i, l.Adj[k], l.Off[k])
					}
					if back := l.Off[l.Find(l.Adj[k], int32(i))]; back != l.Off[k] {
						t.Fatalf("L[%d][%d] = %g but L[%d][%d] = %g", i, l.Adj[k], l.Off[k], l.Adj[k], i, back)
					}
				}
				if math.Abs(row) > 1e-12*l.Diag[i] {
					t.Fatalf("row %d of L adds up to %g, want 0", i, row)
				}
			}
		})
	}
}

func measures(s *mesh.Surface) (area float64, angles []float64) {
	angles = make([]float64, s.NumOriginal)
	for f := range int32(s.NumFaces()) {
		area += s.Area(f)
	}
	for h, v := range s.Vert {
		if int(v) < s.NumOriginal {
			angles[v] += s.Angle(int32(h))
		}
	}
	return area, angles
}

func checkGlue(t *testing.T, s *mesh.Surface) {
	t.Helper()
	head := func(h int32) int32 { return s.Vert[h-h%3+(h+1)%3] }
	seen := make([]bool, len(s.Glue))
	for h := range int32(len(s.Glue)) {
		g := s.Glue[h]
		if seen[g] {
			t.Fatalf("two halfedges are followed by %d", g)
		}
		seen[g] = true
		a, b, c, d := s.Vert[h], head(h), s.Vert[g], head(g)
		if min(a, b) != min(c, d) || max(a, b) != max(c, d) {
			t.Fatalf("halfedge %d joins %d-%d, its mate %d joins %d-%d", h, a, b, g, c, d)
		}
		if s.Length[h] != s.Length[g] {
			t.Fatalf("halfedge %d is %.17g long, its mate %d %.17g", h, s.Length[h], g, s.Length[g])
		}
	}
}

// The 3-4-5 triangle: cotangents 3/4, 4/3 and 0, area 6 (Euclid; by hand).
func TestOperatorsOfOneTriangle(t *testing.T) {
	m, err := mesh.New([]float64{0, 0, 0, 4, 0, 0, 0, 3, 0}, []int32{0, 1, 2})
	if err != nil {
		t.Fatal(err)
	}
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	l, lumped, consistent := s.Laplacian(), s.LumpedMass(), s.ConsistentMass()
	near := func(what string, got, want float64) {
		t.Helper()
		if math.Abs(got-want) > 1e-14 {
			t.Errorf("%s = %.17g, want %.17g", what, got, want)
		}
	}
	near("L01", l.Off[l.Find(0, 1)], -3.0/8) // opposite the corner between 3 and 5, whose cotangent is 3/4
	near("L02", l.Off[l.Find(0, 2)], -2.0/3)
	near("L12", l.Off[l.Find(1, 2)], 0)
	near("M0", lumped[0], 2)
	near("M00", consistent.Diag[0], 1)
	near("M01", consistent.Off[consistent.Find(0, 1)], 0.5)
}

// Points inside triangles, on edges and at corners, several in one triangle.
func TestPlacePoints(t *testing.T) {
	m := meshtest.Plate(1, 1, 3, 3, 0.2, 9)
	data := []mesh.Datum{
		mesh.AtPoint(mesh.Point{Triangle: 4, Weights: [3]float64{0.2, 0.3, 0.5}}),
		mesh.AtPoint(mesh.Point{Triangle: 4, Weights: [3]float64{0.25, 0.3, 0.45}}),
		mesh.AtPoint(mesh.Point{Triangle: 4, Weights: [3]float64{0.5, 0.5, 0}}),
		mesh.AtPoint(mesh.Point{Triangle: 4, Weights: [3]float64{0, 1, 0}}),
		mesh.AtPoint(mesh.Point{Triangle: 4, Weights: [3]float64{0.25, 0.3, 0.45}}),
	}
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Place(data); err != nil {
		t.Fatal(err)
	}
	checkGlue(t, s)
	s.Delaunay(1000)
	checkGlue(t, s)
	for i, d := range data {
		want := m.Position(*d.Point)
		v := s.Site(i)
		for axis, x := range want {
			if got := s.Positions[3*v+int32(axis)]; math.Abs(got-x) > 1e-14 {
				t.Errorf("datum %d lies at %v on axis %d, want %v", i, got, axis, x)
			}
		}
	}
	if s.Site(4) != s.Site(1) {
		t.Error("the same point twice became two vertices")
	}
	if s.Site(3) != m.Triangles[13] {
		t.Error("a point at a corner is not that corner")
	}
	if area, _ := measures(s); math.Abs(area-1) > 1e-13 {
		t.Errorf("area %.17g, want 1", area)
	}
	if sum := total(s.Load(data)); math.Abs(sum-1) > 1e-15 {
		t.Errorf("the load adds up to %.17g, want 1", sum)
	}
}

func total(x []float64) (sum float64) {
	for _, v := range x {
		sum += v
	}
	return sum
}

// A flat triangle between two good ones closes a T-junction; it must neither break
// the operators nor cut the surface.
func TestFlatTriangles(t *testing.T) {
	m, err := mesh.New([]float64{0, 0, 0, 2, 0, 0, 1, 1, 0, 1, 0, 0, 1, -1, 0, 7, 7, 7},
		[]int32{0, 1, 2, 0, 3, 1, 0, 4, 3, 3, 4, 1, 5, 5, 1})
	if err != nil {
		t.Fatal(err)
	}
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	if s.Guard.Edges != 2 || s.Guard.Relative > 1e-11 {
		t.Errorf("guard %+v, want 2 edges lengthened by less than 1e-11", s.Guard)
	}
	if !s.NoValue[5] || s.NoValue[3] {
		t.Errorf("vertices without value: %v, want only 5", s.NoValue)
	}
	s.Delaunay(100)
	checkGlue(t, s)
	if _, count := s.Components(); count != 1 {
		t.Errorf("%d components, want 1", count)
	}
	if area, _ := measures(s); math.Abs(area-2) > 1e-5 { // the flat triangle's own area is about √slackFloor
		t.Errorf("area %v, want 2", area)
	}
}
