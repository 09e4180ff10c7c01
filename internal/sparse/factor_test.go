package sparse

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func mustAnalyze(t testing.TB, p *Pattern, opt Options) *Analysis {
	t.Helper()
	a, err := Analyze(context.Background(), p, opt)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func mustFactorize(t testing.TB, f *Factor, m *Matrix, held []bool) {
	t.Helper()
	if err := f.Factorize(context.Background(), m, held); err != nil {
		t.Fatal(err)
	}
}

// randomMatrix is a sparse positive definite matrix with entries of both signs: its diagonal is
// above the sum of its row's absolute values.
func randomMatrix(rng *rand.Rand, n, edges int) *Matrix {
	list := make([][2]int32, 0, edges)
	for len(list) < edges && n > 1 {
		if a, b := rng.IntN(n), rng.IntN(n); a != b {
			list = append(list, [2]int32{int32(a), int32(b)})
		}
	}
	m := fromEdges(n, list, unit, 0)
	for i := range n {
		m.Diag[i] = 0.1 + rng.Float64()
	}
	for i := range int32(n) {
		for k := m.Ptr[i]; k < m.Ptr[i+1]; k++ {
			if j := m.Adj[k]; j > i {
				v := rng.NormFloat64()
				m.Off[k] = v
				for q := m.Ptr[j]; q < m.Ptr[j+1]; q++ {
					if m.Adj[q] == i {
						m.Off[q] = v
					}
				}
				m.Diag[i] += math.Abs(v)
				m.Diag[j] += math.Abs(v)
			}
		}
	}
	return m
}

func toDense(m *Matrix, held []bool) *mat.SymDense {
	n := m.Dim()
	d := mat.NewSymDense(n, nil)
	for i := range n {
		if held != nil && held[i] {
			d.SetSym(i, i, 1)
			continue
		}
		d.SetSym(i, i, m.Diag[i])
		for k := m.Ptr[i]; k < m.Ptr[i+1]; k++ {
			if j := int(m.Adj[k]); held == nil || !held[j] {
				d.SetSym(i, j, m.Off[k])
			}
		}
	}
	return d
}

// Gonum's dense Cholesky is the outside witness. The matrices are diagonally dominant with condition
// numbers under 1e3, so solutions agree within 1e3·2^-52 times a few.
func TestSolveAgainstDenseCholesky(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for trial := range 200 {
		n := 1 + rng.IntN(120)
		m := randomMatrix(rng, n, rng.IntN(4*n))
		var held []bool
		if trial%3 == 0 {
			held = make([]bool, n)
			for i := range held {
				held[i] = rng.IntN(5) == 0
			}
		}
		f := mustAnalyze(t, m.Pattern, Options{}).NewFactor()
		mustFactorize(t, f, m, held)
		var chol mat.Cholesky
		if !chol.Factorize(toDense(m, held)) {
			t.Fatal("gonum finds the test matrix not positive definite")
		}
		b := make([]float64, n)
		for i := range b {
			b[i] = rng.NormFloat64()
		}
		var want mat.VecDense
		if err := chol.SolveVecTo(&want, mat.NewVecDense(n, b)); err != nil {
			t.Fatal(err)
		}
		x := make([]float64, n)
		f.SolveTo(x, b)
		for i := range x {
			if !(math.Abs(x[i]-want.AtVec(i)) <= 1e-12*mat.Norm(&want, math.Inf(1))) {
				t.Fatalf("trial %d, n=%d: x[%d] = %v, gonum has %v", trial, n, i, x[i], want.AtVec(i))
			}
		}
	}
}

func TestSingularMatrixIsRefused(t *testing.T) {
	for _, levels := range []int{1, 3, 5} {
		coords, edges := icosphere(levels)
		m := fromEdges(len(coords)/3, edges, unit, 0)
		f := mustAnalyze(t, m.Pattern, Options{Coords: coords}).NewFactor()
		err := f.Factorize(context.Background(), m, nil)
		var e *NotPositiveDefiniteError
		if !errors.As(err, &e) {
			t.Fatalf("levels %d: a pure Neumann matrix: got %v, want a *NotPositiveDefiniteError", levels, err)
		}
		if math.Abs(e.Pivot) > 6*0x1p-52*float64(m.Dim()+64) { // a rounding of the diagonal for each row
			t.Errorf("pivot %g at row %d: want round-off of the diagonal, which is 6", e.Pivot, e.Row)
		}
		held := make([]bool, m.Dim())
		held[e.Row] = true
		mustFactorize(t, f, m, held)

		// Round-off leaves last pivots of either sign; positive ones must not pass.
		rng := rand.New(rand.NewPCG(uint64(levels), 41))
		for trial := range 20 {
			m := fromEdges(len(coords)/3, edges, func(int) float64 { return rng.ExpFloat64() }, 0)
			if err := f.Factorize(context.Background(), m, nil); !errors.As(err, &e) {
				t.Errorf("levels %d, trial %d: singular, but got %v", levels, trial, err)
			}
		}
	}
}
