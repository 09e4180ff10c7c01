// Package kernel tells what heat does on a surface: how a unit of it spreads (the
// heat kernel), how given fields spread, and what follows from that.
//
// # Convention
//
// The equation is
//
//	du/dt = D Δu,
//
// Δ being the Laplace-Beltrami operator of the surface and D the diffusivity in
// length² per unit of time, in the length unit of the mesh. The heat kernel has unit
// area integral: its values are heat per unit area. Edges are insulated. Texts on
// probability write du/dt = ½ Δu for Brownian motion: that is D = ½ here.
//
// On the triangulation it reads M du/dt = -D L u, with L the positive semi-definite
// cotangent matrix of the intrinsic Delaunay triangulation and M the mass matrix,
// lumped to the vertices unless Options asks for the consistent one. With lumped mass
// and Delaunay weights the exact solution in time is nowhere below 0.
//
// # The way through
//
//	mesh.Mesh -> mesh.NewSurface -> Place -> Delaunay -> NewSolver -> HeatKernels
//
// A Solver orders and analyses the matrices once. Every question then costs some
// factorisations and solves, which its method's comment counts:
//
//   - [Solver.HeatKernels]: where is a unit of heat after time t?
//   - [Solver.Diffuse], [Solver.Steady]: given fields, held, losing or fed surfaces
//   - [Solver.Modes]: eigenvalues and eigenfunctions
//   - [Solver.Passage]: when does a Brownian particle come to a target, and to which?
//   - [Solver.Distance]: how far is every vertex from the sources?
//
// # Distance
//
// One heat solve gives the order in which a front from the sources arrives; the front
// itself is then continued from triangle to triangle in that order (front.go). It knows at
// each vertex its distance, the direction it came from and its curvature, so that it
// unfolds flat faces exactly, follows curved ones by the Jacobi equation, turns round
// re-entrant corners and saddles, and tells where two fronts meet. Measured, mean
// relative error over all vertices in per cent, unrefined, against closed forms:
//
//	sphere, jittered          10 242 vertices 0.0103   40 962: 0.0027   655 362: 0.0002   2 621 442: 0.00006
//	sphere, shaken            10 242 vertices 0.019    40 962: 0.0065
//	square, box (45 000), L-plate, slits, ring, tube 5 000 edges long: rounding
//	cylinder, cone            21 780 and 16 201 vertices: 0.0031, 0.0021 (their chords)
//	paraboloid 50 625: 0.0023     torus 28 800: 0.0057     coil 260 000 (against exact paths): 0.0077
//
// with order 2.0 to 2.3 in h on curved skins. What is hard for it are tessellations that
// bend sharply from each face to the next, such as the walls of many bores with a few
// sides each: 0.1 % in the mean there, a few per cent at single vertices. It says so:
// the estimate that comes with each result is 3 times the true mean error in the median
// over 132 questions, and below it in none of them. DEVELOPERS.md has the table.
//
// # Accuracy
//
// In time, the Krylov stepper keeps its tolerance: measured errors stay below it, and
// below the estimate that comes with each field, for tolerances from 1e-4 to 1e-12,
// over six and more decades of time, on all shapes of the tests. The estimate is 3 to
// 30 times the error. Implicit Euler with N steps is good to 1/(N-1) of the peak.
//
// In space, linear elements are of second order. The kernel of the unit sphere against
// its Legendre series, largest error over the peak:
//
//	vertices     t = 0.05    0.1       0.5
//	   642        6.9 %      3.4 %     0.77 %
//	  2562        1.5 %      0.82 %    0.19 %
//	 10242        0.38 %     0.20 %    0.048 %
//
// which is h²/(8t) at the source (HeatResult.MeshErrors). At a vertex with other than
// six neighbours the lumped mass adds some h² log(1/h) of its own.
//
// Thin triangles cost no accuracy in time: where rounding in L would leak heat, solves
// are refined by weight differences (cells of 1:1e6 keep a tolerance of 1e-12).
//
// # Cost
//
// On the sphere of 10242 vertices, one time at tolerance 1e-8 takes 24 solves, three
// times within a decade 30. Implicit Euler takes 1000 solves to 1e-3.
package kernel
