package mesh_test

import (
	"fmt"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// Arc against chord: the chord of an angle θ is 2 sin(θ/2), short of the arc by θ²/24
// (by the series; the table inspection_chord.csv has it to more terms).
func TestChordErrorOfCylinders(t *testing.T) {
	for _, n := range []int{24, 60, 200} {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			theta := 2 * math.Pi / float64(n)
			want := theta * theta / 24 / 2 // the mean over directions: cos² of the angle to the circle
			got := mesh.ChordError(meshtest.Cylinder(3, 10, n, 20, 0, 1))
			if math.Abs(got-want) > 1e-12+0.01*want { // terms of order θ⁴
				t.Errorf("got %g, want %g", got, want)
			}
		})
	}
}

// On a sphere of radius 1 cut into equal triangles of edge h the flat distances are
// short by h²/8 for the depth of the faces under the sphere, less h²/48 for their
// slopes (by hand, from the mean of a paraboloid over a triangle).
func TestChordErrorOfSpheres(t *testing.T) {
	for _, k := range []int{3, 4, 5} {
		m := meshtest.Icosphere(k, 0, 1)
		h2 := 4 * math.Pi / (float64(m.NumTriangles()) * math.Sqrt(3) / 4)
		got, want := mesh.ChordError(m), h2*(1.0/8-1.0/48)
		if math.Abs(got-want) > 0.03*want { // the triangles are not quite equal
			t.Errorf("%d vertices: got %g, want %g", m.NumVertices(), got, want)
		}
	}
}

// Flat faces and the sharp edges of a part are what they are.
func TestChordErrorOfFlatParts(t *testing.T) {
	for name, m := range map[string]*mesh.Mesh{
		"plate": meshtest.Plate(1, 1, 9, 9, 0.3, 1),
		"box":   meshtest.Box(2, 1, 0.5, [3]int{5, 4, 3}, 0.3, 2),
	} {
		if got := mesh.ChordError(m); got > 1e-15 {
			t.Errorf("%s: got %g, want 0", name, got)
		}
	}
}
