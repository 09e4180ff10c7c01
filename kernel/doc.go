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
// factorisations and solves, which its method's comment counts.
package kernel
