// Package mesh holds what a surface is: a triangulation as a file gives it (Mesh),
// and the intrinsic metric that heat and distance live on (Surface).
//
// The way through: Load reads, splits and welds a file to a Mesh; Check tells what
// is wrong with it; NewSurface measures its edges and glues its triangles; Surface
// takes in points, is flipped to intrinsic Delaunay, and yields the cotangent
// Laplacian and mass matrices that package kernel works with.
package mesh
