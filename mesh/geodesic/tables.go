package geodesic

import (
	"math"
	"unsafe"
)

// tables is what a wave knows about every vertex and halfedge. A Solver keeps tables
// that are done with, cleaned where they were used, so that a short wave on a large
// mesh costs only what it touches.
type tables struct {
	distance []float64 // by vertex; +Inf when clean
	sends    []uint8   // by vertex: 0 not yet known (clean), else one of the below
	parents  []parent  // by vertex, where distance is finite; empty if no line was ever drawn
	list     []int32   // by halfedge: the number of its envelope in the pool plus 1; 0 when clean
	waits    []float64 // by halfedge: the least distance of windows that wait to cross; +Inf when clean

	// Vertices and halfedges that are no longer clean, each at least once; wide if they
	// are so many that they were not noted.
	vertices, halfedges []int32
	wide                bool
}

const (
	sendsNot uint8 = 1 + iota // no shortest path bends there
	sendsOn                   // the vertex waits to send the wave out anew
	sent                      // and has done so
)

// tableBytes is the size of new tables.
func (s *Solver) tableBytes(lines bool) int64 {
	n := int64(s.mesh.NumVertices())
	bytes := n*9 + int64(len(s.mesh.Triangles))*12
	if lines {
		bytes += n * int64(unsafe.Sizeof(parent{}))
	}
	return bytes
}

// takeTables gives clean tables.
func (s *Solver) takeTables(lines bool) *tables {
	n, halfedges := s.mesh.NumVertices(), len(s.mesh.Triangles)
	t, ok := s.used.Get().(*tables)
	if !ok {
		t = &tables{sends: make([]uint8, n), list: make([]int32, halfedges), waits: make([]float64, halfedges)}
		fill(t.waits)
	}
	if t.distance == nil {
		t.distance = make([]float64, n)
		fill(t.distance)
	}
	if lines && t.parents == nil {
		t.parents = make([]parent, n)
	}
	return t
}

func fill(a []float64) {
	for i := range a {
		a[i] = math.Inf(1)
	}
}

// touchVertex and touchHalfedge note what must be cleaned.
func (t *tables) touchVertex(v int32) {
	if len(t.vertices) < len(t.distance)/16 {
		t.vertices = append(t.vertices, v)
	} else {
		t.wide = true
	}
}

func (t *tables) touchHalfedge(h int32) {
	if len(t.halfedges) < len(t.list)/16 {
		t.halfedges = append(t.halfedges, h)
	} else {
		t.wide = true
	}
}

// giveTables cleans tables and keeps them for the next wave. distance may be nil, if
// it has been given away.
func (s *Solver) giveTables(t *tables) {
	inf := math.Inf(1)
	if t.wide {
		fill(t.distance)
		fill(t.waits)
		clear(t.sends)
		clear(t.list)
	} else {
		for _, v := range t.vertices {
			t.sends[v] = 0
			if t.distance != nil {
				t.distance[v] = inf
			}
		}
		for _, h := range t.halfedges {
			t.list[h], t.waits[h] = 0, inf
		}
	}
	t.vertices, t.halfedges, t.wide = t.vertices[:0], t.halfedges[:0], false
	s.used.Put(t)
}
