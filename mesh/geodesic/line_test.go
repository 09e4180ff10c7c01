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

// shapes are kinds of surface that lines must cope with.
func shapes() map[string]*mesh.Mesh {
	return map[string]*mesh.Mesh{
		"box":          meshtest.Box(3, 2, 1, [3]int{6, 4, 2}, 0.2, 1),
		"regular box":  meshtest.Box(3, 2, 1, [3]int{6, 4, 2}, 0, 1),
		"plain box":    meshtest.Box(3, 2, 1, [3]int{1, 1, 1}, 0, 1),
		"sphere":       meshtest.Icosphere(3, 0.2, 1),
		"shaken":       meshtest.ShakenSphere(3, 2),
		"torus":        meshtest.Torus(2, 1, 24, 16, 0.2, 1),
		"grid torus":   meshtest.Torus(2, 1, 24, 16, 0, 1),
		"saddle fan":   meshtest.Fan(10, math.Pi/3, []float64{0.5, 1, 1.5}),
		"slit plate":   meshtest.SlitPlate(8, 0.5, 1.5, 0.2, 3),
		"flat slit":    meshtest.SlitPlate(8, 0.5, 1.5, 0, 3),
		"L":            meshtest.LPlate(6, 0.2, 3),
		"paraboloid":   meshtest.Paraboloid(1, 10, 0.2, 3),
		"book":         meshtest.Book(5, 4),
		"moebius band": meshtest.MoebiusBand(40, 5),
		"reversed":     meshtest.Reverse(meshtest.Icosphere(3, 0.2, 1), 0.5, 4),
		"bracket":      bracket(),
		"bumpy":        bumpy(3),
	}
}

func bracket() *mesh.Mesh {
	m, _ := meshtest.Bracket(3, 12)
	return m
}

// bumpy is a sphere with waves, half of whose vertices are saddles.
func bumpy(k int) *mesh.Mesh {
	return meshtest.Map(meshtest.Icosphere(k, 0.2, 1), func(p [3]float64) [3]float64 {
		r := 1 + 0.2*math.Sin(5*p[0])*math.Sin(4*p[1]+1)*math.Cos(3*p[2])
		return [3]float64{r * p[0], r * p[1], r * p[2]}
	})
}

func randomDatum(m *mesh.Mesh, rng *rand.Rand) mesh.Datum {
	f := int32(rng.IntN(m.NumTriangles()))
	switch rng.IntN(4) {
	case 0:
		return mesh.AtVertex(m.Triangles[3*f])
	case 1:
		u := rng.Float64()
		return mesh.AtPoint(mesh.Point{Triangle: f, Weights: [3]float64{u, 0, 1 - u}})
	case 2:
		return mesh.AtEdges([][2]int32{{m.Triangles[3*f], m.Triangles[3*f+1]}, {m.Triangles[3*f+2], m.Triangles[3*f+1]}})
	}
	u, v := rng.Float64(), rng.Float64()
	if u+v > 1 {
		u, v = 1-u, 1-v
	}
	return mesh.AtPoint(mesh.Point{Triangle: f, Weights: [3]float64{u, v, 1 - u - v}})
}

// A line must lie in its triangles, begin and end at its data, and be as long as the
// distance that propagation gives from the other end.
func TestLines(t *testing.T) {
	for name, m := range shapes() {
		t.Run(name, func(t *testing.T) {
			s := geodesic.NewSolver(m)
			rng := rand.New(rand.NewPCG(1, 2))
			for trial := range 40 {
				from, to := randomDatum(m, rng), randomDatum(m, rng)
				line, err := s.Path(t.Context(), []mesh.Datum{from}, []mesh.Datum{to}, geodesic.Options{})
				if err != nil {
					t.Errorf("trial %d: from %s to %s: %v", trial, describe(from), describe(to), err)
					continue
				}
				back := between(t, s, to, from)
				if math.Abs(line.Length-back) > 1e-11*back { // two ways of adding up many unfoldings
					t.Errorf("trial %d: length %.17g, back %.17g", trial, line.Length, back)
				}
				checkLine(t, m, line, fmt.Sprintf("trial %d", trial))
			}
		})
	}
}

func describe(d mesh.Datum) string {
	if d.Point != nil {
		return fmt.Sprint(*d.Point)
	}
	return fmt.Sprint(d.Vertex, d.Edges)
}

func checkLine(t *testing.T, m *mesh.Mesh, line *geodesic.Line, what string) {
	t.Helper()
	n := len(line.S)
	if len(line.Points) != 3*n || len(line.Triangles) != n {
		t.Fatalf("%s: lengths %d, %d, %d do not match", what, len(line.Points), n, len(line.Triangles))
	}
	near(t, what+": end of s", line.S[n-1], line.Length, 1e-9)
	for i := range n - 1 {
		p, q := line.Points[3*i:3*i+3], line.Points[3*i+3:3*i+6]
		// 1e-9 of the line is what the tracer snaps to a vertex.
		if math.Abs(line.S[i+1]-line.S[i]-gap(p, q)) > 1e-14*line.Length {
			t.Errorf("%s: s does not follow the points at %d", what, i)
		}
		for _, x := range [][]float64{p, q} {
			if off := outside(m, line.Triangles[i], x); off > 1e-8*(line.Length+1) {
				t.Errorf("%s: point %v of stretch %d is %g outside triangle %d", what, x, i, off, line.Triangles[i])
			}
		}
	}
}

// outside is how far p lies from triangle f, roughly.
func outside(m *mesh.Mesh, f int32, p []float64) float64 {
	a, b, c := corner(m, 3*int(f)), corner(m, 3*int(f)+1), corner(m, 3*int(f)+2)
	x := [3]float64(p)
	n := cross(minus(b, a), minus(c, a))
	area := math.Sqrt(dot(n, n))
	off := math.Abs(dot(minus(x, a), n)) / area
	for _, e := range [3][2][3]float64{{a, b}, {b, c}, {c, a}} {
		side := minus(e[1], e[0])
		off = max(off, -dot(cross(side, minus(x, e[0])), n)/area/math.Sqrt(dot(side, side)))
	}
	return off
}
