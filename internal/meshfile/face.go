package meshfile

import (
	"fmt"
	"math"
)

// A face collects one face's corners as they are read. They go into the triangles
// at once, as a fan around the first, so that a face of any length needs no memory
// of its own; split cuts the fans of non-convex faces anew when all points are known.
type face struct {
	soup      *Soup
	corners   int
	hub, last int32
	first     int // the triangle that it begins with
	short     int // faces of fewer than three corners so far
	shortAt   string
}

func (f *face) begin() {
	f.corners = 0
	f.first = len(f.soup.Triangles) / 3
}

// corner adds a corner, and is false if its triangle is one too many.
func (f *face) corner(v int32) bool {
	f.corners++
	switch f.corners {
	case 1:
		f.hub = v
	case 2:
	default:
		if len(f.soup.Triangles) >= 3*maxTriangles {
			return false
		}
		f.soup.Triangles = append(f.soup.Triangles, f.hub, f.last, v)
	}
	f.last = v
	return true
}

// end closes the face, which stands at the given place.
func (f *face) end(s *source) {
	switch {
	case f.corners < 3:
		if f.short == 0 {
			f.shortAt = s.place()
		}
		f.short++
	case f.corners > 3:
		f.soup.polygons = append(f.soup.polygons, polygon{first: int32(f.first), triangles: int32(f.corners - 2)})
	}
}

// done adds the warnings that the faces earned.
func (f *face) done() {
	if f.short > 0 {
		f.soup.warn(fmt.Sprintf("faces of fewer than three corners (%d, the first at %s) are left out", f.short, f.shortAt))
	}
}

// place names where the source stands, for warnings.
func (s *source) place() string {
	if s.line > 0 {
		return fmt.Sprintf("line %d", s.line)
	}
	return fmt.Sprintf("byte %d", s.offset())
}

// tooMany is the error for more triangles than int32 halfedges can number.
func (s *source) tooMany() error {
	s.got = "more"
	return s.want(fmt.Sprintf("at most %d triangles", int64(maxTriangles)))
}

// tooManyVertices is the error for more vertices than int32 can number.
func (s *source) tooManyVertices() error {
	s.got = "more"
	return s.want(fmt.Sprintf("at most %d vertices", int64(math.MaxInt32)))
}
