package geodesic

import (
	"math"
	"sync"

	"heatskin/mesh"
)

// A Solver answers questions about distance on one mesh. It keeps the mesh and, per
// triangle, 24 bytes of adjacency; it serves several goroutines at once.
type Solver struct {
	mesh *mesh.Mesh
	glue []int32 // as mesh.Glue: the next halfedge around the same edge
	// corner[first[v]:first[v+1]] are the halfedges that leave vertex v, one for each
	// triangle at v; triangles with a repeated corner are left out.
	first  []int32 // length NumVertices+1
	corner []int32
	extent float64 // largest side of the box around the mesh

	used sync.Pool // of *tables
}

// NewSolver prepares m, which must not change after, in O(n+m).
func NewSolver(m *mesh.Mesh) *Solver {
	s := &Solver{mesh: m, glue: mesh.Glue(m), extent: extent(m)}
	n := m.NumVertices()
	t := m.Triangles
	s.first = make([]int32, n+1)
	for f := 0; f < len(t); f += 3 {
		if !repeated(t[f : f+3]) {
			for _, v := range t[f : f+3] {
				s.first[v+1]++
			}
		}
	}
	for v := range n {
		s.first[v+1] += s.first[v]
	}
	s.corner = make([]int32, s.first[n])
	fill := make([]int32, n)
	for f := 0; f < len(t); f += 3 {
		if !repeated(t[f : f+3]) {
			for k, v := range t[f : f+3] {
				s.corner[s.first[v]+fill[v]] = int32(f + k)
				fill[v]++
			}
		}
	}
	return s
}

func extent(m *mesh.Mesh) (e float64) {
	for axis := range 3 {
		least, most := math.Inf(1), math.Inf(-1)
		for i := axis; i < len(m.Positions); i += 3 {
			least, most = min(least, m.Positions[i]), max(most, m.Positions[i])
		}
		e = max(e, most-least)
	}
	return e
}

func repeated(corners []int32) bool {
	return corners[0] == corners[1] || corners[1] == corners[2] || corners[2] == corners[0]
}

// corners lists the halfedges that leave v, one for each triangle.
func (s *Solver) corners(v int32) []int32 { return s.corner[s.first[v]:s.first[v+1]] }

// nearlyFlat is how far (radians) a vertex may fall short of its full turn and still
// send the wave out anew. On a flat vertex that changes nothing but fills the crack
// that round-off may leave between the windows on its two sides.
const nearlyFlat = 1e-7

// tinySide is the ratio of two sides from which round-off leaves nothing of the angle
// between them; nearlyFlat absorbs what it does to longer ones.
const tinySide = 1e-8

// sendsOn tells whether a shortest path may bend at v: where the total angle exceeds
// a full turn (half a turn on a boundary), where sheets meet in v alone or along an edge
// of more than two triangles, and where the angle cannot be told.
func (s *Solver) sendsOn(v int32) bool {
	corners := s.corners(v)
	if len(corners) == 0 {
		return false
	}
	rims, angle := 0, 0.0
	for _, out := range corners {
		in := preceding(out)
		for _, h := range [2]int32{out, in} {
			p := s.glue[h]
			if p == h {
				rims++
			} else if s.glue[p] != h {
				return true
			}
		}
		l := s.lay(out)
		if l.length <= tinySide*l.toA || l.toA <= tinySide*l.length {
			return true
		}
		angle += math.Atan2(l.y, l.x)
	}
	// One fan around v? Turn from the first corner, both ways if there is a rim.
	seen, closed := s.turn(corners[0], corners[0])
	if !closed {
		more, _ := s.turn(corners[0], preceding(corners[0]))
		seen += more - 1
	}
	if seen < len(corners) {
		return true
	}
	if rims > 0 {
		return angle > math.Pi-nearlyFlat
	}
	return angle > 2*math.Pi-nearlyFlat
}

// turn counts the corners met when turning about the tail of corner, across halfedge
// side first, until the start (closed) or a rim is reached. All edges must be manifold.
func (s *Solver) turn(corner, side int32) (count int, closed bool) {
	v := s.mesh.Triangles[corner]
	count = 1
	h := side
	for {
		p := s.glue[h]
		if p == h {
			return count, false
		}
		// In p's triangle leave by the other halfedge at v.
		out := p
		if s.mesh.Triangles[p] != v {
			out = following(p)
		}
		if out == corner {
			return count, true
		}
		if out == p {
			h = preceding(p)
		} else {
			h = out
		}
		count++
	}
}

// flat tells whether halfedge h's triangle has no area.
func (s *Solver) flat(h int32) bool {
	l := s.lay(h)
	return l.degenerate || l.y <= 4e-16*max(l.toA, l.toB)
}
