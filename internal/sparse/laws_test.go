package sparse

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"testing"
)

// Rebuilding A from the factor tests everything between the ordering and the last pivot:
// P S A S Pᵀ = L Lᵀ, within ε times the terms of a row.
func TestFactorMultipliesBack(t *testing.T) {
	rng := rand.New(rand.NewPCG(31, 32))
	for trial := range 40 {
		n := 1 + rng.IntN(150)
		m := randomMatrix(rng, n, rng.IntN(4*n))
		a := mustAnalyze(t, m.Pattern, Options{})
		f := a.NewFactor()
		mustFactorize(t, f, m, nil)
		l := make([]float64, n*n) // column by column
		for s := range a.nodes {
			node := &a.nodes[s]
			fr := front{w: int(node.w), m: int(node.m), blocks: int(node.m+7) / 8, l: f.values[node.values:]}
			for c := range fr.w {
				array, base, step := fr.column(c)
				for i := c; i < fr.m; i++ {
					row := int(node.first) + i
					if i >= fr.w {
						row = int(a.below(int32(s))[i-fr.w])
					}
					l[(int(node.first)+c)*n+row] = array[base+i/8*step+i%8]
				}
				d := (int(node.first) + c) * (n + 1)
				l[d] = 1 / l[d] // stored as reciprocals
			}
		}
		want := toDense(m, nil)
		for i := range n {
			for j := range i + 1 {
				sum := 0.0
				for k := range n {
					sum += l[k*n+i] * l[k*n+j]
				}
				sum /= f.scale[i] * f.scale[j]
				p, q := int(a.perm[i]), int(a.perm[j])
				size := math.Sqrt(want.At(p, p) * want.At(q, q)) // Cauchy and Schwarz: bounds the terms' sum
				if math.Abs(sum-want.At(p, q)) > float64(n+4)*0x1p-52*size {
					t.Fatalf("trial %d: (LLᵀ) at rows %d, %d is %v, want %v", trial, p, q, sum, want.At(p, q))
				}
			}
		}
	}
}

// The 7-point matrix of a box has products of sines as eigenvectors, with eigenvalues 6 - 2Σcos
// (discrete sine transform; from memory, and checked by the residual that the test takes).
func TestSolveBoxEigenvector(t *testing.T) {
	const nx, ny, nz = 17, 14, 11
	id := func(x, y, z int) int32 { return int32((z*ny+y)*nx + x) }
	var edges [][2]int32
	for z := range nz {
		for y := range ny {
			for x := range nx {
				if x+1 < nx {
					edges = append(edges, [2]int32{id(x, y, z), id(x+1, y, z)})
				}
				if y+1 < ny {
					edges = append(edges, [2]int32{id(x, y, z), id(x, y+1, z)})
				}
				if z+1 < nz {
					edges = append(edges, [2]int32{id(x, y, z), id(x, y, z+1)})
				}
			}
		}
	}
	m := fromEdges(nx*ny*nz, edges, unit, 0)
	for i := range m.Diag {
		m.Diag[i] = 6
	}
	f := mustAnalyze(t, m.Pattern, Options{}).NewFactor()
	mustFactorize(t, f, m, nil)
	ax, ay, az := 2*math.Pi/(nx+1), 3*math.Pi/(ny+1), math.Pi/(nz+1)
	lambda := 6 - 2*(math.Cos(ax)+math.Cos(ay)+math.Cos(az))
	b := make([]float64, m.Dim())
	for z := range nz {
		for y := range ny {
			for x := range nx {
				b[id(x, y, z)] = math.Sin(ax*float64(x+1)) * math.Sin(ay*float64(y+1)) * math.Sin(az*float64(z+1))
			}
		}
	}
	x := make([]float64, len(b))
	if e := f.SolveRefinedTo(x, b); e > 1e-15 {
		t.Errorf("backward error %g", e)
	}
	for i := range x {
		// condition number 12/0.15 or so; sines good to an ulp
		if math.Abs(x[i]-b[i]/lambda) > 1e-13/lambda {
			t.Fatalf("x[%d] = %v, want %v", i, x[i], b[i]/lambda)
		}
	}
}

