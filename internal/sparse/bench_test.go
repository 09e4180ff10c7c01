package sparse

import (
	"context"
	"fmt"
	"runtime"
	"testing"
	"time"
)

type benchMesh struct {
	coords []float64
	m      *Matrix
}

var benchMeshes = map[int]benchMesh{}

// benchSphere is the graph of a shaken icosphere with some mass: 10 242 vertices at level 5, 40 962,
// 163 842, 655 362 at level 8.
func benchSphere(levels int) benchMesh {
	b, ok := benchMeshes[levels]
	if !ok {
		coords, edges := icosphere(levels)
		b = benchMesh{coords, fromEdges(len(coords)/3, edges, unit, 0.01)}
		benchMeshes[levels] = b
	}
	return b
}

func BenchmarkSphere(b *testing.B) {
	for levels := 5; levels <= 8; levels++ {
		n := 10<<(2*levels) + 2
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			s := benchSphere(levels)
			workers := runtime.GOMAXPROCS(0)
			b.Run("order", func(b *testing.B) {
				for b.Loop() {
					if _, _, _, err := dissect(context.Background(), s.m.Pattern, s.coords, workers); err != nil {
						b.Fatal(err)
					}
				}
			})
			a := mustAnalyze(b, s.m.Pattern, Options{Coords: s.coords})
			st := a.Stats()
			b.Run("analyze", func(b *testing.B) {
				for b.Loop() {
					mustAnalyze(b, s.m.Pattern, Options{Coords: s.coords})
				}
				b.ReportMetric(float64(st.FactorNonzeros)/1e6, "Mnnz")
				b.ReportMetric(float64(st.StoredValues)/1e6, "Mstored")
				b.ReportMetric(st.Flops/1e9, "GFlop")
				b.ReportMetric(float64(st.Supernodes), "supernodes")
				b.ReportMetric(float64(st.PeakBytes)/(1<<20), "peakMiB")
			})
			f := a.NewFactor()
			b.Run("factor", func(b *testing.B) {
				start := time.Now()
				for b.Loop() {
					mustFactorize(b, f, s.m, nil)
				}
				b.ReportMetric(st.Flops*float64(b.N)/float64(time.Since(start).Nanoseconds()), "GFlop/s")
			})
			mustFactorize(b, f, s.m, nil)
			for _, k := range []int{1, 4, 16} {
				x := make([]float64, n*k)
				for i := range x {
					x[i] = 1
				}
				b.Run(fmt.Sprintf("solve%d", k), func(b *testing.B) {
					for b.Loop() {
						f.SolveManyTo(x, x, k)
					}
				})
			}
		})
	}
}
