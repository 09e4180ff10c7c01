package sparse

import "fmt"

// A NotPositiveDefiniteError says where a factorisation stopped: the pivot of a
// row came out zero, negative, too small to be told from round-off, or not a number.
type NotPositiveDefiniteError struct {
	Row   int     // in the caller's numbering
	Pivot float64 // what was left of the diagonal entry
}

func (e *NotPositiveDefiniteError) Error() string {
	return fmt.Sprintf("sparse: matrix is not positive definite: pivot %g at row %d; hold one row of every singular component", e.Pivot, e.Row)
}

// A SizeError says that the factor would not fit into the memory that the caller allows.
type SizeError struct {
	Rows        int
	Want, Limit int64 // bytes: what the factor takes, what Options.MaxBytes allows
}

func (e *SizeError) Error() string {
	return fmt.Sprintf("sparse: the factor of %d rows takes %d bytes, the limit is %d; raise the limit or use a coarser mesh", e.Rows, e.Want, e.Limit)
}
