package sparse

// A Pattern says which off-diagonal entries of a symmetric matrix are stored. Both
// triangles are: j is among the neighbours of i exactly when i is among those of j.
type Pattern struct {
	Ptr []int64 // neighbours of i are Adj[Ptr[i]:Ptr[i+1]]; length n+1
	Adj []int32 // ascending within a row, never i itself
}

// Dim is the number of rows.
func (p *Pattern) Dim() int { return len(p.Ptr) - 1 }

// A Matrix is a symmetric matrix on a pattern, which it may share with others.
type Matrix struct {
	*Pattern
	Diag []float64 // length n
	Off  []float64 // one value for each entry of Adj; a[i][j] == a[j][i] is the caller's to keep
}

// MulVecTo sets dst = A x. dst and x must not overlap.
func (a *Matrix) MulVecTo(dst, x []float64) {
	for i := range dst {
		sum := a.Diag[i] * x[i]
		for k := a.Ptr[i]; k < a.Ptr[i+1]; k++ {
			sum += a.Off[k] * x[a.Adj[k]]
		}
		dst[i] = sum
	}
}

// Find is the index in Adj of entry (i, j), which must be there. O(log of the row).
func (p *Pattern) Find(i, j int32) int64 {
	lo, hi := p.Ptr[i], p.Ptr[i+1]
	for lo < hi {
		mid := (lo + hi) / 2
		if p.Adj[mid] < j {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return lo
}
