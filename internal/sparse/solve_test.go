package sparse

import (
	"context"
	"math"
	"testing"
)

// grid is the 5-point matrix of an nx × ny grid with zero values around it.
func grid(nx, ny int) *Matrix {
	p := &Pattern{Ptr: []int64{0}}
	m := &Matrix{Pattern: p}
	for y := range ny {
		for x := range nx {
			for _, d := range [4][2]int{{0, -1}, {-1, 0}, {1, 0}, {0, 1}} {
				if u, v := x+d[0], y+d[1]; u >= 0 && u < nx && v >= 0 && v < ny {
					p.Adj = append(p.Adj, int32(v*nx+u))
					m.Off = append(m.Off, -1)
				}
			}
			p.Ptr = append(p.Ptr, int64(len(p.Adj)))
			m.Diag = append(m.Diag, 4)
		}
	}
	return m
}

// The eigenvectors of the 5-point matrix are products of sines (the discrete sine transform), so solving for one must scale it.
func TestSolveGridEigenvector(t *testing.T) {
	nx, ny := 37, 23
	m := grid(nx, ny)
	a, err := Analyze(context.Background(), m.Pattern, Options{})
	if err != nil {
		t.Fatal(err)
	}
	f := a.NewFactor()
	if err := f.Factorize(context.Background(), m, nil); err != nil {
		t.Fatal(err)
	}
	kx, ky := 3, 2
	ax, ay := math.Pi*float64(kx)/float64(nx+1), math.Pi*float64(ky)/float64(ny+1)
	lambda := 4 - 2*math.Cos(ax) - 2*math.Cos(ay)
	b, x := make([]float64, nx*ny), make([]float64, nx*ny)
	for i := range b {
		b[i] = math.Sin(ax*float64(i%nx+1)) * math.Sin(ay*float64(i/nx+1))
	}
	if e := f.SolveRefinedTo(x, b); e > 1e-15 {
		t.Errorf("backward error %g", e)
	}
	for i := range x {
		if math.Abs(x[i]-b[i]/lambda) > 1e-13/lambda {
			t.Fatalf("x[%d] = %g, want %g", i, x[i], b[i]/lambda)
		}
	}
}
