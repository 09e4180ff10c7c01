package geodesic

import "math"

// A layout is one triangle in the plane as halfedge h sees it: h's tail A at the
// origin, its head B at (length, 0), the apex C at (x, y) with y >= 0.
type layout struct {
	a, b, c    int32   // vertices
	length     float64 // |AB|
	x, y       float64 // C
	toA, toB   float64 // |AC|, |BC|
	uax, uay   float64 // unit vector from A to C; 0, 0 if they coincide
	ubx, uby   float64 // unit vector from B to C with x counted from B back to A
	gateA      int32   // halfedge from C to A
	gateB      int32   // halfedge from B to C
	degenerate bool    // A and B coincide: the rest is not set
}

// following and preceding are the next and the last halfedge around the triangle of h.
func following(h int32) int32 {
	if h%3 == 2 {
		return h - 2
	}
	return h + 1
}

func preceding(h int32) int32 {
	if h%3 == 0 {
		return h + 2
	}
	return h - 1
}

// lay lays out the triangle of h. Positions rather than edge lengths give the
// height: the cross product is good to an ulp of the longest side squared, Heron's
// formula only to its square root, which on slivers would bend the surface.
func (s *Solver) lay(h int32) (l layout) {
	l.gateB, l.gateA = following(h), preceding(h)
	t, p := s.mesh.Triangles, s.mesh.Positions
	l.a, l.b, l.c = t[h], t[l.gateB], t[l.gateA]
	a := p[3*l.a : 3*l.a+3 : 3*l.a+3]
	b := p[3*l.b : 3*l.b+3 : 3*l.b+3]
	c := p[3*l.c : 3*l.c+3 : 3*l.c+3]
	bx, by, bz := b[0]-a[0], b[1]-a[1], b[2]-a[2]
	cx, cy, cz := c[0]-a[0], c[1]-a[1], c[2]-a[2]
	dx, dy, dz := c[0]-b[0], c[1]-b[1], c[2]-b[2]
	l.length = math.Sqrt(bx*bx + by*by + bz*bz)
	if l.length == 0 {
		l.degenerate = true
		return l
	}
	l.toA = math.Sqrt(cx*cx + cy*cy + cz*cz)
	l.toB = math.Sqrt(dx*dx + dy*dy + dz*dz)
	// The shorter of AC, BC: the direction of a very short side must come out right.
	ex, ey, ez := cx, cy, cz
	if l.toB < l.toA {
		ex, ey, ez = dx, dy, dz
	}
	nx, ny, nz := by*ez-bz*ey, bz*ex-bx*ez, bx*ey-by*ex
	l.y = math.Sqrt(nx*nx+ny*ny+nz*nz) / l.length
	l.x = (bx*cx + by*cy + bz*cz) / l.length
	if l.toA > 0 {
		l.uax, l.uay = l.x/l.toA, l.y/l.toA
	}
	if l.toB > 0 {
		l.ubx, l.uby = -(bx*dx+by*dy+bz*dz)/l.length/l.toB, l.y/l.toB
	}
	return l
}

// edgeLength is the length of halfedge h; the same from both sides of an edge.
func (s *Solver) edgeLength(h int32) float64 {
	return s.between(s.mesh.Triangles[h], s.mesh.Triangles[following(h)])
}

func (s *Solver) between(a, b int32) float64 {
	p := s.mesh.Positions
	x, y, z := p[3*b]-p[3*a], p[3*b+1]-p[3*a+1], p[3*b+2]-p[3*a+2]
	return math.Sqrt(x*x + y*y + z*z)
}
