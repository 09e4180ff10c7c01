package geodesic_test

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"

	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// table reads testdata/reference/NAME: a map from column to field for each row.
func table(t *testing.T, name string) []map[string]string {
	t.Helper()
	f, err := os.Open("../../testdata/reference/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	records, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var rows []map[string]string
	for _, r := range records[1:] {
		row := map[string]string{}
		for i, name := range records[0] {
			row[name] = r[i]
		}
		rows = append(rows, row)
	}
	return rows
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

func point(t *testing.T, row map[string]string, names ...string) (p [3]float64) {
	t.Helper()
	for i, n := range names {
		p[i] = number(t, row[n])
	}
	return p
}

// at is the datum at p: the vertex there, or else the point of the triangle that p
// lies in. Brute force.
func at(t testing.TB, m *mesh.Mesh, p [3]float64) mesh.Datum {
	t.Helper()
	for v := range m.NumVertices() {
		if gap(m.Positions[3*v:], p[:]) < 1e-12 {
			return mesh.AtVertex(int32(v))
		}
	}
	best, least := mesh.Point{}, math.Inf(1)
	for f := range m.NumTriangles() {
		a, b, c := corner(m, 3*f), corner(m, 3*f+1), corner(m, 3*f+2)
		n := cross(minus(b, a), minus(c, a))
		nn := dot(n, n)
		if nn == 0 {
			continue
		}
		w := [3]float64{
			dot(cross(minus(b, p), minus(c, p)), n) / nn,
			dot(cross(minus(c, p), minus(a, p)), n) / nn,
			dot(cross(minus(a, p), minus(b, p)), n) / nn,
		}
		outside := math.Abs(dot(minus(p, a), n)) / math.Sqrt(nn)
		for _, x := range w {
			outside = max(outside, -x)
		}
		if outside < least {
			least = outside
			best = mesh.Point{Triangle: int32(f), Weights: w}
		}
	}
	if least > 1e-12 {
		t.Fatalf("no triangle holds %v: off by %g", p, least)
	}
	return mesh.AtPoint(best)
}

func corner(m *mesh.Mesh, h int) (p [3]float64) {
	copy(p[:], m.Positions[3*m.Triangles[h]:])
	return p
}

func minus(a, b [3]float64) [3]float64 { return [3]float64{a[0] - b[0], a[1] - b[1], a[2] - b[2]} }

func dot(a, b [3]float64) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }

func cross(a, b [3]float64) [3]float64 {
	return [3]float64{a[1]*b[2] - a[2]*b[1], a[2]*b[0] - a[0]*b[2], a[0]*b[1] - a[1]*b[0]}
}

func gap(a, b []float64) float64 {
	return math.Sqrt((a[0]-b[0])*(a[0]-b[0]) + (a[1]-b[1])*(a[1]-b[1]) + (a[2]-b[2])*(a[2]-b[2]))
}

// between is the distance from one datum to another, the wave stopped when it is known.
func between(t testing.TB, s *geodesic.Solver, from, to mesh.Datum) float64 {
	t.Helper()
	w, err := s.Spread(t.Context(), []mesh.Datum{from}, geodesic.Options{Targets: []mesh.Datum{to}})
	if err != nil {
		t.Fatal(err)
	}
	return w.Targets[0]
}

func field(t testing.TB, m *mesh.Mesh, data ...mesh.Datum) []float64 {
	t.Helper()
	d, err := geodesic.Field(t.Context(), m, data, geodesic.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// near reports a distance that differs from what is wanted by more than tol (relative).
func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol*math.Abs(want)) {
		t.Errorf("%s: got %.17g, want %.17g (off by %.2g relative)", what, got, want, (got-want)/want)
	}
}
