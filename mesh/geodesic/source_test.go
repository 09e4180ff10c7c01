package geodesic_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// edgesWhere lists the edges both of whose ends satisfy in.
func edgesWhere(m *mesh.Mesh, in func(p [3]float64) bool) (edges [][2]int32) {
	seen := map[[2]int32]bool{}
	for h := range m.Triangles {
		a, b := m.Triangles[h], m.Triangles[h-h%3+(h+1)%3]
		if e := [2]int32{min(a, b), max(a, b)}; !seen[e] && in(corner(m, h)) && in(corner(m, h-h%3+(h+1)%3)) {
			seen[e] = true
			edges = append(edges, e)
		}
	}
	return edges
}

// The distance to a whole edge is that to its nearest point, not to its nearest end: in
// a flat convex plate the distance from a point to a segment.
func TestEdgesOnAPlate(t *testing.T) {
	m := meshtest.Plate(2, 1, 12, 6, 0.24, 8)
	rng := rand.New(rand.NewPCG(1, 1))
	for range 30 {
		h := rng.IntN(len(m.Triangles))
		a, b := corner(m, h), corner(m, h-h%3+(h+1)%3)
		edge := mesh.AtEdges([][2]int32{{m.Triangles[h], m.Triangles[h-h%3+(h+1)%3]}})
		for v, d := range field(t, m, edge) {
			want := toSegment([3]float64(m.Positions[3*v:]), a, b)
			if math.Abs(d-want) > 1e-14 { // unfolding in the plane: some ulps of 2
				t.Errorf("edge at halfedge %d, vertex %d: got %.17g, want %.17g", h, v, d, want)
			}
		}
	}
	var rim [][2]int32
	for axis, far := range [2]float64{2, 1} {
		for _, side := range [2]float64{0, far} {
			rim = append(rim, edgesWhere(m, func(p [3]float64) bool { return p[axis] == side })...)
		}
	}
	for v, d := range field(t, m, mesh.AtEdges(rim)) {
		x, y := m.Positions[3*v], m.Positions[3*v+1]
		if want := min(x, 2-x, y, 1-y); math.Abs(d-want) > 1e-14 {
			t.Errorf("rim, vertex %d: got %.17g, want %.17g", v, d, want)
		}
	}
}

func toSegment(p, a, b [3]float64) float64 {
	ab, ap := minus(b, a), minus(p, a)
	s := min(max(dot(ab, ap)/dot(ab, ab), 0), 1)
	q := minus(ap, [3]float64{s * ab[0], s * ab[1], s * ab[2]})
	return math.Sqrt(dot(q, q))
}

// From the rim of a prism every point's distance is its height: parallel rays that bend
// with the facets.
func TestRimOfAPrism(t *testing.T) {
	m := meshtest.Cylinder(1, 3, 11, 9, 0.2, 2)
	rim := edgesWhere(m, func(p [3]float64) bool { return p[2] == 0 })
	if len(rim) != 11 {
		t.Fatalf("%d edges", len(rim))
	}
	for v, d := range field(t, m, mesh.AtEdges(rim)) {
		near(t, fmt.Sprintf("vertex %d", v), d, m.Positions[3*v+2], 1e-14)
	}
}

// From the four edges of a box's floor: down the wall; on the lid to the nearest wall
// and down.
func TestFloorOfABox(t *testing.T) {
	const a, b, c = 3, 2, 1
	m := meshtest.Box(a, b, c, [3]int{9, 6, 3}, 0.24, 8)
	var floor [][2]int32
	for axis, far := range [2]float64{a, b} {
		for _, side := range [2]float64{0, far} {
			floor = append(floor, edgesWhere(m, func(p [3]float64) bool { return p[2] == 0 && p[axis] == side })...)
		}
	}
	for v, d := range field(t, m, mesh.AtEdges(floor)) {
		x, y, z := m.Positions[3*v], m.Positions[3*v+1], m.Positions[3*v+2]
		want := z
		if z == 0 || z == c {
			want = z + min(x, a-x, y, b-y)
		}
		if math.Abs(d-want) > 1e-14 {
			t.Errorf("vertex %d at %g,%g,%g: got %.17g, want %.17g", v, x, y, z, d, want)
		}
	}
}

// A spine of many pages is a source to all of them.
func TestSpineOfABook(t *testing.T) {
	m := meshtest.Book(4, 5)
	spine := edgesWhere(m, func(p [3]float64) bool { return p[0] == 0 && p[1] == 0 })
	for v, d := range field(t, m, mesh.AtEdges(spine)) {
		if want := math.Hypot(m.Positions[3*v], m.Positions[3*v+1]); math.Abs(d-want) > 1e-15 {
			t.Errorf("vertex %d: got %v, want %v", v, d, want)
		}
	}
}

// Several sources give the least of their distances.
func TestUnion(t *testing.T) {
	for name, m := range shapes() {
		rng := rand.New(rand.NewPCG(8, 9))
		for trial := range 3 {
			var data []mesh.Datum
			for range 4 {
				data = append(data, randomDatum(m, rng))
			}
			want := field(t, m, data[0])
			for _, d := range data[1:] {
				for v, x := range field(t, m, d) {
					want[v] = min(want[v], x)
				}
			}
			for v, got := range field(t, m, data...) {
				near(t, fmt.Sprintf("%s, trial %d, vertex %d", name, trial, v), got, want[v], 1e-12)
			}
		}
	}
}

// An edge is all of its points: no point of it is nearer than the edge, and the nearest
// of points 1/64 of the edge apart no farther than half of that step.
func TestEdgeAgainstItsPoints(t *testing.T) {
	for name, m := range shapes() {
		s := geodesic.NewSolver(m)
		rng := rand.New(rand.NewPCG(2, 9))
		f := int32(rng.IntN(m.NumTriangles()))
		edge := mesh.AtEdges([][2]int32{{m.Triangles[3*f], m.Triangles[3*f+1]}})
		length := gap(m.Positions[3*m.Triangles[3*f]:], m.Positions[3*m.Triangles[3*f+1]:])
		var points []mesh.Datum
		for i := range 65 {
			u := float64(i) / 64
			points = append(points, mesh.AtPoint(mesh.Point{Triangle: f, Weights: [3]float64{1 - u, u, 0}}))
		}
		w, err := s.Spread(t.Context(), points, geodesic.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for v, d := range field(t, m, edge) {
			over := w.Distances[v] - d
			if over < -1e-12*d || over > length/128+1e-12*d {
				t.Errorf("%s: vertex %d: edge %.17g, its points %.17g", name, v, d, w.Distances[v])
			}
		}
	}
}
