package dense

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// fenced returns n random values with four fences before and after, of which the first is at
// the given shift from the array's start. A read beyond operands meets NaN and spoils a sum, a
// write beyond results spoils a 1 (NaN written over NaN would pass).
func fenced(rng *rand.Rand, n, shift int, fence float64) (whole, inside []float64) {
	whole = make([]float64, shift+4+n+4)
	for i := range whole {
		whole[i] = fence
	}
	inside = whole[shift+4 : shift+4+n : shift+4+n]
	for i := range inside {
		inside[i] = rng.NormFloat64()
	}
	return whole, inside
}

func sameBits(t *testing.T, got, want []float64, format string, args ...any) {
	t.Helper()
	for i := range want {
		if math.Float64bits(got[i]) != math.Float64bits(want[i]) {
			t.Fatalf(format+": [%d] = %v, want %v", append(args, i, got[i], want[i])...)
		}
	}
}

// A layout of Product's operands as the factorisation and the blocked solves use them.
type layout struct {
	name         string
	bCol, bRow   int
	aShrink      int
	bShrink      int
	panels       []int
	widths       []int
	aHop, bHop   int
	aStep, cStep func(width, cols int) int
}

var layouts = []layout{
	{name: "panels of a factor", bCol: 1, bRow: 8, aShrink: 64, bShrink: 64, panels: []int{1, 2, 5}, widths: []int{8}, aHop: 64 * 12, bHop: 64 * 12,
		aStep: func(w, _ int) int { return 64 }, cStep: func(_, cols int) int { return 8 * cols }},
	{name: "panels of a factor times right sides", bCol: 1, bRow: 8, bShrink: 64, panels: []int{1, 4}, widths: []int{8}, aHop: 64, bHop: 64 * 12,
		aStep: func(int, int) int { return 320 }, cStep: func(int, int) int { return 320 }},
	{name: "narrow last panel", bCol: 1, bRow: 8, panels: []int{1}, widths: []int{1, 2, 3, 4, 5, 6, 7}, aHop: 0, bHop: 0,
		aStep: func(w, _ int) int { return 8 * w }, cStep: func(_, cols int) int { return 8 * cols }},
	{name: "transposed panel", bCol: 8, bRow: 1, panels: []int{1, 3}, widths: []int{8, 3}, aHop: 128, bHop: 64,
		aStep: func(int, int) int { return 64 }, cStep: func(int, int) int { return 64 }},
}

func eachProduct(t *testing.T, check func(name string, u Product, wholeC []float64)) {
	rng := rand.New(rand.NewPCG(1, 2))
	for _, l := range layouts {
		for _, panels := range l.panels {
			for _, width := range l.widths {
				for cols := 1; cols <= 8; cols++ {
					for blocks := 1; blocks <= 5; blocks++ {
						for shift := range 3 {
							u := Product{Blocks: blocks, Cols: cols, CStep: l.cStep(width, cols), AStep: l.aStep(width, cols), Panels: panels, Width: width,
								AHop: l.aHop, BHop: l.bHop, AShrink: l.aShrink, BShrink: l.bShrink, BCol: l.bCol, BRow: l.bRow}
							shrinks := (panels - 1) * (panels - 2) / 2
							_, u.A = fenced(rng, (blocks-1)*u.AStep+(panels-1)*u.AHop-shrinks*u.AShrink+8*width, shift, math.NaN())
							_, u.B = fenced(rng, (panels-1)*u.BHop-shrinks*u.BShrink+7*u.BCol+(width-1)*u.BRow+1, shift, math.NaN())
							var whole []float64
							whole, u.C = fenced(rng, (blocks-1)*u.CStep+8*cols, shift, 1)
							check(l.name, u, whole)
						}
					}
				}
			}
		}
	}
}

// The sum in its plainest form, each term rounded once, in the order of the inner index.
func TestProductIsTheSumItStandsFor(t *testing.T) {
	eachProduct(t, func(name string, u Product, _ []float64) {
		want := slices.Clone(u.C)
		for g := range u.Blocks {
			for j := range u.Cols {
				for i := range 8 {
					s := want[g*u.CStep+8*j+i]
					a, b := g*u.AStep, 0
					for p := range u.Panels {
						for k := range u.Width {
							s = subMul(s, u.A[a+8*k+i], u.B[b+j*u.BCol+k*u.BRow])
						}
						a += u.AHop - p*u.AShrink
						b += u.BHop - p*u.BShrink
					}
					want[g*u.CStep+8*j+i] = s
				}
			}
		}
		u.Subtract()
		sameBits(t, u.C, want, "%s: %d panels of %d, %d blocks by %d", name, u.Panels, u.Width, u.Blocks, u.Cols)
	})
}

func TestProductRefusesShortSlices(t *testing.T) {
	for _, short := range []string{"A", "B", "C"} {
		u := Product{A: make([]float64, 64), B: make([]float64, 64), C: make([]float64, 64), Blocks: 1, Cols: 8, Panels: 1, Width: 8, BCol: 1, BRow: 8}
		switch short {
		case "A":
			u.A = u.A[:63]
		case "B":
			u.B = u.B[:63]
		case "C":
			u.C = u.C[:63]
		}
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("short %s was accepted", short)
				}
			}()
			u.Subtract()
		}()
	}
}

