// Package meshtest makes meshes for tests: smooth shapes, flat ones, and the kinds
// that real files hold (slivers, slits, sheets that meet three at an edge). Every
// maker is deterministic: the same arguments and seed give the same mesh. Vertices
// are welded where the maker says so, and every vertex lies in a triangle.
//
// Where a maker takes a jitter, it is a fraction of the local edge length; below
// 0.25 no triangle can turn over. jitter > 0 also draws the diagonals of quads at
// random, jitter 0 gives a regular mesh. Triangles are counter-clockwise seen from
// outside (closed shapes) or from +z (sheets).
package meshtest
