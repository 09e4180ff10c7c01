package krylov

import (
	"context"
	"errors"
	"math"
	"testing"
)

// Against dense eigenvalues (gonum) of sheets with uneven weights.
func TestSmallestMatchesDense(t *testing.T) {
	p := newPlate(14, 6)
	n := len(p.mass)
	for _, count := range []int{1, 5, 40, 120, n - 1} {
		e, err := Smallest(context.Background(), p.pencil(1000, 2), count, 1e-9, nil)
		if err != nil {
			t.Fatalf("%d: %v", count, err)
		}
		for l, lambda := range e.Values {
			// The constant mode is deflated. Rounding: 1e-16 times the stiffest over the
			// gravest eigenvalue; the tolerance enters by its square.
			if want := p.values[l+1]; math.Abs(lambda-want) > 1e-11*want {
				t.Errorf("%d wanted, mode %d: %.12g, want %.12g", count, l, lambda, want)
			}
			if e.Bounds[l] > 1e-9 {
				t.Errorf("%d wanted, mode %d: bound %g", count, l, e.Bounds[l])
			}
		}
		for i, x := range e.Vectors {
			for j, y := range e.Vectors[:i+1] {
				s, want := 0.0, 0.0
				for k := range n {
					s += x[k] * p.mass[k] * y[k]
				}
				if i == j {
					want = 1
				}
				if math.Abs(s-want) > 1e-12 {
					t.Fatalf("%d wanted: modes %d and %d have product %g", count, i, j, s)
				}
			}
		}
		t.Logf("%d modes of %d: %d solves, %d restarts", count, n, e.Solves, e.Restarts)
	}
}

// Twenty equal sheets side by side: every eigenvalue twenty times, far more than a
// block holds.
func TestSmallestFindsMultiplicities(t *testing.T) {
	const copies = 20
	p := newPlate(5, 2)
	n := len(p.mass)
	one := p.pencil(1000, 1)
	part := func(do func(dst, x []float64)) func(dst, x []float64) {
		return func(dst, x []float64) {
			for c := range copies {
				do(dst[c*n:(c+1)*n], x[c*n:(c+1)*n])
			}
		}
	}
	all := &Pencil{Dim: copies * n, Shift: one.Shift, Workers: 1, Mass: part(one.Mass), Solve: part(one.Solve),
		Deflate: func(x []float64) {
			for c := range copies {
				one.Deflate(x[c*n : (c+1)*n])
			}
		}}
	for _, count := range []int{7, 30, 50} {
		e, err := Smallest(context.Background(), all, count, 1e-9, nil)
		if err != nil {
			t.Fatal(err)
		}
		for l, lambda := range e.Values {
			if want := p.values[1+l/copies]; math.Abs(lambda-want) > 1e-11*want {
				t.Errorf("%d wanted, mode %d: %.12g, want %.12g", count, l, lambda, want)
			}
		}
		t.Logf("%d modes: %d solves, %d restarts", count, e.Solves, e.Restarts)
	}
}

func TestSmallestSaysWhenThereAreNotSoMany(t *testing.T) {
	p := newPlate(3, 1)
	var few *ConvergenceError
	if _, err := Smallest(context.Background(), p.pencil(1000, 1), 9, 1e-9, nil); !errors.As(err, &few) {
		t.Errorf("9 modes beside the constant one of 9 unknowns: got %v, want a *ConvergenceError", err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Smallest(ctx, p.pencil(1000, 1), 2, 1e-9, nil); err != context.Canceled {
		t.Errorf("got %v, want context.Canceled", err)
	}
}