// triangle returns a lower Cholesky factor as Cholesky leaves it, of a well-conditioned matrix.
func triangle(rng *rand.Rand, n int) []float64 {
	d := make([]float64, 8*n)
	for k := range n {
		for i := range 8 {
			d[8*k+i] = 0.1 * rng.NormFloat64()
		}
		d[8*k+k] = 1 + rng.Float64()
	}
	if c, p := Cholesky(d, n, 0); c != n {
		panic(p)
	}
	return d
}

// L Lᵀ must give the matrix back, X L⁻ᵀ times Lᵀ and X L⁻¹ times L must give X back: within 8·ε times the
// largest entry, there being at most eight products in a sum.
func TestTrianglesInvert(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	const tol = 8 * 0x1p-52 * 4
	for n := 1; n <= 8; n++ {
		a := make([]float64, 8*n)
		for k := range n {
			for i := k; i < n; i++ {
				a[8*k+i] = 0.2 * rng.NormFloat64()
			}
			a[8*k+k] = 3
		}
		l := slices.Clone(a)
		if c, p := Cholesky(l, n, 0); c != n {
			t.Fatalf("n=%d: pivot %g at %d", n, p, c)
		}
		at := func(i, k int) float64 { // L(i,k)
			if i == k {
				return 1 / l[8*k+k]
			}
			return l[8*k+i]
		}
		for i := range n {
			for j := range i + 1 {
				s := 0.0
				for k := range j + 1 {
					s += at(i, k) * at(j, k)
				}
				if math.Abs(s-a[8*j+i]) > tol {
					t.Errorf("n=%d: (LLᵀ)(%d,%d) = %v, want %v", n, i, j, s, a[8*j+i])
				}
			}
		}
		_, x := fenced(rng, 3*8*n, 0, 1)
		y := slices.Clone(x)
		SolveRight(y, l, 3, n)
		for g := range 3 {
			for i := range 8 {
				for j := range n {
					s := 0.0
					for k := range j + 1 {
						s += y[8*n*g+8*k+i] * at(j, k)
					}
					if math.Abs(s-x[8*n*g+8*j+i]) > 4*tol {
						t.Errorf("n=%d: (YLᵀ)(%d,%d) = %v, want %v", n, 8*g+i, j, s, x[8*n*g+8*j+i])
					}
				}
			}
		}
		y = slices.Clone(x[:8*n])
		SolveRightTrans(y, l, n)
		for i := range 8 {
			for j := range n {
				s := 0.0
				for k := j; k < n; k++ {
					s += y[8*k+i] * at(k, j)
				}
				if math.Abs(s-x[8*j+i]) > 4*tol {
					t.Errorf("n=%d: (YL)(%d,%d) = %v, want %v", n, i, j, s, x[8*j+i])
				}
			}
		}
	}
}

func TestCholeskyReportsThePivot(t *testing.T) {
	for _, bad := range []float64{0, -1, 1e-20, math.NaN(), math.Inf(1)} {
		d := make([]float64, 8*3)
		d[0], d[9], d[18] = 1, bad, 1
		c, p := Cholesky(d, 3, 1e-16)
		if c != 1 || math.Float64bits(p) != math.Float64bits(bad) {
			t.Errorf("pivot %v: got %v at column %d, want column 1", bad, p, c)
		}
	}
}

// The panel kernels against sums taken term by term. The tolerance is ε times the number of
// terms, times their size (at most 16 of each in absolute value, with these seeds).
func TestPanelsTimesVectors(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	for n := 1; n <= 8; n++ {
		for blocks := range 6 {
			for shift := range 3 {
				_, p := fenced(rng, 8*n*blocks, shift, math.NaN())
				_, x := fenced(rng, n, shift, math.NaN())
				wholeY, y := fenced(rng, 8*blocks, shift, 1)
				before := slices.Clone(y)
				MulSub(y, p, x, blocks, n)
				for i := range y {
					want := before[i]
					for k := range n {
						want -= p[8*(n*(i/8)+k)+i%8] * x[k]
					}
					if !(math.Abs(y[i]-want) <= 16*8*0x1p-52) {
						t.Fatalf("MulSub n=%d blocks=%d: y[%d] = %v, want %v", n, blocks, i, y[i], want)
					}
				}
				fences(t, wholeY, shift, len(y))

				_, y = fenced(rng, 8*blocks, shift, math.NaN())
				wholeS, s := fenced(rng, n, shift, 1)
				before = slices.Clone(s)
				MulTransSub(s, p, y, blocks, n)
				for k := range s {
					want := before[k]
					for i := range y {
						want -= p[8*(n*(i/8)+k)+i%8] * y[i]
					}
					if !(math.Abs(s[k]-want) <= 16*48*0x1p-52) {
						t.Fatalf("MulTransSub n=%d blocks=%d: s[%d] = %v, want %v", n, blocks, k, s[k], want)
					}
				}
				fences(t, wholeS, shift, len(s))
			}
		}
	}
}

func fences(t *testing.T, whole []float64, shift, n int) {
	t.Helper()
	for i, v := range whole {
		if (i < shift+4 || i >= shift+4+n) && v != 1 {
			t.Fatalf("fence %d of %d values overwritten by %v", i-shift-4, n, v)
		}
	}
}
