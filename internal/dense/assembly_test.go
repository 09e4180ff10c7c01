//go:build amd64 && !purego

package dense

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestSubtractAssemblyMatchesGo(t *testing.T) {
	kernels := map[string]func(*Product){}
	if useAVX512 {
		kernels["AVX-512"] = subtractAVX512
	}
	if useAVX2 {
		kernels["AVX2"] = subtractAVX2
	}
	for kernel, subtract := range kernels {
		eachProduct(t, func(name string, u Product, whole []float64) {
			lo := len(whole) - 4 - len(u.C) // where the inside begins
			got := slices.Clone(whole)
			subtractGo(&u)
			v := u
			v.C = got[lo : lo+len(u.C)]
			subtract(&v)
			sameBits(t, got, whole, "%s, %s: %d panels of %d, %d blocks by %d", kernel, name, u.Panels, u.Width, u.Blocks, u.Cols)
		})
	}
}

// Terms and results below 2^-1022 cost hundreds of cycles each on some processors.
func TestSubtractFlushesSubnormals(t *testing.T) {
	for kernel, subtract := range map[string]func(*Product){"AVX-512": subtractAVX512, "AVX2": subtractAVX2} {
		if kernel == "AVX-512" && !useAVX512 || kernel == "AVX2" && !useAVX2 {
			continue
		}
		u := Product{A: make([]float64, 64), B: make([]float64, 64), C: make([]float64, 64), Blocks: 1, Cols: 8, Panels: 1, Width: 8, BCol: 1, BRow: 8}
		u.A[0], u.B[0] = 0x1p-600, 0x1p-450 // product 2^-1050
		subtract(&u)
		if u.C[0] != 0 {
			t.Errorf("%s: got %g, want 0", kernel, u.C[0])
		}
		if x := 0x1p-1000; math.Float64frombits(math.Float64bits(x))*0x1p-50 == 0 {
			t.Errorf("%s: the flush mode leaked out of the kernel", kernel)
		}
	}
}

// The kernels that take pointers, in each kind of assembly that the processor has.
type assembly struct {
	name                string
	mulSub, mulTransSub func(to, p, from *float64, blocks, n int)
	solveRight          func(x, l *float64, blocks int)
}

func assemblies() (list []assembly) {
	if useAVX512 {
		list = append(list, assembly{"AVX-512", mulSubAVX512, mulTransSubAVX512, solveRightAVX512})
	}
	if useAVX2 {
		list = append(list, assembly{"AVX2", mulSubAVX2, mulTransSubAVX2, solveRightAVX2})
	}
	return list
}

func TestVectorAssemblyMatchesGo(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	for _, asm := range assemblies() {
		for n := 1; n <= 8; n++ {
			for blocks := 1; blocks <= 9; blocks++ {
				for shift := range 4 {
					_, p := fenced(rng, 8*n*blocks, shift, math.NaN())
					_, x := fenced(rng, n, shift, math.NaN())
					want, y := fenced(rng, 8*blocks, shift, 1)
					got := slices.Clone(want)
					mulSubGo(y, p, x, blocks, n)
					asm.mulSub(&got[shift+4], &p[0], &x[0], blocks, n)
					sameBits(t, got, want, "%s: MulSub n=%d blocks=%d shift=%d", asm.name, n, blocks, shift)

					_, y = fenced(rng, 8*blocks, shift, math.NaN())
					want, s := fenced(rng, n, shift, 1)
					got = slices.Clone(want)
					mulTransSubGo(s, p, y, blocks, n)
					asm.mulTransSub(&got[shift+4], &p[0], &y[0], blocks, n)
					sameBits(t, got, want, "%s: MulTransSub n=%d blocks=%d shift=%d", asm.name, n, blocks, shift)
				}
			}
		}
	}
}

func TestTriangleAssemblyMatchesGo(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 9))
	for blocks := 1; blocks <= 9; blocks++ {
		for shift := range 4 {
			l := triangle(rng, 8)
			before, x := fenced(rng, 64*blocks, shift, 1)
			before = slices.Clone(before)
			solveRightGo(x, l, blocks, 8)
			for _, asm := range assemblies() {
				got := slices.Clone(before)
				asm.solveRight(&got[shift+4], &l[0], blocks)
				sameBits(t, got[shift+4:shift+4+len(x)], x, "%s: SolveRight blocks=%d shift=%d", asm.name, blocks, shift)
				fences(t, got, shift, len(x))
			}
			if !useAVX512 {
				continue
			}
			want, x := fenced(rng, 64, shift, 1)
			got := slices.Clone(want)
			solveRightTransGo(x, l, 8)
			solveRightTransAVX512(&got[shift+4], &l[0])
			sameBits(t, got, want, "SolveRightTrans shift=%d", shift)
		}
	}
}

// The tests above call the assembly; this one sees that the exported functions do, and that
// without it they still give the same bits.
func TestPathsAgree(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 10))
	_, p := fenced(rng, 64*5, 0, 1)
	run := func() (out []float64) {
		c := slices.Clone(p)
		u := Product{A: p, B: p, C: c, Blocks: 5, Cols: 8, CStep: 64, AStep: 64, Panels: 1, Width: 8, BCol: 1, BRow: 8}
		u.Subtract()
		SolveRight(c, triangle(rand.New(rand.NewPCG(1, 1)), 8), 5, 8)
		MulSub(c[:40], p, p[:8], 5, 8)
		MulTransSub(c[40:48], p, p[:40], 5, 8)
		return c
	}
	have512, have2 := useAVX512, useAVX2
	defer func() { useAVX512, useAVX2 = have512, have2 }()
	best := run()
	useAVX512 = false
	sameBits(t, run(), best, "without AVX-512")
	useAVX2 = false
	sameBits(t, run(), best, "without assembly")
}
