package mesh

// A Datum is one place that distance is measured from or heat is put into: a
// vertex, a point of a triangle, or a set of whole edges (a boundary loop, a
// crease). Several of them are a []Datum, and they add up.
type Datum struct {
	Name   string     // as the user asked for it, for messages: "vertex 12"
	Vertex int32      // a vertex number, or -1
	Point  *Point     // a point inside a triangle or on its rim, or nil
	Edges  [][2]int32 // edges of the mesh by their end vertices, or nil
	Gap    float64    // how far the asked place lay off the surface
}

// A Point is a place on a mesh: weights that add up to 1 on a triangle's corners.
type Point struct {
	Triangle int32
	Weights  [3]float64
}

// AtVertex is the datum of one vertex.
func AtVertex(v int32) Datum { return Datum{Vertex: v} }

// AtPoint is the datum of one point on a triangle.
func AtPoint(p Point) Datum { return Datum{Vertex: -1, Point: &p} }

// AtEdges is the datum of whole edges, given by their end vertices.
func AtEdges(edges [][2]int32) Datum { return Datum{Vertex: -1, Edges: edges} }

// Position is where p lies in space.
func (m *Mesh) Position(p Point) [3]float64 {
	var x [3]float64
	for k, w := range p.Weights {
		v := m.Triangles[3*p.Triangle+int32(k)]
		for axis := range x {
			x[axis] += w * m.Positions[3*v+int32(axis)]
		}
	}
	return x
}
