// Package dense holds the inner loops of the sparse factorisation: products,
// triangular solves and the like over small dense blocks.
//
// # The blocks
//
// Every array here is cut into blocks of eight rows. A block of n columns is
// 8·n values, column by column: the value of row i and column k is [8k+i]. A
// panel is a column of such blocks, one below the other without gaps. So a
// column of a block is one vector register of AVX-512, loads are contiguous,
// and no kernel needs a case for a ragged end: the rows beyond the last are zero.
//
// # One sequence of roundings
//
// Each kernel fixes, for each value it computes, the sequence of roundings: a
// chain of fused multiply-adds in the order of the inner index. Vector width and
// tiling do not change it, so the AVX-512, AVX2 and plain-Go versions agree bit
// for bit, and so do results however the work is cut up between goroutines. Two
// exceptions: results below 2^-1022 are flushed to zero in the assembly of
// [Product.Subtract] and [SolveRight] (package sparse says why that is harmless,
// and what it saves), and a processor without fused multiply-add rounds twice.
//
// The assembly is chosen at run time from what the processor offers; the build tag
// purego leaves it out.
package dense
