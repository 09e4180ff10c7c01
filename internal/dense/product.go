package dense

// A Product is the operation C -= A Bᵀ on panels, C having at most eight columns:
//
//	C(i,j) -= Σ A(i,k) B(j,k),  k ascending, each term fused.
//
// The inner index runs over Panels pieces of Width columns each; from one piece to the
// next A and B move on by a hop that may shrink from piece to piece, because the
// panels of a factor's lower triangle get shorter to the right. All lengths are in values.
type Product struct {
	C, A, B []float64

	Blocks int // blocks of eight rows in A and C
	Cols   int // columns of C, 1 to 8
	CStep  int // from a block of C to the next one below
	AStep  int // from a block of A to the next one below

	Panels  int // pieces of the inner index, at least 1
	Width   int // length of each piece, at least 1
	AHop    int // from a piece of A to the next
	BHop    int // from a piece of B to the next
	AShrink int // what AHop loses at each step
	BShrink int // what BHop loses at each step

	BCol int // B(j,k) is B[j·BCol + k·BRow] within a piece
	BRow int
}

// Subtract carries out the product. C must not overlap A or B. All eight columns j of B are
// read, whatever Cols is, and have to lie within its slice. It panics if a slice is too short.
func (u *Product) Subtract() {
	shrinks := (u.Panels - 1) * (u.Panels - 2) / 2
	endA := (u.Blocks-1)*u.AStep + (u.Panels-1)*u.AHop - shrinks*u.AShrink + 8*u.Width
	endB := (u.Panels-1)*u.BHop - shrinks*u.BShrink + 7*u.BCol + (u.Width-1)*u.BRow + 1
	endC := (u.Blocks-1)*u.CStep + 8*u.Cols
	if u.Blocks < 1 || uint(u.Cols-1) > 7 || u.Panels < 1 || u.Width < 1 ||
		endA > len(u.A) || endB > len(u.B) || endC > len(u.C) {
		panic("dense: Product: slice too short")
	}
	switch {
	case useAVX512:
		subtractAVX512(u)
	case useAVX2:
		subtractAVX2(u)
	default:
		subtractGo(u)
	}
}

// subtractGo defines the operation; the assembly must match it bit for bit.
// Four rows by two columns at a time is what fits into scalar registers.
func subtractGo(u *Product) {
	for g := range u.Blocks {
		for half := 0; half < 8; half += 4 {
			a0 := g*u.AStep + half
			for j := 0; j < u.Cols; j += 2 {
				c0 := u.C[g*u.CStep+8*j+half:][:4]
				c1, second := c0, min(j+1, u.Cols-1)
				if second > j {
					c1 = u.C[g*u.CStep+8*second+half:][:4]
				}
				s0, s1, s2, s3 := c0[0], c0[1], c0[2], c0[3]
				t0, t1, t2, t3 := c1[0], c1[1], c1[2], c1[3]
				a, b := a0, j*u.BCol
				aHop, bHop := u.AHop, u.BHop
				step := (second - j) * u.BCol
				for range u.Panels {
					ak, bk := a, b
					for range u.Width {
						x := u.A[ak:][:4]
						y, z := u.B[bk], u.B[bk+step]
						s0, t0 = subMul(s0, x[0], y), subMul(t0, x[0], z)
						s1, t1 = subMul(s1, x[1], y), subMul(t1, x[1], z)
						s2, t2 = subMul(s2, x[2], y), subMul(t2, x[2], z)
						s3, t3 = subMul(s3, x[3], y), subMul(t3, x[3], z)
						ak += 8
						bk += u.BRow
					}
					a, b = a+aHop, b+bHop
					aHop, bHop = aHop-u.AShrink, bHop-u.BShrink
				}
				c0[0], c0[1], c0[2], c0[3] = s0, s1, s2, s3
				if second > j {
					c1[0], c1[1], c1[2], c1[3] = t0, t1, t2, t3
				}
			}
		}
	}
}
