package meshtest

import (
	"math"

	"heatskin/mesh"
)

// BracketSize gives the dimensions of a Bracket.
type BracketSize struct {
	Width, Leg        float64 // along y; of each leg beyond the fillet
	Thickness, Inner  float64 // of the sheet; radius of the fillet inside
	Holes, Segments   int     // holes per leg; sides of each hole and of the fillet's quarter
	HoleRadius        float64 // of the largest
	HoleSum, HoleRims float64 // area of one leg's holes, polygons as they are; length of their rims on one face
}

// Bracket is an angle bracket bent from perforated sheet, closed, as CAD writes it
// with a coarse chord tolerance: its flat faces are triangulated over the corners of
// their many holes alone (slivers and fans), hole walls and fillets are long thin
// quads. Each leg has the given number of holes, of segments sides: about
// holes*(8*segments+8) triangles in all, 100 000 for 700 holes of 17.
func Bracket(holes, segments int) (*mesh.Mesh, BracketSize) {
	const pitch, hole = 7.0, 2.5 // millimetres, the largest hole
	columns := int(math.Ceil(math.Sqrt(float64(holes))))
	rows := (holes + columns - 1) / columns
	s := BracketSize{
		Width: pitch * float64(columns), Leg: pitch * float64(rows), Thickness: 3, Inner: 5,
		Holes: holes, Segments: segments, HoleRadius: hole,
	}
	outer := s.Thickness + s.Inner
	end := outer + s.Leg

	// The profile in x, z, counter-clockwise there, so that its outside is on the right.
	profile := []planar{{outer, 0}, {end, 0}, {end, s.Thickness}}
	arc := func(radius, from, to float64) { // around (outer, outer)
		for k := range segments + 1 {
			sin, cos := math.Sincos(from + (to-from)*float64(k)/float64(segments))
			profile = append(profile, planar{outer + radius*cos, outer + radius*sin})
		}
	}
	arc(s.Inner, -math.Pi/2, -math.Pi)
	profile = append(profile, planar{s.Thickness, end}, planar{0, end})
	arc(outer, -math.Pi, -math.Pi/2)
	profile = profile[:len(profile)-1] // it is the first point again

	b := newBuilder(0, 0)
	n := len(profile)
	front, back := make([]int32, n), make([]int32, n)
	rim := make([]int32, n)
	for i, p := range profile {
		front[i] = b.vertex([3]float64{p[0], 0, p[1]})
		back[i] = b.vertex([3]float64{p[0], s.Width, p[1]})
		rim[i] = int32(i)
	}
	corners := earClip(profile, rim, nil)
	for t := 0; t < len(corners); t += 3 {
		u, v, w := corners[t], corners[t+1], corners[t+2]
		b.triangle(front[u], front[v], front[w])
		b.triangle(back[u], back[w], back[v])
	}
	// Profile edges 0 and 2 are the lower leg's faces; the upright's are the two that
	// follow the first arc and the edge after them.
	inside := 3 + segments // from (thickness, outer) up
	outside := inside + 2  // from (0, end) down
	for i := range n {
		if i != 0 && i != 2 && i != inside && i != outside {
			j := (i + 1) % n
			b.quad(front[i], back[i], back[j], front[j])
		}
	}
	lower := func(x, y, depth float64) [3]float64 { return [3]float64{x, y, depth} }
	upright := func(x, y, depth float64) [3]float64 { return [3]float64{depth, y, x} }
	s.HoleSum, s.HoleRims = b.perforate(s, outer, lower, [4]int32{front[0], front[1], back[1], back[0]},
		[4]int32{front[3], front[2], back[2], back[3]}, false)
	b.perforate(s, outer, upright, [4]int32{front[outside+1], front[outside], back[outside], back[outside+1]},
		[4]int32{front[inside], front[inside+1], back[inside+1], back[inside]}, true)
	return b.mesh(), s
}

