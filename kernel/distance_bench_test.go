package kernel

import (
	"context"
	"fmt"
	"testing"
	"time"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// BenchmarkDistance goes all the way from a mesh in memory to distances on a jittered
// sphere, and gives the milliseconds of each stage: surface (gluing), delaunay (flips),
// operators (L and M), solver (those and the symbolic analysis), heat (numeric factor
// and solve) and front (the sweeps).
func BenchmarkDistance(b *testing.B) {
	for _, k := range []int{5, 6, 7, 8} {
		m := meshtest.Icosphere(k, 0.25, 1)
		b.Run(fmt.Sprintf("vertices=%d", m.NumVertices()), func(b *testing.B) {
			b.ReportAllocs()
			spent := map[string]time.Duration{}
			var began time.Time
			lap := func(stage string) {
				now := time.Now()
				spent[stage] += now.Sub(began)
				began = now
			}
			for b.Loop() {
				began = time.Now()
				s, err := mesh.NewSurface(m)
				if err == nil {
					err = s.Place([]mesh.Datum{mesh.AtVertex(0)})
				}
				if err != nil {
					b.Fatal(err)
				}
				lap("surface")
				s.Delaunay(s.NumVertices)
				lap("delaunay")
				s.Laplacian()
				s.LumpedMass()
				lap("operators")
				v, err := NewSolver(context.Background(), s, Options{Progress: func(stage string, done float64) {
					if stage == "front" && done == 0 {
						lap("heat")
					}
				}})
				if err != nil {
					b.Fatal(err)
				}
				lap("solver")
				ask(b, v, nil)
				lap("front")
			}
			for stage, d := range spent {
				b.ReportMetric(d.Seconds()*1e3/float64(b.N), stage+"-ms")
			}
		})
	}
}

// BenchmarkDistanceAgain is one more question to a solver that stands: what each source
// costs when there are many.
func BenchmarkDistanceAgain(b *testing.B) {
	m := meshtest.Icosphere(6, 0.25, 1)
	_, v := placed(b, m, mesh.AtVertex(0))
	ask(b, v, nil)
	for b.Loop() {
		ask(b, v, nil)
	}
}
