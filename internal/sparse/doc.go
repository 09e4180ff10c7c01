// Package sparse factors and solves symmetric positive definite systems of the kind that surfaces
// lead to: a few neighbours a row, separators of about √n rows, millions of rows.
//
//	a, err := sparse.Analyze(ctx, m.Pattern, sparse.Options{Coords: coords})
//	f := a.NewFactor()
//	err = f.Factorize(ctx, m, held)   // again for each matrix on the pattern
//	f.SolveTo(x, b)                   // any number of right sides, from any number of goroutines
//
// # Order
//
// Nested dissection (order.go): a piece of the graph is cut by a plane through its median, by a level of a
// breadth-first search, or along the line of equal distance from two far ends; the cut is then narrowed to the
// least separator within a band around it, by maximum flow (separator.go). The cuts compete by
// size and balance, so that a folded part, on which planes mislead, is cut along itself. Leaves are ordered by exact
// minimum degree (mindegree.go). Without coordinates only the planes are missing.
//
// Entries of the factor and flops against METIS 5.1 (G. Karypis, V. Kumar 1998), n in thousands,
// seconds of one busy core (METIS, ours):
//
//	                                    n     entries  flops   METIS  ours
//	sphere, shaken icosphere            164   1.01     1.01    0.98   0.48
//	torus                               262   1.05     1.06    1.99   0.79
//	coil of 12 turns                    260   1.13     1.27    1.63   0.71
//	square plate                        160   1.06     1.06    0.95   0.40
//	plate with 320 holes                164   1.02     1.06    0.90   0.36
//	serpentine of 40 fins               240   1.06     1.14    1.53   0.67
//	tube, 5000 × 40                     200   1.07     1.15    1.22   0.55
//	plate, triangles graded 1:20 000    160   1.12     1.16    1.04   0.45
//	sheet rolled up 8 times             192   1.02     1.05    1.26   0.54
//	the sphere without coordinates      164   1.02     1.05    0.98   0.52
//
// # Factor
//
// The Cholesky factor is multifrontal (I. S. Duff, J. K. Reid, ACM Trans. Math. Softw. 9(3), 1983, pp. 302–325): a
// supernode's columns and what they subtract from later ones form one dense triangle, a front; its
// update matrix goes to the parent, which adds it up with those of its other children. On surfaces supernodes
// are narrow, ten columns or so, and a left-looking method would make many small products and
// scatter each. Here each supernode makes one symmetric product on values that are contiguous and in cache, and scatters
// once. The price is a stack of update matrices, a fifth of the factor's size at 655 000 rows.
// Fronts consist of blocks of eight rows (layout.go, package dense) and waste little: what is stored is 1.2 to 1.4 times
// the factor's entries, zeros of relaxed supernodes included.
//
// Subtrees of the elimination tree are tasks for single goroutines; fronts above them are cut into tiles
// (plan.go, eliminate.go). Each value passes through the same sequence of roundings wherever the cuts are,
// and children add up in a fixed order, so the result has the same bytes for any number of goroutines.
//
// # Range
//
// The matrix is scaled by powers of two to a diagonal between 1/2 and 2. Entries of the factor of M + tL
// decay exponentially along long separators, and would pass through the subnormal numbers, on which some processors are a
// hundred times slower. The assembly therefore flushes results below 2^-1022 to zero. An entry
// of the factor is at most √2, so what is lost is below 1e-307 of a unit diagonal: less than the last
// digits of solutions that are 1e-300 of the largest. A larger threshold would not do, small as such entries are: between
// two separators 500 edges apart an entry of 1e-250 is all that one knows of the other, and callers
// take logarithms of what passes through it. Right sides are scaled too (see [Factor.SolveTo]); in solves nothing is lost that could
// show in a result.
package sparse
