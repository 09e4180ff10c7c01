package mesh

import "fmt"

// A Mesh is a triangulated surface as a file gives it: corners that share a
// number are joined, nothing else is. It is not changed once made, except that it may
// be given a metric before it is first used.
type Mesh struct {
	Positions []float64 // x, y, z of vertex v at 3v, in the file's length unit
	Triangles []int32   // corners of triangle f at 3f, each a vertex number
	File      FileInfo  // where it came from; zero for a mesh made in memory
	Metric    *Metric   // of edges; nil: their lengths in space
}

// FileInfo tells which file a mesh was read from.
type FileInfo struct {
	Name     string   // as the user named it; "-" is standard input
	Format   string   // "stl", "ply", "obj" or "off"
	SHA256   string   // of the bytes as they lay on disk, in hexadecimal
	Bytes    int64    // length of those bytes
	Warnings []string // what was odd in the file, in words
}

// New makes a mesh from flat slices, which it keeps. The error is a *CornerError
// if a triangle names a vertex that is not there, or a *ValueError if a coordinate
// is not finite.
func New(positions []float64, triangles []int32) (*Mesh, error) {
	m := &Mesh{Positions: positions, Triangles: triangles}
	if len(positions)%3 != 0 || len(triangles)%3 != 0 {
		return nil, fmt.Errorf("mesh: %d coordinates and %d corners: want multiples of 3", len(positions), len(triangles))
	}
	n := int32(m.NumVertices())
	for h, v := range triangles {
		if v < 0 || v >= n {
			return nil, &CornerError{Triangle: h / 3, Vertex: int(v), Vertices: int(n)}
		}
	}
	for i, x := range positions {
		if x-x != 0 {
			return nil, &ValueError{Vertex: i / 3, Axis: i % 3, Value: x}
		}
	}
	return m, nil
}

// NumVertices is the number of vertices, those in no triangle included.
func (m *Mesh) NumVertices() int { return len(m.Positions) / 3 }

// NumTriangles is the number of triangles, degenerate ones included.
func (m *Mesh) NumTriangles() int { return len(m.Triangles) / 3 }

// A CornerError is a triangle that names a vertex the mesh does not have.
type CornerError struct{ Triangle, Vertex, Vertices int }

func (e *CornerError) Error() string {
	return fmt.Sprintf("triangle %d names vertex %d; want 0 to %d", e.Triangle, e.Vertex, e.Vertices-1)
}

// A ValueError is a coordinate that is not a finite number.
type ValueError struct {
	Vertex, Axis int
	Value        float64
}

func (e *ValueError) Error() string {
	return fmt.Sprintf("vertex %d: %c is %v; want a finite number", e.Vertex, 'x'+rune(e.Axis), e.Value)
}
