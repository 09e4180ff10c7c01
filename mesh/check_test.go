package mesh_test

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// Euler's formula, elementary areas and counts of grids: E, chi and genus follow from
// how the shapes are built, not from the code under test.
func TestCheckKnownShapes(t *testing.T) {
	bracket, _ := meshtest.Bracket(7, 9)
	for _, tc := range []struct {
		name                     string
		m                        *mesh.Mesh
		edges, chi, loops, genus int // genus -1: none
		components               int
		area                     float64 // 0: not checked
		fit                      bool
	}{
		{"tetrahedron", meshtest.Tetrahedron(0), 6, 2, 0, 0, 1, math.Sqrt(3), true},
		{"sphere", meshtest.ShakenSphere(3, 1), 3 * 640, 2, 0, 0, 1, 0, true},
		{"torus", meshtest.Torus(2, 1, 24, 12, 0.2, 1), 3 * 24 * 12, 0, 0, 1, 1, 0, true},
		{"bracket", bracket, 0, 2 - 4*7, 0, 14, 1, 0, true},
		{"plate", meshtest.Plate(2, 3, 4, 5, 0.2, 1), 4*6 + 5*5 + 20, 1, 1, 0, 1, 6, true},
		{"tube", meshtest.Cylinder(1, 3, 6, 4, 0, 0), 6*4*3 + 6, 0, 2, 0, 1, 18, true},
		{"inner-slit", meshtest.SlitPlate(4, 0.5, 1.5, 0, 0), 0, 0, 2, 0, 1, 4, true},
		{"moebius", meshtest.MoebiusBand(20, 3), 0, 0, 1, -1, 1, 0, true},
		{"book", meshtest.Book(3, 2), 0, 1, 3, -1, 1, 3, true},
		{"two", meshtest.Join(meshtest.Tetrahedron(1), meshtest.Torus(2, 1, 9, 9, 0, 0)), 0, 2, 0, 1, 2, 0, true},
		{"soup", meshtest.Soup(meshtest.Tetrahedron(1)), 48, 16, 16, 0, 16, math.Sqrt(3), false},
	} {
		t.Run(tc.name, func(t *testing.T) {
			r := mesh.Check(tc.m)
			genus := -1
			if r.Genus != nil {
				genus = *r.Genus
			}
			if tc.edges > 0 && r.Edges != tc.edges || r.EulerCharacteristic != tc.chi || len(r.BoundaryLoops) != tc.loops ||
				genus != tc.genus || r.Components != tc.components || r.FitForDistance != tc.fit || r.FitForHeat != tc.fit {
				t.Errorf("edges %d, chi %d, loops %d, genus %d, components %d, fit %v; want %+v",
					r.Edges, r.EulerCharacteristic, len(r.BoundaryLoops), genus, r.Components, r.FitForDistance, tc)
			}
			if tc.area > 0 && math.Abs(r.Area-tc.area) > 1e-13*tc.area {
				t.Errorf("area %v, want %v", r.Area, tc.area)
			}
			if r.Angle.Mean != r.Angle.Mean || math.Abs(r.Angle.Mean-60) > 1e-10 { // Euclid I.32: three corners make 180 degrees
				t.Errorf("mean angle %v, want 60", r.Angle.Mean)
			}
		})
	}
}

