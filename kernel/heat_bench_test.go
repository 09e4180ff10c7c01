package kernel

import (
	"context"
	"fmt"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// BenchmarkHeatKernels is one unit of heat on a jittered sphere, at one time and at four:
// "first" makes the solver as well, "again" asks one that has its factors.
func BenchmarkHeatKernels(b *testing.B) {
	for _, k := range []int{5, 6, 7, 8} {
		b.Run(fmt.Sprintf("vertices=%d", 10<<(2*k)+2), func(b *testing.B) {
			s, v := placed(b, meshtest.Icosphere(k, 0.25, 1), mesh.AtVertex(0))
			load := s.Load([]mesh.Datum{mesh.AtVertex(0)})
			for _, times := range [][]float64{{0.1}, {0.01, 0.1, 0.5, 1}} {
				solves := 0
				heat := func(b *testing.B, v *Solver) {
					r, err := v.HeatKernels(context.Background(), load, times, HeatOptions{})
					if err != nil {
						b.Fatal(err)
					}
					solves = r.Solves
				}
				b.Run(fmt.Sprintf("times=%d/first", len(times)), func(b *testing.B) {
					for b.Loop() {
						fresh, err := NewSolver(context.Background(), s, Options{})
						if err != nil {
							b.Fatal(err)
						}
						heat(b, fresh)
					}
					b.ReportMetric(float64(solves), "solves")
				})
				b.Run(fmt.Sprintf("times=%d/again", len(times)), func(b *testing.B) {
					heat(b, v)
					for b.Loop() {
						heat(b, v)
					}
					b.ReportMetric(float64(solves), "solves")
				})
			}
		})
	}
}