// On a tube heat from a ring decays by the same factor λ at each ring, 2 + κ = λ + 1/λ, down to
// 1e-300 of the source, and each value must have its own leading digits: callers take logarithms. The tube is open
// at both ends, 100 rings beyond the point where the last value is tested, so that the ends are out of reach.
// Each ring may lose some roundings, and those of the rings on the way add up: 1e-13 a ring, in log u.
func TestSolveKeepsDigitsFarAway(t *testing.T) {
	const around, rings, source = 12, 2100, 20
	var edges [][2]int32
	for r := range rings {
		for k := range around {
			edges = append(edges, [2]int32{int32(r*around + k), int32(r*around + (k+1)%around)})
			if r+1 < rings {
				edges = append(edges, [2]int32{int32(r*around + k), int32((r+1)*around + k)})
			}
		}
	}
	const kappa = 0.125
	lambda := (2 + kappa - math.Sqrt(kappa*(4+kappa))) / 2 // 0.7034: log10 -0.1528
	m := fromEdges(around*rings, edges, unit, kappa)
	coords := make([]float64, 3*m.Dim())
	for i := range m.Dim() {
		phi := 2 * math.Pi * float64(i%around) / around
		coords[3*i], coords[3*i+1], coords[3*i+2] = math.Cos(phi), math.Sin(phi), 0.5*float64(i/around)
	}
	f := mustAnalyze(t, m.Pattern, Options{Coords: coords}).NewFactor()
	held := make([]bool, m.Dim())
	b := make([]float64, m.Dim())
	for k := range around {
		held[source*around+k] = true
		// u = 1 on the held ring; its neighbours see it on the right side.
		b[source*around+k] = 1
		b[(source+1)*around+k] = 1
	}
	mustFactorize(t, f, m, held)
	for _, scale := range []float64{1, 0x1p-900} {
		x := make([]float64, len(b))
		for i := range b {
			x[i] = b[i] * scale
		}
		f.SolveTo(x, x)
		for r := source; r < source+1960; r++ { // λ^1960 = 1e-299.5
			want := float64(r-source) * math.Log(lambda)
			for k := range around {
				got := x[r*around+k] / scale
				if scale < 1 && r > source+190 {
					break // below the range of float64
				}
				if math.Abs(math.Log(got)-want) > 1e-13*max(10, float64(r-source)) {
					t.Fatalf("scale %g: ring %d: log u = %v, want %v", scale, r-source, math.Log(got), want)
				}
			}
		}
	}
}

func TestHeldRowsActAsIdentity(t *testing.T) {
	m := grid(20, 20)
	f := mustAnalyze(t, m.Pattern, Options{}).NewFactor()
	held := make([]bool, 400)
	b := make([]float64, 400)
	for i := range b {
		held[i] = i%3 == 0
		b[i] = float64(i)
	}
	mustFactorize(t, f, m, held)
	x := make([]float64, 400)
	if e := f.SolveRefinedTo(x, b); e > 1e-15 {
		t.Errorf("backward error %g", e)
	}
	for i := range x {
		if held[i] && x[i] != b[i] {
			t.Errorf("held row %d: got %v, want %v", i, x[i], b[i])
		}
	}
}

// A factor filled anew gives the same bits as a new one, also after a failure, and takes no more
// memory than a few small objects for the goroutines.
func TestRefactor(t *testing.T) {
	coords, edges := icosphere(4)
	n := len(coords) / 3
	first := fromEdges(n, edges, unit, 1)
	second := fromEdges(n, edges, func(e int) float64 { return 1 + float64(e%7) }, 1e-3)
	second.Pattern = first.Pattern
	broken := &Matrix{first.Pattern, slices.Clone(first.Diag), first.Off}
	broken.Diag[n/2] = -1
	a := mustAnalyze(t, first.Pattern, Options{Coords: coords})
	f := a.NewFactor()
	mustFactorize(t, f, first, nil)
	var e *NotPositiveDefiniteError
	if err := f.Factorize(context.Background(), broken, nil); !errors.As(err, &e) || e.Row != n/2 || e.Pivot != -1 {
		t.Errorf("got %v, want pivot -1 at row %d", err, n/2)
	}
	mustFactorize(t, f, second, nil)
	fresh := a.NewFactor()
	mustFactorize(t, fresh, second, nil)
	if !slices.Equal(f.values, fresh.values) {
		t.Error("a factor filled anew differs from a new one")
	}
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	mustFactorize(t, f, first, nil)
	runtime.ReadMemStats(&after)
	if grown := after.TotalAlloc - before.TotalAlloc; grown > 1<<20 && grown > uint64(a.Stats().PeakBytes)/10 {
		t.Errorf("refactoring allocated %d bytes, the factor itself takes %d", grown, a.Stats().PeakBytes)
	}
}

// The same bytes whatever the number of goroutines: the order, the factor and both kinds of solves.
func TestWorkersDoNotChangeBits(t *testing.T) {
	coords, edges := icosphere(6)
	n := len(coords) / 3
	m := fromEdges(n, edges, func(e int) float64 { return 1 + float64(e%5) }, 0.01)
	b := make([]float64, 3*n)
	for i := range b {
		b[i] = float64(i%11) - 3
	}
	var perm []int32
	var values, one, many []float64
	for _, workers := range []int{1, 2, 4} {
		a := mustAnalyze(t, m.Pattern, Options{Coords: coords, Workers: workers})
		if workers > 1 && len(a.plan.top) == 0 {
			t.Error("no front is shared: the test is too small")
		}
		f := a.NewFactor()
		mustFactorize(t, f, m, nil)
		x, y := make([]float64, n), make([]float64, 3*n)
		f.SolveTo(x, b[:n])
		f.SolveManyTo(y, b, 3)
		if workers == 1 {
			perm, values, one, many = a.perm, f.values, x, y
			continue
		}
		if !slices.Equal(a.perm, perm) {
			t.Errorf("%d workers: another order", workers)
		}
		for what, pair := range map[string][2][]float64{"factor": {f.values, values}, "solution": {x, one}, "solutions": {y, many}} {
			for i := range pair[1] {
				if math.Float64bits(pair[0][i]) != math.Float64bits(pair[1][i]) {
					t.Errorf("%d workers: %s differs at %d: %v and %v", workers, what, i, pair[0][i], pair[1][i])
					break
				}
			}
		}
	}
}

