package geodesic_test

import (
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// Where several lines are equally short, by symmetry, the line must say so; elsewhere not.
func TestSeveral(t *testing.T) {
	type point = [3]float64
	edge := func(m *mesh.Mesh, x float64) mesh.Datum {
		return mesh.AtEdges(edgesWhere(m, func(p [3]float64) bool { return p[0] == x }))
	}
	tall := func(jitter float64) *mesh.Mesh { return meshtest.Box(1, 1, 2, [3]int{8, 8, 16}, jitter, 1) }
	room := meshtest.Box(30, 12, 12, [3]int{15, 6, 6}, 0.2, 1)
	slit := meshtest.SlitPlate(8, 0.5, 1.5, 0.2, 1)
	plate := meshtest.Plate(2, 1, 8, 4, 0.2, 1)
	l := meshtest.LPlate(8, 0.2, 1)
	octahedron := meshtest.Octahedron(2)
	book := meshtest.Book(3, 4)
	for _, tc := range []struct {
		name     string
		m        *mesh.Mesh
		from, to mesh.Datum
		want     bool
	}{
		{"box, centre to centre", tall(0.2), at(t, tall(0.2), point{0.5, 0.5, 0}), at(t, tall(0.2), point{0.5, 0.5, 2}), true},
		{"box, along the grid", tall(0), at(t, tall(0), point{0.5, 0.5, 0}), at(t, tall(0), point{0.5, 0.5, 2}), true},
		{"box, off centre", tall(0.2), at(t, tall(0.2), point{0.5, 0.51, 0}), at(t, tall(0.2), point{0.5, 0.52, 2}), false},
		{"box, one wall", tall(0), at(t, tall(0), point{0, 0.5, 0.5}), at(t, tall(0), point{0, 0.5, 1.5}), false},
		{"room", room, at(t, room, point{0, 6, 11}), at(t, room, point{30, 6, 1}), true}, // and its mirror image
		{"room, to the side", room, at(t, room, point{0, 5.9, 11}), at(t, room, point{30, 6, 1}), false},
		{"slit, round either end", slit, at(t, slit, point{0.5, 1, 0}), at(t, slit, point{1.5, 1, 0}), true},
		{"slit, round one end", slit, at(t, slit, point{0.5, 0.9, 0}), at(t, slit, point{1.5, 1, 0}), false},
		{"opposite sides of a plate", plate, edge(plate, 0), edge(plate, 2), true},
		{"side and point of a plate", plate, edge(plate, 0), at(t, plate, point{1.1, 0.43, 0}), false},
		{"round a notch", l, at(t, l, point{2, 0.9, 0}), at(t, l, point{0.9, 2, 0}), false},
		{"octahedron, tip to tip", octahedron, mesh.AtVertex(0), mesh.AtVertex(1), true},
		{"octahedron, along an edge", octahedron, mesh.AtVertex(0), mesh.AtVertex(2), false},
		{"book", book, mesh.AtVertex(int32(book.NumVertices() - 1)), mesh.AtVertex(7), false},
	} {
		line, err := geodesic.Path(t.Context(), tc.m, []mesh.Datum{tc.from}, []mesh.Datum{tc.to})
		if err != nil {
			t.Errorf("%s: %v", tc.name, err)
		} else if line.Several != tc.want {
			t.Errorf("%s: length %g, several %v", tc.name, line.Length, line.Several)
		}
	}
	// Two targets equally far are two lines.
	line, err := geodesic.Path(t.Context(), plate, []mesh.Datum{at(t, plate, point{1, 0.5, 0})},
		[]mesh.Datum{at(t, plate, point{0, 0, 0}), at(t, plate, point{2, 1, 0})})
	if err != nil {
		t.Fatal(err)
	}
	if !line.Several {
		t.Error("two corners equally far: one line")
	}
}

// Lines that part and meet again before the last bend are several.
func TestSeveralBeforeABend(t *testing.T) {
	o := meshtest.Octahedron(1)
	n := int32(o.NumVertices())
	tip := o.Positions[3:6] // vertex 1, from which one more triangle hangs
	m := build(t, append(append([]float64(nil), o.Positions...), tip[0]-1, 1, 0, tip[0]-1, -1, 0),
		append(append([]int32(nil), o.Triangles...), 1, n, n+1)...)
	line, err := geodesic.Path(t.Context(), m, []mesh.Datum{mesh.AtVertex(0)}, []mesh.Datum{mesh.AtVertex(n)})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "tip to tip and on", line.Length, math.Sqrt(3)+math.Sqrt(2), 1e-14)
	if !line.Several {
		t.Error("four ways to the tip: one line")
	}
}

// The line names the source and the target that it joins.
func TestWhichSourceAndTarget(t *testing.T) {
	m := meshtest.Plate(2, 1, 8, 4, 0.2, 1)
	far := at(t, m, [3]float64{0, 0, 0})
	for name, d := range map[string]mesh.Datum{
		"vertex": at(t, m, [3]float64{2, 1, 0}),
		"point":  at(t, m, [3]float64{1.83, 0.91, 0}),
		"edges":  mesh.AtEdges(edgesWhere(m, func(p [3]float64) bool { return p[0] == 2 })),
	} {
		aim := at(t, m, [3]float64{1.7, 0.6, 0})
		line, err := geodesic.Path(t.Context(), m, []mesh.Datum{far, d}, []mesh.Datum{aim})
		if err != nil {
			t.Fatal(err)
		}
		if line.From != 1 || line.To != 0 {
			t.Errorf("from %s: joins %d to %d", name, line.From, line.To)
		}
		if line, err = geodesic.Path(t.Context(), m, []mesh.Datum{aim}, []mesh.Datum{far, d}); err != nil {
			t.Fatal(err)
		}
		if line.From != 0 || line.To != 1 {
			t.Errorf("to %s: joins %d to %d", name, line.From, line.To)
		}
	}
}
