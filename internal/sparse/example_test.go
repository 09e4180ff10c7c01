package sparse_test

import (
	"context"
	"fmt"

	"heatskin/internal/sparse"
)

// A rod of four cells, insulated at one end and held at 0 at the other, with one unit of heat
// flowing in at the insulated end.
func Example() {
	m := &sparse.Matrix{
		Pattern: &sparse.Pattern{Ptr: []int64{0, 1, 3, 5, 6}, Adj: []int32{1, 0, 2, 1, 3, 2}},
		Diag:    []float64{1, 2, 2, 2},
		Off:     []float64{-1, -1, -1, -1, -1, -1},
	}
	ctx := context.Background()
	a, err := sparse.Analyze(ctx, m.Pattern, sparse.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	f := a.NewFactor()
	if err := f.Factorize(ctx, m, nil); err != nil {
		fmt.Println(err)
		return
	}
	x := []float64{1, 0, 0, 0}
	f.SolveTo(x, x)
	fmt.Printf("%.0f\n", x)
	// Output: [4 3 2 1]
}
