package mesh_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// Rims whose number, vertices and lengths elementary geometry gives.
func TestBoundaryLoops(t *testing.T) {
	bow := &mesh.Mesh{ // two triangles that touch at vertex 0
		Positions: []float64{0, 0, 0, 3, 0, 0, 3, 4, 0, -6, 0, 0, -6, -8, 0},
		Triangles: []int32{0, 1, 2, 0, 3, 4},
	}
	pinched := meshtest.Plate(3, 3, 3, 3, 0, 0) // without one cell that touches the rim at a corner only
	pinched.Triangles = slices.Concat(pinched.Triangles[:6*4], pinched.Triangles[6*5:])
	pinched.Triangles = pinched.Triangles[6:] // and without the corner cell
	for _, tc := range []struct {
		name string
		m    *mesh.Mesh
		want []string // "vertices length", "open" before it
	}{
		{"sphere", meshtest.Icosphere(2, 0, 0), nil},
		{"plate", meshtest.Plate(2, 3, 4, 5, 0.2, 1), []string{"18 10"}},
		{"tube", meshtest.Cylinder(1, 3, 6, 4, 0, 0), []string{"6 6", "6 6"}},
		{"annulus", meshtest.Frustum(math.Pi/2, 1, 2, 6, 3), []string{"6 12", "6 6"}},
		{"edge-slit", meshtest.SlitPlate(4, 1, 2, 0, 0), []string{"40 10"}},
		{"inner-slit", meshtest.SlitPlate(4, 0.5, 1.5, 0, 0), []string{"32 8", "8 2"}},
		{"bow", bow, []string{"3 24", "3 12"}},
		{"pinched", pinched, []string{"12 12", "4 4"}},
		{"book", meshtest.Book(3, 2), []string{"open 7 3", "open 7 3", "open 7 3"}},
		{"two-pages", meshtest.Book(2, 2), []string{"12 6"}},
		{"collapsed", &mesh.Mesh{Positions: []float64{0, 0, 0, 3, 0, 0, 3, 4, 0}, Triangles: []int32{0, 1, 1, 0, 1, 2}}, []string{"3 12"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			var got []string
			for _, l := range mesh.BoundaryLoops(tc.m) {
				text := fmt.Sprintf("%d %.4g", len(l.Vertices), l.Length)
				if l.Open {
					text = "open " + text
				}
				got = append(got, text)
			}
			if !slices.Equal(got, tc.want) {
				t.Errorf("got %q, want %q", got, tc.want)
			}
		})
	}
}

// Whatever the mesh, its loops hold every boundary edge once, and no vertex twice.
func TestLoopsHoldEachBoundaryEdgeOnce(t *testing.T) {
	bracket, _ := meshtest.Bracket(3, 5)
	for name, m := range map[string]*mesh.Mesh{
		"book":     meshtest.Book(4, 3),
		"slit":     meshtest.SlitPlate(4, 0, 2, 0.2, 1),
		"reversed": meshtest.Reverse(meshtest.LPlate(4, 0.2, 1), 0.5, 1),
		"moth-eaten": {Positions: bracket.Positions, Triangles: slices.Concat(
			bracket.Triangles[:60], bracket.Triangles[90:150], bracket.Triangles[153:210])},
	} {
		count := map[[2]int32]int{} // faces by edge
		key := func(a, b int32) [2]int32 { return [2]int32{min(a, b), max(a, b)} }
		for h, v := range m.Triangles {
			count[key(v, m.Triangles[h-h%3+(h+1)%3])]++
		}
		for e, n := range count {
			if n != 1 {
				delete(count, e)
			}
		}
		for _, l := range mesh.BoundaryLoops(m) {
			seen := map[int32]bool{}
			for _, v := range l.Vertices {
				if seen[v] {
					t.Errorf("%s: vertex %d twice in one loop", name, v)
				}
				seen[v] = true
			}
			for _, e := range l.Edges() {
				if count[key(e[0], e[1])] != 1 {
					t.Errorf("%s: edge %v is not on the boundary, or in two loops", name, e)
				}
				delete(count, key(e[0], e[1]))
			}
		}
		if len(count) > 0 {
			t.Errorf("%s: %d boundary edges in no loop", name, len(count))
		}
	}
}

// A rim runs as its faces do: on a plate seen from above, counter-clockwise.
func TestLoopRunsAsItsFacesDo(t *testing.T) {
	l := mesh.BoundaryLoops(meshtest.Plate(2, 3, 2, 2, 0, 0))[0]
	if want := []int32{0, 3, 6, 7, 8, 5, 2, 1}; !slices.Equal(l.Vertices, want) {
		t.Errorf("got %v, want %v", l.Vertices, want)
	}
}

// A Möbius band has one rim, which passes each column twice.
func TestMoebiusBandHasOneRim(t *testing.T) {
	const n = 20
	loops := mesh.BoundaryLoops(meshtest.MoebiusBand(n, 2))
	want := 0.0
	rim := func(i int) (x, y, z float64) {
		u := 2 * math.Pi * float64(i) / n
		r := 1 + math.Cos(u/2)/2
		return r * math.Cos(u), r * math.Sin(u), math.Sin(u/2) / 2
	}
	for i := range 2 * n {
		x0, y0, z0 := rim(i)
		x1, y1, z1 := rim(i + 1)
		want += math.Sqrt((x1-x0)*(x1-x0) + (y1-y0)*(y1-y0) + (z1-z0)*(z1-z0))
	}
	if len(loops) != 1 || len(loops[0].Vertices) != 2*n || math.Abs(loops[0].Length-want) > 1e-13 {
		t.Errorf("got %v, want one loop of %d vertices and length %v", loops, 2*n, want)
	}
}
