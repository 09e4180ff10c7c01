package mesh_test

import (
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// totalLength is the length of edges together.
func totalLength(m *mesh.Mesh, edges [][2]int32) (sum float64) {
	for _, e := range edges {
		a, b := m.Positions[3*e[0]:], m.Positions[3*e[1]:]
		sum += math.Sqrt((a[0]-b[0])*(a[0]-b[0]) + (a[1]-b[1])*(a[1]-b[1]) + (a[2]-b[2])*(a[2]-b[2]))
	}
	return sum
}

// Dihedral angles are elementary: 90 degrees for a box, acos(1/3) between the faces of
// the regular tetrahedron, 2 pi/n around a prism.
func TestCreases(t *testing.T) {
	bracket, size := meshtest.Bracket(5, 8)
	turned := meshtest.Rotate(bracket, [3]float64{1, 2, 3}, 1)
	for _, tc := range []struct {
		name    string
		m       *mesh.Mesh
		degrees float64
		length  float64
	}{
		{"box", meshtest.Box(3, 2, 1, [3]int{6, 4, 3}, 0.2, 1), 89, 24},
		{"box-above", meshtest.Box(3, 2, 1, [3]int{6, 4, 3}, 0.2, 1), 91, 0},
		{"box-reversed", meshtest.Reverse(meshtest.Box(3, 2, 1, [3]int{6, 4, 3}, 0.2, 1), 0.5, 1), 30, 24},
		{"tetrahedron", meshtest.Tetrahedron(2), 109.4, 6}, // 180 - acos(1/3) = 109.47 degrees
		{"tetrahedron-above", meshtest.Tetrahedron(2), 109.5, 0},
		{"prism", meshtest.Cylinder(1, 3, 12, 4, 0.2, 1), 29.9, 36},
		{"prism-above", meshtest.Cylinder(1, 3, 12, 4, 0.2, 1), 30.1, 0},
		{"three-pages", meshtest.Book(3, 4), 59.9, 1}, // the best continuation bends by 60 degrees
		{"three-pages-above", meshtest.Book(3, 4), 60.1, 0},
		{"four-pages", meshtest.Book(4, 4), 0.1, 0}, // two planes that cross: each page goes on flat
		{"bracket", bracket, 80, bracketRims(size)},
		{"bracket-turned", turned, 80, bracketRims(size)},
	} {
		t.Run(tc.name, func(t *testing.T) {
			got := totalLength(tc.m, mesh.Creases(tc.m, tc.degrees))
			if math.Abs(got-tc.length) > 1e-12*tc.length { // sums of at most some hundred edges
				t.Errorf("length %.15g, want %.15g", got, tc.length)
			}
		})
	}
}

// bracketRims is the length of a Bracket's right-angled edges: the two outlines of its
// profile, its four long end edges, and both rims of every hole.
func bracketRims(s meshtest.BracketSize) float64 {
	n := float64(s.Segments)
	arcs := 2 * n * math.Sin(math.Pi/4/n) * (s.Inner + s.Inner + s.Thickness)
	profile := 4*s.Leg + 2*s.Thickness + arcs
	return 2*profile + 4*s.Width + 4*s.HoleRims
}

// A face written twice does not make a crease in a flat plate, and a flat triangle
// between two faces of a box does not hide the edge that it lies on.
func TestCreasesSeePastOddFaces(t *testing.T) {
	plate := meshtest.Plate(1, 1, 3, 3, 0, 0)
	plate.Triangles = append(plate.Triangles, plate.Triangles[12:15]...)
	if e := mesh.Creases(plate, 1); len(e) > 0 {
		t.Errorf("a doubled face makes creases %v", e)
	}
	// Two unit squares that meet at a right angle along 0-1, the left one split at
	// vertex 2 in the middle of that edge, with a flat triangle 0 1 2 to fill the gap.
	// Height 1e-9 is what rounding leaves of such a triangle.
	fold := &mesh.Mesh{
		Positions: []float64{0, 0, 0, 0, 1, 0, 1e-9, 0.5, 0, 1, 0, 0, 1, 1, 0, 0, 0, 1, 0, 1, 1},
		Triangles: []int32{0, 2, 3, 2, 4, 3, 2, 1, 4, 0, 1, 2, 0, 5, 1, 5, 6, 1},
	}
	edges := mesh.Creases(fold, 80)
	if got := totalLength(fold, edges); len(edges) != 2 || math.Abs(got-1) > 1e-8 {
		t.Errorf("creases %v of length %v, want 0-2 and 1-2 of length 1", edges, got)
	}
}

// The bends along a smooth closed curve add up to a full turn: around the prism.
func TestBendsAddUp(t *testing.T) {
	m := meshtest.Cylinder(2, 1, 40, 1, 0, 0)
	sum := 0.0
	for _, b := range mesh.Bends(m) {
		if b == b {
			sum += b / 2 // both halfedges of an edge
		}
	}
	if math.Abs(sum-2*math.Pi) > 1e-12 { // 40 angles good to 1e-15; flat edges count 1e-16
		t.Errorf("bends add up to %v, want 2 pi", sum)
	}
}

// An edge with very many faces must cost no more than sorting them.
func TestBendsAtAHub(t *testing.T) {
	const pages = 100_001 // odd: what goes on best is half a step off
	m := meshtest.Book(pages, 1)
	for h, b := range mesh.Bends(m) {
		if b == b && math.Abs(b-math.Pi/pages) > 1e-9 && b > 1e-9 { // 0 on the pages' own diagonals
			t.Fatalf("halfedge %d bends by %v, want pi/%d", h, b, pages)
		}
	}
}
