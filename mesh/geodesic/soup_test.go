package geodesic_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// soup is a few random triangles over a few random places: many to an edge, doubled,
// flat to a line or a point, all in one plane, or nearly any of these.
func soup(t *testing.T, seed uint64) *mesh.Mesh {
	rng := rand.New(rand.NewPCG(seed, 77))
	n := 4 + rng.IntN(8)
	positions := make([]float64, 3*n)
	kind := rng.IntN(3)
	for i := range positions {
		switch kind {
		case 0:
			positions[i] = float64(rng.IntN(3))
		case 1:
			positions[i] = rng.Float64()
		case 2:
			positions[i] = float64(rng.IntN(4)) + 1e-9*rng.Float64()*float64(rng.IntN(2))
		}
		if i%3 == 2 && seed%3 == 0 {
			positions[i] = 0
		}
	}
	var triangles []int32
	for range 3 + rng.IntN(14) {
		p := rng.Perm(n)
		triangles = append(triangles, int32(p[0]), int32(p[1]), int32(p[2]))
	}
	return build(t, positions, triangles...)
}

// Whatever the triangles, distance is symmetric, between the straight line and the way
// over a graph of points on the edges, and takes little memory. Coordinates are up to
// 3, so 1e-14 is some tens of ulps of what distances are computed from.
func TestSoup(t *testing.T) {
	// 1724 has a source on an edge whose rays another window cuts off at its very foot.
	seeds := []uint64{1724}
	for seed := range uint64(250) {
		seeds = append(seeds, seed)
	}
	for _, seed := range seeds {
		m := soup(t, seed)
		s := geodesic.NewSolver(m)
		n := m.NumVertices()
		d := make([][]float64, n)
		for u := range n {
			w, err := s.Spread(t.Context(), []mesh.Datum{mesh.AtVertex(int32(u))}, geodesic.Options{MaxBytes: 1e6})
			if err != nil {
				continue // a vertex of no triangle with an area
			}
			d[u] = w.Distances
			graph := graphDistances(m, int32(u), 3)
			for v, x := range d[u] {
				if math.IsInf(x, 1) {
					continue
				}
				if straight := gap(m.Positions[3*u:], m.Positions[3*v:]); !(x >= straight*(1-1e-12)-1e-14 && x <= graph[v]*(1+1e-12)+1e-14) {
					t.Errorf("seed %d, %d to %d: straight %.17g, exact %.17g, graph %.17g", seed, u, v, straight, x, graph[v])
				}
			}
		}
		for u := range n {
			for v := range u {
				if d[u] == nil || d[v] == nil {
					continue
				}
				if there, back := d[u][v], d[v][u]; there != back && !(math.Abs(there-back) <= 1e-11*there+1e-14) {
					t.Errorf("seed %d, %d to %d: there %.17g, back %.17g", seed, u, v, there, back)
				}
				if seed%10 == 0 {
					line, err := s.Path(t.Context(), []mesh.Datum{mesh.AtVertex(int32(u))}, []mesh.Datum{mesh.AtVertex(int32(v))}, geodesic.Options{})
					if err != nil {
						t.Errorf("seed %d, line from %d to %d: %v", seed, u, v, err)
					} else if line != nil {
						near(t, "line", line.Length, d[u][v], 1e-11)
					}
				}
			}
		}
	}
}

// Lines run straight over triangles without area.
func TestLinesOverTrianglesWithoutArea(t *testing.T) {
	plate := build(t, []float64{0, 0, 0, 2, 0, 0, 0.7, 0, 0, 1, 1, 0, 1.2, -1, 0, 1.4, 0, 0, 0.9, 0, 0},
		0, 2, 3, 2, 6, 3, 6, 5, 3, 5, 1, 3, 1, 0, 4, 0, 1, 2, 2, 1, 5, 2, 5, 6)
	for name, m := range map[string]*mesh.Mesh{"sewn": sewn(0.2), "regular, sewn": sewn(0), "caps": plate} {
		s := geodesic.NewSolver(m)
		rng := rand.New(rand.NewPCG(4, 4))
		for range 150 {
			u, v := int32(rng.IntN(m.NumVertices())), int32(rng.IntN(m.NumVertices()))
			line, err := s.Path(t.Context(), []mesh.Datum{mesh.AtVertex(u)}, []mesh.Datum{mesh.AtVertex(v)}, geodesic.Options{})
			if err != nil {
				t.Errorf("%s: %d to %d: %v", name, u, v, err)
				continue
			}
			if want := gap(m.Positions[3*u:], m.Positions[3*v:]); math.Abs(line.Length-want) > 1e-12 ||
				math.Abs(line.S[len(line.S)-1]-want) > 1e-9*want {
				t.Errorf("%s: %d to %d: got %g, line %g, want %g", name, u, v, line.Length, line.S[len(line.S)-1], want)
			}
		}
	}
}

// Two needles back to back, their short sides in one place: round-off on the long sides
// once brought the wave round their common end a little shorter each time, for ever.
func TestWaveGoesRoundOnlyOnce(t *testing.T) {
	m := soup(t, 10992)
	source := mesh.AtPoint(mesh.Point{Triangle: 4, Weights: [3]float64{0.7, 0, 0.3}})
	w, err := geodesic.NewSolver(m).Spread(t.Context(), []mesh.Datum{source}, geodesic.Options{MaxBytes: 1e6})
	if err != nil {
		t.Fatal(err)
	}
	if w.Windows > 100 {
		t.Errorf("%d windows over %d triangles", w.Windows, m.NumTriangles())
	}
}