// Every fault that Check speaks of, made one at a time.
func TestCheckFindsFaults(t *testing.T) {
	plate := func() *mesh.Mesh { return meshtest.Plate(3, 3, 3, 3, 0, 0) }
	add := func(m *mesh.Mesh, corners ...int32) *mesh.Mesh {
		m.Triangles = append(m.Triangles, corners...)
		return m
	}
	lone := plate()
	lone.Positions = append(lone.Positions, 9, 9, 9)
	turned := plate()
	turned.Triangles[24], turned.Triangles[25] = turned.Triangles[25], turned.Triangles[24] // a middle cell's
	bow := &mesh.Mesh{
		Positions: []float64{0, 0, 0, 3, 0, 0, 3, 4, 0, -6, 0, 0, -6, -8, 0},
		Triangles: []int32{0, 1, 2, 0, 3, 4},
	}
	wide := &mesh.Mesh{ // opposite angles of the long diagonal: 2*atan(2) = 127 degrees each, as the kite is wide
		Positions: []float64{-2, 0, 0, 2, 0, 0, 0, 1, 0, 0, -1, 0},
		Triangles: []int32{0, 1, 2, 1, 0, 3},
	}
	folded := &mesh.Mesh{
		Positions: []float64{0, 0, 0, 1, 0, 0, 0.5, 1, 0, 0.4, 1.2, 0},
		Triangles: []int32{0, 1, 2, 1, 0, 3},
	}
	for _, tc := range []struct {
		name  string
		m     *mesh.Mesh
		count func(*mesh.Report) int
		want  int
	}{
		{"isolated", lone, func(r *mesh.Report) int { return r.IsolatedVertices }, 1},
		{"repeated-corner", add(plate(), 0, 0, 1), func(r *mesh.Report) int { return r.RepeatedCorners }, 1},
		{"flat", add(plate(), 0, 1, 2), func(r *mesh.Report) int { return r.FlatFaces }, 1},
		{"duplicate-same-order", add(plate(), plate().Triangles[3:6]...), func(r *mesh.Report) int { return r.DuplicateFaces }, 1},
		{"duplicate-turned", add(plate(), plate().Triangles[4], plate().Triangles[3], plate().Triangles[5]),
			func(r *mesh.Report) int { return r.DuplicateFaces }, 1},
		{"no-duplicate", meshtest.Book(5, 3), func(r *mesh.Report) int { return r.DuplicateFaces }, 0},
		{"inconsistent", turned, func(r *mesh.Report) int { return r.InconsistentEdges }, 3},
		{"reversed", turned, func(r *mesh.Report) int { return r.ReversedFaces }, 1},
		{"spine", meshtest.Book(3, 4), func(r *mesh.Report) int { return r.NonManifoldEdges }, 4},
		{"pinched", bow, func(r *mesh.Report) int { return r.NonManifoldVertices }, 1},
		{"not-delaunay", wide, func(r *mesh.Report) int { return r.NonDelaunayEdges }, 1},
		{"square-grid-is-delaunay", plate(), func(r *mesh.Report) int { return r.NonDelaunayEdges }, 0},
		{"folded", folded, func(r *mesh.Report) int { return r.FoldedEdges }, 1},
		{"slit-coincides", meshtest.SlitPlate(8, 1, 2, 0, 0), func(r *mesh.Report) int { return r.CoincidentVertices }, 8},
		{"slit-would-be-joined", meshtest.SlitPlate(8, 1, 2, 0, 0), func(r *mesh.Report) int { return r.WeldJoins }, 8},
		{"nothing-to-join", plate(), func(r *mesh.Report) int { return r.WeldJoins }, 0},
		{"sliver", &mesh.Mesh{Positions: []float64{0, 0, 0, 1, 0, 0, 1, 0.01, 0}, Triangles: []int32{0, 1, 2}},
			func(r *mesh.Report) int { return r.Slivers }, 1},
	} {
		t.Run(tc.name, func(t *testing.T) {
			if got := tc.count(mesh.Check(tc.m)); got != tc.want {
				t.Errorf("got %d, want %d", got, tc.want)
			}
		})
	}
}

// Numbers, order and orientation of triangles are names, not facts: the report may not
// change with them, save for the names in it and the last digits of sums.
func TestCheckSeesThroughNumbering(t *testing.T) {
	for name, m := range map[string]*mesh.Mesh{
		"coil": meshtest.Coil(3, 5, 2, 0.5, 60, 8, 0.2, 1),
		"book": meshtest.Book(3, 3),
		"slit": meshtest.SlitPlate(4, 1, 2, 0.2, 1),
	} {
		want := mesh.Check(m)
		other := mesh.Check(meshtest.Shuffle(meshtest.Renumber(m, meshtest.Permutation(m.NumVertices(), 1)), 1))
		for i := range other.BoundaryLoops {
			other.BoundaryLoops[i].FirstVertex = want.BoundaryLoops[i].FirstVertex
		}
		if a, b := rounded(t, want), rounded(t, other); a != b {
			t.Errorf("%s: %s\nrenumbered: %s", name, a, b)
		}
	}
}

