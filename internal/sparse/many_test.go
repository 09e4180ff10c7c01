package sparse

import (
	"math"
	"math/rand/v2"
	"testing"
)

// Each column of a blocked solve must be the single solve's, but for the order of sums. The
// matrices' condition numbers are below 1e3.
func TestSolveManyEqualsSingle(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 12))
	for trial := range 30 {
		m := grid(1+rng.IntN(40), 1+rng.IntN(40))
		if trial%3 == 0 {
			m = randomMatrix(rng, 1+rng.IntN(150), 400)
		}
		n := m.Dim()
		f := mustAnalyze(t, m.Pattern, Options{}).NewFactor()
		mustFactorize(t, f, m, nil)
		k := 1 + trial
		b := make([]float64, n*k)
		for i := range b {
			b[i] = rng.NormFloat64() * math.Pow(10, float64(10*(i/n)))
		}
		x := make([]float64, n*k)
		f.SolveManyTo(x, b, k)
		one := make([]float64, n)
		for c := range k {
			f.SolveTo(one, b[c*n:c*n+n])
			largest := 0.0
			for _, v := range one {
				largest = max(largest, math.Abs(v))
			}
			for i, v := range one {
				if !(math.Abs(x[c*n+i]-v) <= 1e-12*largest) {
					t.Fatalf("n=%d, column %d of %d: x[%d] = %v, alone %v", n, c, k, i, x[c*n+i], v)
				}
			}
		}
		f.SolveManyTo(b, b, k)
		for i := range b {
			if b[i] != x[i] {
				t.Fatal("in place differs")
			}
		}
	}
}
