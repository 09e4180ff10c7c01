package mesh

// Glue links the halfedges of m edge by edge. Halfedge h = 3f+k runs from corner k
// of triangle f to the next corner; next[h] is the halfedge that follows h around
// its edge: h itself on a boundary, the opposite halfedge where two triangles meet,
// a cycle in order of number where more do. Triangles with a repeated corner are
// left out: their halfedges stay alone. O(n+m).
func Glue(m *Mesh) (next []int32) { return glue(m.Triangles, m.NumVertices()) }
