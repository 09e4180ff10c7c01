package meshtest_test

import (
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// facts measures what Euler and Archimedes speak of: edges with one, two and more
// faces, the Euler characteristic, the area and six times the enclosed volume.
func facts(m *mesh.Mesh) (rim, inner, more, chi int, oriented bool, area, volume float64) {
	faces := map[[2]int32]int{}
	directed := map[[2]int32]int{}
	used := map[int32]bool{}
	oriented = true
	for f := 0; f < len(m.Triangles); f += 3 {
		var p [3][3]float64
		for k := range 3 {
			u, v := m.Triangles[f+k], m.Triangles[f+(k+1)%3]
			used[u] = true
			faces[[2]int32{min(u, v), max(u, v)}]++
			if directed[[2]int32{u, v}]++; directed[[2]int32{u, v}] > 1 {
				oriented = false
			}
			p[k] = [3]float64(m.Positions[3*u : 3*u+3])
		}
		var a, b, c [3]float64
		for i := range 3 {
			a[i], b[i] = p[1][i]-p[0][i], p[2][i]-p[0][i]
		}
		for i := range 3 {
			j, k := (i+1)%3, (i+2)%3
			c[i] = a[j]*b[k] - a[k]*b[j]
			volume += c[i] * p[0][i] / 6
		}
		area += math.Sqrt(c[0]*c[0]+c[1]*c[1]+c[2]*c[2]) / 2
	}
	for _, n := range faces {
		switch {
		case n == 1:
			rim++
		case n == 2:
			inner++
		default:
			more++
		}
	}
	return rim, inner, more, len(used) - len(faces) + len(m.Triangles)/3, oriented, area, volume
}

// Characteristics are Euler's: 2 for a sphere, 0 for torus, tube and Möbius band, 1
// for a disc; every through hole of a solid takes 2 away. Areas and volumes are
// elementary geometry.
func TestShapes(t *testing.T) {
	bracket, _ := meshtest.Bracket(12, 10)
	const none = math.MaxFloat64 // not checked: no closed form
	for _, tc := range []struct {
		name         string
		m            *mesh.Mesh
		chi, rim     int
		oriented     bool
		area, volume float64
	}{
		{"tetrahedron", meshtest.Tetrahedron(2), 2, 0, true, math.Sqrt(3), math.Sqrt2 / 12},
		{"octahedron", meshtest.Octahedron(2), 2, 0, true, 2 * math.Sqrt(3), math.Sqrt2 / 3},
		{"box", meshtest.Box(30, 12, 12, [3]int{5, 3, 2}, 0, 0), 2, 0, true, 1728, 4320},
		{"box-jittered", meshtest.Box(1, 1, 2, [3]int{4, 4, 8}, 0.24, 1), 2, 0, true, 10, 2},
		{"plate", meshtest.Plate(2, 3, 4, 5, 0, 0), 1, 18, true, 6, none},
		{"plate-jittered", meshtest.Plate(2, 3, 40, 50, 0.24, 1), 1, 180, true, 6, none},
		{"L-plate", meshtest.LPlate(4, 0.2, 1), 1, 32, true, 3, none},
		{"edge-slit", meshtest.SlitPlate(8, 1, 2, 0.2, 1), 1, 80, true, 4, none},
		{"inner-slit", meshtest.SlitPlate(8, 0.5, 1.5, 0.2, 1), 0, 80, true, 4, none},
		{"disc", meshtest.Disc(5), 1, 30, true, none, none},
		{"prism", meshtest.Cylinder(1, 3, 6, 4, 0.24, 1), 0, 12, true, 18, none},
		{"can", meshtest.Can(1, 3, 6, 4, 3), 2, 0, true, 18 + 3*math.Sqrt(3), 4.5 * math.Sqrt(3)},
		{"fan", meshtest.Fan(5, math.Pi/3, []float64{0.5, 1}), 1, 5, true, 5 * math.Sqrt(3) / 4, none},
		{"saddle", meshtest.Fan(8, math.Pi/3, []float64{0.5, 1}), 1, 8, true, 2 * math.Sqrt(3), none},
		{"cone", meshtest.Cone(math.Pi/6, 2, 12, 3), 1, 12, true, none, none},
		{"annulus", meshtest.Frustum(math.Pi/2, 1, 2, 6, 3), 0, 12, true, 9 * math.Sqrt(3) / 2, none},
		{"icosphere", meshtest.Icosphere(3, 0.25, 1), 2, 0, true, none, none},
		{"shaken", meshtest.ShakenSphere(4, 1), 2, 0, true, none, none},
		{"sphere-grid", meshtest.SphereGrid(9), 2, 0, true, none, none},
		{"torus", meshtest.Torus(2, 1, 24, 12, 0.2, 1), 0, 0, true, none, none},
		{"coil", meshtest.Coil(3, 5, 2, 0.5, 120, 8, 0.2, 1), 0, 16, true, none, none},
		{"paraboloid", meshtest.Paraboloid(1.25, 10, 0.2, 1), 1, 40, true, none, none},
		{"moebius", meshtest.MoebiusBand(20, 3), 0, 40, false, none, none},
		{"book", meshtest.Book(2, 4), 1, 24, false, 2, none},
		{"bracket", bracket, 2 - 2*2*12, 0, true, none, none},
		{"groove", meshtest.Extrusion([][2]float64{{0, 0}, {20, 0}, {20, 10}, {11, 10}, {11, 6}, {9, 6}, {9, 10}, {0, 10}}, 5, 3),
			2, 0, true, 2*192 + 5*68, 960},
		{"sheet", meshtest.Sheet([][2]float64{{20, 10}, {11, 10}, {11, 6}, {9, 6}, {9, 10}, {0, 10}}, 5, 3), 1, 16, true, 28 * 5, none},
	} {
		t.Run(tc.name, func(t *testing.T) {
			rim, _, more, chi, oriented, area, volume := facts(tc.m)
			if more > 0 {
				t.Errorf("%d edges with more than two faces", more)
			}
			if chi != tc.chi || rim != tc.rim || oriented != tc.oriented {
				t.Errorf("chi %d, rim %d, oriented %v; want %d, %d, %v", chi, rim, oriented, tc.chi, tc.rim, tc.oriented)
			}
			const tol = 1e-12 // relative: sums of some thousand rounded areas
			if tc.area != none && math.Abs(area-tc.area) > tol*tc.area {
				t.Errorf("area %.17g, want %.17g", area, tc.area)
			}
			if tc.volume != none && math.Abs(volume-tc.volume) > tol*tc.volume {
				t.Errorf("volume %.17g, want %.17g", volume, tc.volume)
			}
		})
	}
}

// A book of three pages has its spine's edges in three faces each.
func TestBook(t *testing.T) {
	rim, _, more, _, _, area, _ := facts(meshtest.Book(3, 4))
	if more != 4 || rim != 3*12 || math.Abs(area-3) > 1e-14 {
		t.Errorf("%d spine edges, %d on the rim, area %v; want 4, 36, 3", more, rim, area)
	}
}

// The bracket's volume is its profile's area (two strips and a quarter of a polygonal
// ring) times the width, less the drilled prisms.
func TestBracketVolume(t *testing.T) {
	for _, holes := range []int{1, 30, 150} {
		const segments = 14
		m, s := meshtest.Bracket(holes, segments)
		outer := s.Thickness + s.Inner
		ring := (outer*outer - s.Inner*s.Inner) / 2 * segments * math.Sin(math.Pi/2/segments)
		want := s.Width*(2*s.Leg*s.Thickness+ring) - 2*s.HoleSum*s.Thickness
		rim, _, more, chi, oriented, _, volume := facts(m)
		if rim != 0 || more != 0 || chi != 2-4*holes || !oriented {
			t.Errorf("%d holes: rim %d, more %d, chi %d, oriented %v; want 0, 0, %d, true", holes, rim, more, chi, oriented, 2-4*holes)
		}
		if math.Abs(volume-want) > 1e-11*want { // sums of some ten thousand terms of both signs
			t.Errorf("%d holes: volume %.17g, want %.17g", holes, volume, want)
		}
	}
}

// Points of the unit sphere keep to it, and no triangle of a shaken one turns inwards.
func TestSpheres(t *testing.T) {
	for _, m := range []*mesh.Mesh{meshtest.Icosphere(4, 0.24, 7), meshtest.ShakenSphere(4, 7)} {
		for v := range m.NumVertices() {
			p := m.Positions[3*v : 3*v+3]
			if r := math.Sqrt(p[0]*p[0] + p[1]*p[1] + p[2]*p[2]); math.Abs(r-1) > 4e-16 {
				t.Fatalf("vertex %d at radius %v", v, r)
			}
		}
		// Archimedes: the inscribed polyhedron falls short of 4 pi and 4 pi/3 by O(h^2), here h = 0.14 at most.
		_, _, _, _, _, area, volume := facts(m)
		if area > 4*math.Pi || area < 4*math.Pi*0.99 || volume > 4*math.Pi/3 || volume < 4*math.Pi/3*0.98 {
			t.Errorf("area %v, volume %v", area, volume)
		}
	}
}

func TestSameSeedSameMesh(t *testing.T) {
	a, b, c := meshtest.ShakenSphere(3, 5), meshtest.ShakenSphere(3, 5), meshtest.ShakenSphere(3, 6)
	same := func(a, b *mesh.Mesh) bool {
		for i := range a.Positions {
			if a.Positions[i] != b.Positions[i] {
				return false
			}
		}
		for i := range a.Triangles {
			if a.Triangles[i] != b.Triangles[i] {
				return false
			}
		}
		return true
	}
	if !same(a, b) || same(a, c) {
		t.Error("want equal meshes for one seed and different ones for two")
	}
}
