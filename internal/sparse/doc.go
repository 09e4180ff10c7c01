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
// Entries of the factor and flops as multiples of those after METIS 5.1.0 (METIS_NodeND, default options),
// and seconds of one core for METIS's order alone and for the whole of Analyze, on a machine busy with other work:
//
//	                                       n      entries  flops   METIS   ours
//	sphere, shaken icosphere            163 842    1.01     1.01    0.95   0.5
//	  without coordinates                          1.02     1.05           0.5
//	torus                               262 080    1.05     1.07    1.8    1.0
//	coil of 12 turns                    260 000    1.09     1.20    1.7    0.9
//	square plate                        160 000    1.04     1.03    1.0    0.6
//	plate with 320 holes                163 840    1.02     1.08    0.9    0.5
//	serpentine of 40 fins               240 000    1.03     1.08    1.5    0.9
//	tube, 5000 × 40                     200 000    1.06     1.13    1.2    0.6
//	plate, edges graded 1 : 20 000      160 000    1.03     1.02    1.0    0.6
//	sheet rolled up 8 times             192 000    1.01     1.04    1.3    0.8
//
// The sphere of 655 362 rows has 38.5 million entries in its factor (METIS 38.5), that of 2 621 442 has 176 (METIS 175);
// one core factors them in 0.8 and 8 s, 19 and 160 GFlop, and solves in 0.08 and 0.6 s.
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
