package mesh_test

import (
	"bytes"
	"context"
	"encoding/json"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// FuzzMesh reads bytes as a small mesh (a count of vertices, a byte for each
// coordinate, then corners) and asks everything of it: nothing may panic, and what
// can be known without the code under test must hold.
func FuzzMesh(f *testing.F) {
	f.Add([]byte{4, 0, 0, 0, 9, 0, 0, 0, 9, 0, 0, 0, 9, 0, 1, 2, 0, 3, 1, 0, 2, 3, 1, 3, 2})
	f.Add([]byte{3, 0, 0, 0, 9, 0, 0, 4, 0, 0, 0, 1, 2})
	f.Fuzz(func(t *testing.T, data []byte) {
		if len(data) == 0 || len(data) > 400 {
			return
		}
		n := 1 + int(data[0])%32
		data = data[1:]
		if len(data) < 3*n {
			return
		}
		m := &mesh.Mesh{Positions: make([]float64, 3*n)}
		for i := range m.Positions {
			x := float64(int8(data[i]))
			if data[i] == 0x7f {
				x = 1e-9 // flat but for a hair
			}
			m.Positions[i] = x / 8
		}
		corners := data[3*n:]
		for h := range len(corners) / 3 * 3 {
			m.Triangles = append(m.Triangles, int32(int(corners[h])%n))
		}
		r := mesh.Check(m)
		if _, err := json.Marshal(r); err != nil {
			t.Fatal(err)
		}
		if err := r.WriteText(new(bytes.Buffer)); err != nil {
			t.Fatal(err)
		}
		boundary := 0
		for _, l := range mesh.BoundaryLoops(m) {
			boundary += len(l.Edges())
		}
		if boundary != r.BoundaryEdges {
			t.Errorf("%d edges in loops, %d on the boundary", boundary, r.BoundaryEdges)
		}
		if welded := m.Weld(0.2); welded.NumVertices() > n || welded.NumTriangles() != m.NumTriangles() {
			t.Errorf("welding makes %d vertices of %d", welded.NumVertices(), n)
		}
		if again := meshtest.Soup(m).Weld(0); again.NumVertices() > n {
			t.Errorf("a soup of %d vertices welds to %d", n, again.NumVertices())
		}
		l := mesh.NewLocator(m)
		if l.Triangles() > 0 {
			corner := [3]float64(m.Positions[:3])
			at, gap := l.Nearest(corner)
			q := m.Position(at)
			if d := math.Hypot(math.Hypot(q[0]-corner[0], q[1]-corner[1]), q[2]-corner[2]); math.Abs(d-gap) > 1e-13 {
				t.Errorf("gap %v to a point at %v", gap, d)
			}
		}
		fine, err := mesh.Refine(context.Background(), m, 4, 5000)
		if err == nil && math.Abs(mesh.Check(fine).Area-r.Area) > 1e-9*(1+r.Area) {
			t.Errorf("area %v became %v", r.Area, mesh.Check(fine).Area)
		}
	})
}
