package geodesic_test

import (
	"container/heap"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// Distance is a metric: symmetric, and no way by a third place is shorter. Both hold to
// round-off: 1e-12 for some hundred unfoldings one way and the other.
func TestMetric(t *testing.T) {
	for name, m := range shapes() {
		rng := rand.New(rand.NewPCG(3, 4))
		const count = 8
		var places [count]int32
		var d [count][]float64
		for i := range places {
			places[i] = m.Triangles[rng.IntN(len(m.Triangles))]
			d[i] = field(t, m, mesh.AtVertex(places[i]))
		}
		for i := range count {
			for j := range count {
				near(t, fmt.Sprintf("%s: d(%d,%d) against d(%d,%d)", name, i, j, j, i), d[i][places[j]], d[j][places[i]], 1e-12)
				for v := range d[i] {
					if d[i][v] > d[i][places[j]]+d[j][v]+1e-12*d[i][v] {
						t.Fatalf("%s: d(%d,%d) = %g is longer than by way of %d: %g + %g", name, places[i], v, d[i][v],
							places[j], d[i][places[j]], d[j][v])
					}
				}
			}
		}
	}
}

// The straight line through space is no longer, the shortest way along edges no shorter,
// and a graph with points on the edges comes down to the exact distance as they grow
// dense. Points 1/(k+1) of an edge apart cost O(1/k^2) of the length.
func TestBetweenStraightLineAndGraph(t *testing.T) {
	for name, m := range map[string]*mesh.Mesh{
		"sphere":     meshtest.Icosphere(2, 0.2, 1),
		"bumpy":      bumpy(2),
		"box":        meshtest.Box(3, 2, 1, [3]int{3, 2, 1}, 0.2, 1),
		"saddle fan": meshtest.Fan(10, math.Pi/3, []float64{0.5, 1, 1.5}),
		"slit plate": meshtest.SlitPlate(4, 0.5, 1.5, 0.2, 3),
		"book":       meshtest.Book(5, 2),
	} {
		source := m.Triangles[7]
		exact := field(t, m, mesh.AtVertex(source))
		last := math.Inf(1)
		for _, k := range []int{0, 1, 3, 7, 15} {
			graph := graphDistances(m, source, k)
			excess := 0.0
			for v, d := range exact {
				if d < gap(m.Positions[3*v:], m.Positions[3*source:])*(1-1e-14) {
					t.Errorf("%s: vertex %d: %g is less than the straight line", name, v, d)
				}
				if graph[v] < d*(1-1e-13) {
					t.Errorf("%s: vertex %d, %d points an edge: graph gives %.17g, exact %.17g", name, v, k, graph[v], d)
				}
				if d > 0 {
					excess += (graph[v]/d - 1) / float64(len(exact))
				}
			}
			// From k to 2k+1 points the spacing halves: 4 in theory, 2.2 on these few.
			if k > 0 && excess > last/2.2 {
				t.Errorf("%s: %d points an edge: mean excess %g after %g", name, k, excess, last)
			}
			last = excess
		}
		if last > 1e-3 {
			t.Errorf("%s: 15 points an edge: mean excess %g", name, last)
		}
	}
}

// graphDistances is Dijkstra's algorithm over the vertices and k points on every edge,
// all points on the rim of a triangle joined.
func graphDistances(m *mesh.Mesh, source int32, k int) []float64 {
	n := m.NumVertices()
	points := append([]float64(nil), m.Positions...)
	edges := map[[2]int32]int{}
	rims := make([][]int, m.NumTriangles())
	for f := range rims {
		for c := range 3 {
			a, b := m.Triangles[3*f+c], m.Triangles[3*f+(c+1)%3]
			rims[f] = append(rims[f], int(a))
			key := [2]int32{min(a, b), max(a, b)}
			first, ok := edges[key]
			if !ok {
				first = len(points) / 3
				edges[key] = first
				for i := range k {
					s := float64(i+1) / float64(k+1)
					for axis := range 3 {
						points = append(points, (1-s)*m.Positions[3*int(key[0])+axis]+s*m.Positions[3*int(key[1])+axis])
					}
				}
			}
			for i := range k {
				rims[f] = append(rims[f], first+i)
			}
		}
	}
	at := make([][]int, len(points)/3)
	for f, rim := range rims {
		for _, p := range rim {
			at[p] = append(at[p], f)
		}
	}
	d := make([]float64, len(at))
	for i := range d {
		d[i] = math.Inf(1)
	}
	d[source] = 0
	q := queue{{0, int(source)}}
	for len(q) > 0 {
		e := heap.Pop(&q).(entry)
		if e.d > d[e.p] {
			continue
		}
		for _, f := range at[e.p] {
			for _, p := range rims[f] {
				if x := e.d + gap(points[3*e.p:], points[3*p:]); x < d[p] {
					d[p] = x
					heap.Push(&q, entry{x, p})
				}
			}
		}
	}
	return d[:n]
}

type entry struct {
	d float64
	p int
}

type queue []entry

func (q queue) Len() int           { return len(q) }
func (q queue) Less(i, j int) bool { return q[i].d < q[j].d }
func (q queue) Swap(i, j int)      { q[i], q[j] = q[j], q[i] }
func (q *queue) Push(x any)        { *q = append(*q, x.(entry)) }
func (q *queue) Pop() any {
	last := (*q)[len(*q)-1]
	*q = (*q)[:len(*q)-1]
	return last
}

// Neither how triangles are cut, nor where the mesh lies, nor its unit, nor the order of
// its triangles and vertices may change a distance by more than round-off.
func TestInvariance(t *testing.T) {
	for name, m := range shapes() {
		source := m.Triangles[5]
		want := field(t, m, mesh.AtVertex(source))
		n := m.NumVertices()
		perm := meshtest.Permutation(n, 9)
		for _, tc := range []struct {
			name  string
			m     *mesh.Mesh
			scale float64
			perm  []int32
		}{
			{"cut in four", quarter(m), 1, nil},
			{"turned", meshtest.Rotate(m, [3]float64{1, 2, 3}, 1), 1, nil},
			{"tiny", meshtest.Scale(m, 1e-60), 1e-60, nil},
			{"huge", meshtest.Scale(m, 1e60), 1e60, nil},
			{"shuffled", meshtest.Shuffle(m, 3), 1, nil},
			{"half turned round", meshtest.Reverse(m, 0.5, 3), 1, nil},
			{"renumbered", meshtest.Renumber(m, perm), 1, perm},
		} {
			from := source
			if tc.perm != nil {
				from = tc.perm[source]
			}
			got := field(t, tc.m, mesh.AtVertex(from))
			for v := range n {
				u := v
				if tc.perm != nil {
					u = int(tc.perm[v])
				}
				near(t, fmt.Sprintf("%s, %s: vertex %d", name, tc.name, v), got[u]/tc.scale, want[v], 1e-12)
			}
		}
	}
}

// quarter cuts every triangle in four at the middles of its sides: the same surface.
func quarter(m *mesh.Mesh) *mesh.Mesh {
	positions := append([]float64(nil), m.Positions...)
	middle := map[[2]int32]int32{}
	var triangles []int32
	for f := range m.NumTriangles() {
		var v, w [3]int32
		for k := range v {
			a, b := m.Triangles[3*f+k], m.Triangles[3*f+(k+1)%3]
			v[k] = a
			key := [2]int32{min(a, b), max(a, b)}
			if _, ok := middle[key]; !ok {
				middle[key] = int32(len(positions) / 3)
				for axis := range int32(3) {
					positions = append(positions, (m.Positions[3*a+axis]+m.Positions[3*b+axis])/2)
				}
			}
			w[k] = middle[key]
		}
		triangles = append(triangles, v[0], w[0], w[2], w[0], v[1], w[1], w[2], w[1], v[2], w[0], w[1], w[2])
	}
	fine, err := mesh.New(positions, triangles)
	if err != nil {
		panic(err)
	}
	return fine
}

// Results are the same bits each time.
func TestRepeatable(t *testing.T) {
	m := bumpy(3)
	a, b := field(t, m, mesh.AtVertex(3)), field(t, m, mesh.AtVertex(3))
	for v := range a {
		if math.Float64bits(a[v]) != math.Float64bits(b[v]) {
			t.Fatalf("vertex %d: %v, then %v", v, a[v], b[v])
		}
	}
}

// At agrees with a wave that has the point for its target, and with one that comes from
// the point.
func TestAt(t *testing.T) {
	for name, m := range shapes() {
		s := geodesic.NewSolver(m)
		rng := rand.New(rand.NewPCG(5, 6))
		for trial := range 6 {
			from := randomDatum(m, rng)
			w, err := s.Spread(t.Context(), []mesh.Datum{from}, geodesic.Options{Keep: true})
			if err != nil {
				t.Fatal(err)
			}
			for range 5 {
				f := int32(rng.IntN(m.NumTriangles()))
				u, v := rng.Float64(), rng.Float64()
				if u+v > 1 {
					u, v = 1-u, 1-v
				}
				p := mesh.Point{Triangle: f, Weights: [3]float64{u, v, 1 - u - v}}
				got := w.At(p)
				near(t, fmt.Sprintf("%s, trial %d: against a target", name, trial), got, between(t, s, from, mesh.AtPoint(p)), 1e-13)
				near(t, fmt.Sprintf("%s, trial %d: against the way back", name, trial), got, between(t, s, mesh.AtPoint(p), from), 1e-12)
			}
		}
	}
}
