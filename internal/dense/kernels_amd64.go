//go:build amd64 && !purego

package dense

import "golang.org/x/sys/cpu"

// Variables, not constants, so that a test can take one path away and see the next.
var (
	useAVX512 = cpu.X86.HasAVX512F && cpu.X86.HasAVX512DQ && cpu.X86.HasFMA
	useAVX2   = cpu.X86.HasAVX2 && cpu.X86.HasFMA
)

// subtractAVX512 is subtractGo, 16 rows by 8 columns at a time. Results below 2^-1022 become zero.
//
//go:noescape
func subtractAVX512(u *Product)

// subtractAVX2 is subtractGo, 8 rows by 4 columns at a time. Results below 2^-1022 become zero.
//
//go:noescape
func subtractAVX2(u *Product)

// solveRightAVX512 is solveRightGo with n = 8. Results below 2^-1022 become zero.
//
//go:noescape
func solveRightAVX512(x, l *float64, blocks int)

// solveRightTransAVX512 is solveRightTransGo with n = 8. Results below 2^-1022 become zero.
//
//go:noescape
func solveRightTransAVX512(x, l *float64)

// solveRightAVX2 is solveRightGo with n = 8. Results below 2^-1022 become zero.
//
//go:noescape
func solveRightAVX2(x, l *float64, blocks int)

// The vector kernels keep results below 2^-1022, which may be parts of a solution.
//
//go:noescape
func mulSubAVX512(y, p, x *float64, blocks, n int)

//go:noescape
func mulTransSubAVX512(s, p, y *float64, blocks, n int)

//go:noescape
func mulSubAVX2(y, p, x *float64, blocks, n int)

//go:noescape
func mulTransSubAVX2(s, p, y *float64, blocks, n int)