// perforate adds one leg's two faces, at depth 0 (corners below) and at the sheet's
// thickness (above), and the walls of the holes between them; place maps (along the
// leg, along y, depth) to space, mirror tells that it turns handedness over. It gives
// the area and the rims' length of the holes on one face.
func (b *builder) perforate(s BracketSize, from float64, place func(x, y, depth float64) [3]float64,
	below, above [4]int32, mirror bool) (area, rims float64) {
	triangle := func(u, v, w int32) {
		if mirror {
			v, w = w, v
		}
		b.triangle(u, v, w)
	}
	plan := []planar{{from, 0}, {from + s.Leg, 0}, {from + s.Leg, s.Width}, {from, s.Width}}
	low, high := below[:], above[:]
	columns := int(math.Ceil(math.Sqrt(float64(s.Holes))))
	pitch := s.Width / float64(columns)
	var holes [][]int32
	for k := range s.Holes {
		x, y := from+pitch*(float64(k/columns)+0.5), pitch*(float64(k%columns)+0.5)
		radius := s.HoleRadius * (0.5 + 0.5*float64(k%3)/2)
		// Each hole begins at an angle of its own (the golden angle's multiples), as
		// features drawn one by one do.
		start := 2.399963229728653 * float64(k)
		var hole []int32
		for i := range s.Segments {
			sin, cos := math.Sincos(start - 2*math.Pi*float64(i)/float64(s.Segments)) // clockwise
			hole = append(hole, int32(len(plan)))
			plan = append(plan, planar{x + radius*cos, y + radius*sin})
			low = append(low, b.vertex(place(x+radius*cos, y+radius*sin, 0)))
			high = append(high, b.vertex(place(x+radius*cos, y+radius*sin, s.Thickness)))
		}
		for i, u := range hole {
			v := hole[(i+1)%len(hole)]
			triangle(low[u], low[v], high[v])
			triangle(low[u], high[v], high[u])
		}
		holes = append(holes, hole)
		sides := float64(s.Segments)
		area += radius * radius / 2 * sides * math.Sin(2*math.Pi/sides)
		rims += 2 * radius * sides * math.Sin(math.Pi/sides)
	}
	corners := earClip(plan, []int32{0, 1, 2, 3}, holes)
	for t := 0; t < len(corners); t += 3 {
		u, v, w := corners[t], corners[t+1], corners[t+2]
		triangle(high[u], high[v], high[w])
		triangle(low[u], low[w], low[v])
	}
	return area, rims
}

// Extrusion is the closed solid over a simple polygon in x, z (counter-clockwise in
// that plane), drawn along y from 0 to width in n steps; its end caps are triangulated
// over the polygon's corners alone. Vertex i*(n+1)+j is corner i at y = width*j/n.
func Extrusion(profile [][2]float64, width float64, n int) *mesh.Mesh {
	b := newBuilder(0, 0)
	b.extrude(profile, width, n, true)
	corners := make([]int32, len(profile))
	for i := range corners {
		corners[i] = int32(i)
	}
	corners = earClip(profile, corners, nil)
	row := int32(n + 1)
	for t := 0; t < len(corners); t += 3 {
		u, v, w := corners[t]*row, corners[t+1]*row, corners[t+2]*row
		b.triangle(u, v, w)
		b.triangle(u+row-1, w+row-1, v+row-1)
	}
	return b.mesh()
}

// Sheet is the open sheet over a polyline in x, z, drawn along y from 0 to width in n
// steps, numbered as Extrusion.
func Sheet(profile [][2]float64, width float64, n int) *mesh.Mesh {
	b := newBuilder(0, 0)
	b.extrude(profile, width, n, false)
	return b.mesh()
}

func (b *builder) extrude(profile [][2]float64, width float64, n int, closed bool) {
	for _, p := range profile {
		for j := range n + 1 {
			b.vertex([3]float64{p[0], width * float64(j) / float64(n), p[1]})
		}
	}
	last := len(profile) - 1
	if closed {
		last++
	}
	for i := range last {
		u, v := int32(i*(n+1)), int32((i+1)%len(profile)*(n+1))
		for j := range int32(n) {
			b.quad(u+j, u+j+1, v+j+1, v+j)
		}
	}
}
