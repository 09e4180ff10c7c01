package geodesic_test

import (
	"container/heap"
	"fmt"
	"math"
	"testing"
	"time"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// BenchmarkField is the exact distance of all vertices of a jittered sphere from one,
// beside Dijkstra's algorithm along its edges. Measured on one core of a server that
// others kept busy:
//
//	faces    exact/dijkstra   ns/window   windows/face   bytes/face (tables)
//	20480    16               85          25             165
//	81920    20               75          50             157
//	327680   24               72          97             153
//
// A sphere is the hard case: no vertex is flat, so every one splits a window, and the
// windows that pass an edge grow with the square root of the number of faces.
func BenchmarkField(b *testing.B) {
	for _, k := range []int{5, 6, 7} {
		m := meshtest.Icosphere(k, 0.25, 1)
		b.Run(fmt.Sprintf("faces=%d", m.NumTriangles()), func(b *testing.B) {
			neighbours := alongEdges(m)
			var exact, graph time.Duration
			var w *geodesic.Wave
			for b.Loop() {
				start := time.Now()
				var err error
				w, err = geodesic.NewSolver(m).Spread(b.Context(), []mesh.Datum{mesh.AtVertex(0)}, geodesic.Options{})
				if err != nil {
					b.Fatal(err)
				}
				exact += time.Since(start)
				start = time.Now()
				neighbours.distances(0)
				graph += time.Since(start)
			}
			b.ReportMetric(float64(exact)/float64(graph), "exact/dijkstra")
			b.ReportMetric(float64(exact)/float64(b.N)/float64(w.Windows), "ns/window")
			b.ReportMetric(float64(w.Windows)/float64(m.NumTriangles()), "windows/face")
			b.ReportMetric(float64(w.PeakBytes)/float64(m.NumTriangles())+26, "bytes/face") // and 26 in the Solver
		})
	}
}

// BenchmarkKinds is the exact field on other kinds of surface: flat ones, whose windows
// join again behind each vertex; saddles; and slivers as CAD systems write them.
func BenchmarkKinds(b *testing.B) {
	slivers, _ := meshtest.Bracket(700, 17)
	for _, kind := range []struct {
		name string
		m    *mesh.Mesh
	}{
		{"plate", meshtest.Plate(1, 1, 200, 200, 0.2, 1)},
		{"bumpy", bumpy(6)},
		{"torus", meshtest.Torus(1, 0.4, 400, 128, 0.25, 1)},
		{"bracket", slivers},
	} {
		b.Run(kind.name, func(b *testing.B) {
			m := kind.m
			s := geodesic.NewSolver(m)
			var w *geodesic.Wave
			for b.Loop() {
				var err error
				if w, err = s.Spread(b.Context(), []mesh.Datum{mesh.AtVertex(0)}, geodesic.Options{}); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(w.Windows)/float64(m.NumTriangles()), "windows/face")
			b.ReportMetric(float64(b.Elapsed())/float64(b.N)/float64(m.NumTriangles()), "ns/face")
		})
	}
}

// BenchmarkPath is a shortest line to a point at a tenth of a sphere's diameter, and
// the share of a full field's time that it takes.
func BenchmarkPath(b *testing.B) {
	m := meshtest.Icosphere(6, 0.25, 1)
	s := geodesic.NewSolver(m)
	source := []mesh.Datum{mesh.AtVertex(0)}
	start := time.Now()
	full, err := s.Spread(b.Context(), source, geodesic.Options{})
	if err != nil {
		b.Fatal(err)
	}
	field := time.Since(start)
	var target int32
	for v, d := range full.Distances {
		if math.Abs(d-math.Pi/10) < math.Abs(full.Distances[target]-math.Pi/10) {
			target = int32(v)
		}
	}
	for b.Loop() {
		if _, err := s.Path(b.Context(), source, []mesh.Datum{mesh.AtVertex(target)}, geodesic.Options{}); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed())/float64(b.N)/float64(field), "of-field")
}

// graph is a mesh's edges by vertex.
type graph struct {
	first, to []int32
	length    []float64
}

func alongEdges(m *mesh.Mesh) *graph {
	n := m.NumVertices()
	g := &graph{first: make([]int32, n+1)}
	for h := range m.Triangles {
		g.first[m.Triangles[h]+1]++
	}
	for v := range n {
		g.first[v+1] += g.first[v]
	}
	// On a closed surface each edge is one triangle's way there and the other's way back.
	g.to, g.length = make([]int32, len(m.Triangles)), make([]float64, len(m.Triangles))
	fill := append([]int32(nil), g.first[:n]...)
	for h, v := range m.Triangles {
		u := m.Triangles[h-h%3+(h+1)%3]
		g.to[fill[v]], g.length[fill[v]] = u, gap(m.Positions[3*v:], m.Positions[3*u:])
		fill[v]++
	}
	return g
}

type node struct {
	d float64
	v int32
}

type nodes []node

func (q nodes) Len() int           { return len(q) }
func (q nodes) Less(i, j int) bool { return q[i].d < q[j].d }
func (q nodes) Swap(i, j int)      { q[i], q[j] = q[j], q[i] }
func (q *nodes) Push(x any)        { *q = append(*q, x.(node)) }
func (q *nodes) Pop() any {
	last := (*q)[len(*q)-1]
	*q = (*q)[:len(*q)-1]
	return last
}

func (g *graph) distances(source int32) []float64 {
	d := make([]float64, len(g.first)-1)
	for i := range d {
		d[i] = math.Inf(1)
	}
	d[source] = 0
	q := nodes{{0, source}}
	for len(q) > 0 {
		e := heap.Pop(&q).(node)
		if e.d > d[e.v] {
			continue
		}
		for i := g.first[e.v]; i < g.first[e.v+1]; i++ {
			if x := e.d + g.length[i]; x < d[g.to[i]] {
				d[g.to[i]] = x
				heap.Push(&q, node{x, g.to[i]})
			}
		}
	}
	return d
}