// Units must not matter: a matrix scaled by a power of two, even to the ends of the range, has the same digits.
func TestUnitsDoNotMatter(t *testing.T) {
	m := grid(30, 30)
	a := mustAnalyze(t, m.Pattern, Options{})
	f := a.NewFactor()
	b := make([]float64, 900)
	for i := range b {
		b[i] = float64(i%7) - 2
	}
	want := make([]float64, 900)
	mustFactorize(t, f, m, nil)
	f.SolveTo(want, b)
	for _, e := range []int{-1000, -300, 300, 1000} {
		scaled := &Matrix{m.Pattern, slices.Clone(m.Diag), slices.Clone(m.Off)}
		for i := range scaled.Diag {
			scaled.Diag[i] = math.Ldexp(scaled.Diag[i], e)
		}
		for i := range scaled.Off {
			scaled.Off[i] = math.Ldexp(scaled.Off[i], e)
		}
		mustFactorize(t, f, scaled, nil)
		x := make([]float64, 900)
		for i := range x {
			x[i] = math.Ldexp(b[i], e)
		}
		f.SolveTo(x, x)
		if !slices.Equal(x, want) {
			t.Errorf("scaled by 2^%d: another solution", e)
		}
	}
}

// The power of two in a right side must come out as it went in, though all of b be subnormal: nothing may
// be computed down there. The matrix magnifies by about 2^20, so that solutions have all their digits.
func TestSolveIsHomogeneous(t *testing.T) {
	m := fromEdges(900, gridEdges(30, 30), func(e int) float64 { return 1 + float64(e%3) }, 0x1p-20)
	f := mustAnalyze(t, m.Pattern, Options{}).NewFactor()
	mustFactorize(t, f, m, nil)
	b, want, wantMany := make([]float64, 1800), make([]float64, 900), make([]float64, 1800)
	for i := range b {
		b[i] = float64(i % 3)
	}
	f.SolveTo(want, b[:900])
	f.SolveManyTo(wantMany, b, 2)
	for _, e := range []int{-1035, -700, 700, 990} {
		scaled := make([]float64, len(b))
		for i := range b {
			scaled[i] = math.Ldexp(b[i], e)
		}
		x, many := make([]float64, 900), make([]float64, 1800)
		f.SolveTo(x, scaled[:900])
		f.SolveManyTo(many, scaled, 2)
		for i := range want {
			if x[i] != math.Ldexp(want[i], e) || many[i] != math.Ldexp(wantMany[i], e) {
				t.Fatalf("b scaled by 2^%d: x[%d] = %v and %v, want %v and %v scaled", e, i, x[i], many[i], want[i], wantMany[i])
			}
		}
	}
}

func TestSolvesMayRunTogether(t *testing.T) {
	coords, edges := icosphere(5)
	n := len(coords) / 3
	m := fromEdges(n, edges, unit, 0.1)
	f := mustAnalyze(t, m.Pattern, Options{Coords: coords, Workers: 4}).NewFactor()
	mustFactorize(t, f, m, nil)
	b, want := make([]float64, n), make([]float64, n)
	b[5] = 1
	f.SolveTo(want, b)
	inParallel(4, 12, func(_, i int) {
		x := make([]float64, n)
		f.SolveTo(x, b)
		if !slices.Equal(x, want) {
			t.Error("a solve beside others differs")
		}
	})
}

func TestCancelAndLimits(t *testing.T) {
	m := grid(40, 40)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Analyze(ctx, m.Pattern, Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("Analyze: got %v, want context.Canceled", err)
	}
	a := mustAnalyze(t, m.Pattern, Options{})
	if err := a.NewFactor().Factorize(ctx, m, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("Factorize: got %v, want context.Canceled", err)
	}
	need := a.Stats().PeakBytes
	var e *SizeError
	if _, err := Analyze(context.Background(), m.Pattern, Options{MaxBytes: need - 1}); !errors.As(err, &e) || e.Want != need || e.Limit != need-1 {
		t.Errorf("got %v, want a *SizeError that names %d bytes", err, need)
	}
	if _, err := Analyze(context.Background(), m.Pattern, Options{MaxBytes: need}); err != nil {
		t.Errorf("within the limit: %v", err)
	}
}
