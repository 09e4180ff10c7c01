package dense

// MulSub sets y -= P x for a panel of n columns: y has 8·blocks values, x has n.
// Each y[i] is a chain of fused terms in the order of x.
func MulSub(y, p, x []float64, blocks, n int) {
	if uint(n-1) > 7 || len(y) < 8*blocks || len(p) < 8*n*blocks || len(x) < n {
		panic("dense: MulSub: slice too short")
	}
	if blocks <= 0 {
		return
	}
	switch {
	case useAVX512:
		mulSubAVX512(&y[0], &p[0], &x[0], blocks, n)
	case useAVX2:
		mulSubAVX2(&y[0], &p[0], &x[0], blocks, n)
	default:
		mulSubGo(y, p, x, blocks, n)
	}
}

func mulSubGo(y, p, x []float64, blocks, n int) {
	for g := range blocks {
		s := (*[8]float64)(y[8*g:])
		for k, v := range x[:n] {
			c := (*[8]float64)(p[8*(n*g+k):])
			for i := range 8 {
				s[i] = subMul(s[i], c[i], v)
			}
		}
	}
}

// MulTransSub sets s -= Pᵀ y for a panel of n columns: s has n values, y has 8·blocks.
// Each sum runs down the blocks in eight lanes, folded at the end: 4 and 4, 2 and 2, 1 and 1.
func MulTransSub(s, p, y []float64, blocks, n int) {
	if uint(n-1) > 7 || len(y) < 8*blocks || len(p) < 8*n*blocks || len(s) < n {
		panic("dense: MulTransSub: slice too short")
	}
	if blocks <= 0 {
		return
	}
	switch {
	case useAVX512:
		mulTransSubAVX512(&s[0], &p[0], &y[0], blocks, n)
	case useAVX2:
		mulTransSubAVX2(&s[0], &p[0], &y[0], blocks, n)
	default:
		mulTransSubGo(s, p, y, blocks, n)
	}
}

func mulTransSubGo(s, p, y []float64, blocks, n int) {
	for k := range n {
		var t [8]float64
		for g := range blocks {
			c, v := (*[8]float64)(p[8*(n*g+k):]), (*[8]float64)(y[8*g:])
			for i := range 8 {
				t[i] = subMul(t[i], c[i], v[i])
			}
		}
		s[k] += ((t[0] + t[4]) + (t[2] + t[6])) + ((t[1] + t[5]) + (t[3] + t[7]))
	}
}
