// Package geodesic finds shortest paths over the flat triangles of a mesh, exactly:
// no discretisation error, round-off only. A path may cross triangles anywhere; it
// bends at no point but a vertex whose total angle exceeds a full turn (half a turn
// on a boundary).
//
// The method is the continuous Dijkstra of J. S. B. Mitchell, D. M. Mount and
// C. H. Papadimitriou, SIAM J. Comput. 16(4), 1987. A window is a piece of an edge
// whose nearest paths all cross the same triangles; unrolled into the plane they are
// straight rays from one point. Windows spread from triangle to triangle, nearest
// first; where two overlap on an edge, each keeps the part on which it is shorter.
// Four things differ from that paper:
//
//   - Windows wait by edge and cross a triangle together, in order, as a sorted list
//     (after Y. Qin, X. Han, H. Yu, Y. Yu, J. Zhang, ACM Trans. Graph. 35(4), 2016, who
//     do so by triangle), and a list is forgotten once the wave has passed for good.
//     So memory follows the wave's length and not its area.
//   - A window that a vertex beside it undercuts is dropped unseen (the filter of
//     S.-Q. Xin and G.-J. Wang, ACM Trans. Graph. 28(4), 2009).
//   - Windows that a flat vertex had split are joined behind it. So flat parts cost a
//     few windows a triangle however finely they are cut; on curved ones windows grow
//     with the square root of the number of triangles, which lies in the matter.
//   - A whole edge may be a source. The wave leaves it in parallel rays: a window
//     whose distance is a linear function, next to those of its two ends.
//
// Triangles without area, edges of more than two triangles and mixed orientations are
// let pass. Round-off is met with tolerances relative to lengths; each stands with its
// reason where it is defined.
//
// A Solver holds what all questions to one mesh share. Its Spread gives a Wave of
// distances, its Path a shortest line; Field and Path at package level serve a
// single question.
package geodesic