// rounded is the report as JSON, numbers to 10 digits (sums differ in the last of 16).
func rounded(t *testing.T, r *mesh.Report) string {
	t.Helper()
	text, err := json.Marshal(r)
	if err != nil {
		t.Fatal(err)
	}
	var tree any
	if err := json.Unmarshal(text, &tree); err != nil {
		t.Fatal(err)
	}
	var walk func(any) any
	walk = func(x any) any {
		switch x := x.(type) {
		case map[string]any:
			for k := range x {
				x[k] = walk(x[k])
			}
		case []any:
			for i := range x {
				x[i] = walk(x[i])
			}
		case float64:
			if math.Abs(x) < 1e-5 { // flat bends: rounding
				return "0"
			}
			return fmt.Sprintf("%.10g", x)
		}
		return x
	}
	text, err = json.Marshal(walk(tree))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// A unit changes lengths and areas, and nothing else, up to sizes that cannot be squared.
func TestCheckInAnyUnit(t *testing.T) {
	m := meshtest.Box(1, 2, 3, [3]int{2, 3, 4}, 0.2, 1)
	want := mesh.Check(m)
	for _, exponent := range []int{-900, -20, 20, 500, 900} {
		got := mesh.Check(meshtest.Scale(m, math.Ldexp(1, exponent)))
		if exponent > -600 && exponent < 500 && got.Area != math.Ldexp(want.Area, 2*exponent) {
			t.Errorf("2^%d: area %v", exponent, got.Area)
		}
		if got.EdgeLength.Median != math.Ldexp(want.EdgeLength.Median, exponent) || *got.Angle != *want.Angle || got.Edges != want.Edges {
			t.Errorf("2^%d: edges of %v, angles %v", exponent, got.EdgeLength.Median, *got.Angle)
		}
		if got.FitForHeat != (exponent > -460 && exponent < 460) { // 1e-140 and 1e140 are 2^-465 and 2^465
			t.Errorf("2^%d: fit %v", exponent, got.FitForHeat)
		}
		if _, err := json.Marshal(got); err != nil {
			t.Errorf("2^%d: %v", exponent, err)
		}
	}
}

// Whatever the triangles are, Check ends with a report that can be written.
func TestCheckNeverFails(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 9))
	for trial := range 300 {
		n := 1 + rng.IntN(12)
		m := &mesh.Mesh{}
		for range 3 * n {
			x := float64(rng.IntN(3))
			if trial%5 == 0 {
				x = math.Ldexp(rng.NormFloat64(), rng.IntN(2000)-1000)
			}
			m.Positions = append(m.Positions, x)
		}
		for range 3 * rng.IntN(30) {
			m.Triangles = append(m.Triangles, int32(rng.IntN(n)))
		}
		r := mesh.Check(m)
		if _, err := json.Marshal(r); err != nil {
			t.Fatalf("trial %d: %v", trial, err)
		}
		if err := r.WriteText(new(bytes.Buffer)); err != nil {
			t.Fatal(err)
		}
		// Halfedges of proper faces are those of edges: counted by a map.
		edges := map[[2]int32]bool{}
		for f := 0; f < len(m.Triangles); f += 3 {
			c := m.Triangles[f : f+3]
			if c[0] != c[1] && c[1] != c[2] && c[2] != c[0] {
				for k := range 3 {
					u, v := c[k], c[(k+1)%3]
					edges[[2]int32{min(u, v), max(u, v)}] = true
				}
			}
		}
		if r.Edges != len(edges) {
			t.Fatalf("trial %d: %d edges, want %d", trial, r.Edges, len(edges))
		}
	}
}

func TestReportText(t *testing.T) {
	m := meshtest.Join(meshtest.Plate(1, 1, 2, 2, 0, 0), meshtest.Translate(meshtest.Plate(1, 1, 2, 2, 0, 0), [3]float64{1, 0, 0}))
	m.File = mesh.FileInfo{Name: "two.stl", Format: "stl"}
	var b strings.Builder
	if err := mesh.Check(m).WriteText(&b); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{
		"two.stl (STL)", "loop 0", "length 4, 8 vertices from vertex 0", "verdict: not fit for distance or heat as it is",
		"2 components are 1 once boundary vertices that touch are joined", "give --weld 0, unless",
	} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("%q is not in\n%s", want, b.String())
		}
	}
}

// Every key of the report is lower_snake_case, as scripts expect.
func TestReportKeys(t *testing.T) {
	typ := reflect.TypeFor[mesh.Report]()
	for i := range typ.NumField() {
		key, _, _ := strings.Cut(typ.Field(i).Tag.Get("json"), ",")
		if key == "" || strings.Trim(key, "abcdefghijklmnopqrstuvwxyz0123456789_") != "" {
			t.Errorf("%s has the key %q", typ.Field(i).Name, key)
		}
	}
}

// Quantiles against a sort.
func TestSpreadQuantiles(t *testing.T) {
	m := meshtest.ShakenSphere(3, 2)
	r := mesh.Check(m)
	seen := map[[2]int32]bool{}
	var lengths []float64
	for h, u := range m.Triangles {
		v := m.Triangles[h-h%3+(h+1)%3]
		if e := [2]int32{min(u, v), max(u, v)}; !seen[e] {
			seen[e] = true
			lengths = append(lengths, totalLength(m, [][2]int32{e}))
		}
	}
	slices.Sort(lengths)
	n := float64(len(lengths) - 1)
	at := func(q float64) float64 { return lengths[int(math.Round(q*n))] }
	want := mesh.Spread{Min: at(0), P1: at(0.01), P25: at(0.25), Median: at(0.5), P75: at(0.75), P99: at(0.99), Max: at(1), Mean: r.EdgeLength.Mean}
	if *r.EdgeLength != want {
		t.Errorf("got %+v, want %+v", *r.EdgeLength, want)
	}
}

func BenchmarkCheck(b *testing.B) {
	m := meshtest.Icosphere(8, 0.2, 1)
	for b.Loop() {
		mesh.Check(m)
	}
}
