package kernel

import (
	"math"

	"heatskin/mesh"
)

// frames give each vertex of a surface its own polar angle: 0 along one of its
// edges, growing counter-clockwise through its triangles up to the total angle there.
type frames struct {
	start     []int32   // halfedges out of v are corner[start[v]:start[v+1]]
	corner    []int32   // in order of angle where the vertex has a frame
	at        []float64 // by halfedge: its angle in the frame of its tail
	wide      []float64 // by halfedge: the face's angle at its tail
	total     []float64 // by vertex: sum of its angles
	kind      []uint8   // by vertex: smooth, cone, rimmed or odd
	curvature []float64 // by vertex: Gaussian curvature, averaged over the ring
	turning   []float64 // by vertex: |K|·h², how far its frame turns against the next
	edge      []float64 // by vertex: mean length of the edges there
}

const (
	smooth = iota // total angle about 2π: angles are scaled so that it is
	cone          // an angle of its own: corners of a part, kept as they are
	rimmed        // on the boundary: angles do not go round
	odd           // edges with more than two faces, or several fans: no frame
)

// coneDefect is the angle defect from which a vertex is a corner of the part and not
// a sample of a curved skin. Curved skins are that far from flat only where an edge
// spans half a radian.
const coneDefect = 0.3

func newFrames(s *mesh.Surface) frames {
	n := s.NumVertices
	f := frames{
		start: make([]int32, n+1), corner: make([]int32, len(s.Vert)),
		at: make([]float64, len(s.Vert)), wide: make([]float64, len(s.Vert)),
		total: make([]float64, n), kind: make([]uint8, n),
		curvature: make([]float64, n), turning: make([]float64, n), edge: make([]float64, n),
	}
	for h, v := range s.Vert {
		f.start[v+1]++
		f.wide[h] = s.Angle(int32(h))
		f.total[v] += f.wide[h]
		f.edge[v] += (s.Length[h] + s.Length[prev(int32(h))]) / 2
	}
	for v := range n {
		if f.start[v+1] > 0 {
			f.edge[v] /= float64(f.start[v+1])
		}
		f.start[v+1] += f.start[v]
	}
	fill := append([]int32(nil), f.start[:n]...)
	for h, v := range s.Vert {
		f.corner[fill[v]] = int32(h)
		fill[v]++
	}
	for v := range int32(n) {
		f.walk(s, v)
	}
	f.measureCurvature(s)
	return f
}

// walk orders the halfedges out of v counter-clockwise and measures their angles.
func (f *frames) walk(s *mesh.Surface, v int32) {
	out := f.out(v)
	if len(out) == 0 {
		f.kind[v] = odd
		return
	}
	first, rims := out[0], 0
	for _, h := range out {
		if s.Opposite(h) < 0 {
			first = h
			rims++
		}
		if g := prev(h); s.Opposite(g) < 0 && !s.Boundary(g) || s.Opposite(h) < 0 && !s.Boundary(h) {
			f.kind[v] = odd // a seam or a branching edge
			return
		}
	}
	angle, h, count := 0.0, first, 0
	for count < len(out) {
		f.at[h] = angle
		angle += f.wide[h]
		out[count] = h // safe: the walk does not read this list
		count++
		if h = s.Opposite(prev(h)); h < 0 || h == first {
			break
		}
	}
	switch {
	case count < len(out) || rims > 1:
		f.kind[v] = odd // several fans meet in one point
	case rims == 1:
		f.kind[v] = rimmed
	case math.Abs(2*math.Pi-f.total[v]) >= coneDefect:
		f.kind[v] = cone
	default:
		f.kind[v] = smooth
	}
}

// out lists the halfedges that leave v.
func (f *frames) out(v int32) []int32 { return f.corner[f.start[v]:f.start[v+1]] }

// angle is the face's angle at the tail of h.
func (f *frames) angle(h int32) float64 { return f.wide[h] }

// turn is the angle at v from one direction counter-clockwise to another, both given
// in v's frame: +Inf where the boundary lies between, NaN where there is no frame.
func (f *frames) turn(v int32, from, to float64) float64 {
	gap := to - from
	switch f.kind[v] {
	case odd:
		return math.NaN()
	case rimmed:
		if gap < -1e-12 {
			return math.Inf(1)
		}
		return max(gap, 0)
	}
	total := f.total[v]
	for gap < 0 {
		gap += total
	}
	for gap >= total {
		gap -= total
	}
	if f.kind[v] == smooth {
		gap *= 2 * math.Pi / total
	}
	return gap
}

// measureCurvature spreads the angle defects over the areas around: the Gaussian
// curvature of a curved skin, and 0 near the corners and on the flat faces of a part.
func (f *frames) measureCurvature(s *mesh.Surface) {
	n := s.NumVertices
	defect, area := make([]float64, n), make([]float64, n)
	for face := range int32(s.NumFaces()) {
		third := s.Area(face) / 3
		for h := 3 * face; h < 3*face+3; h++ {
			area[s.Vert[h]] += third
		}
	}
	for v := range defect {
		if f.kind[v] == smooth {
			defect[v] = 2*math.Pi - f.total[v]
			if math.Abs(defect[v]) < 1e-9 {
				defect[v] = 0 // rounding
			}
		}
	}
	for v := range int32(n) {
		if f.kind[v] != smooth && f.kind[v] != rimmed {
			continue
		}
		sumDefect, sumArea, most := defect[v], area[v], math.Abs(defect[v])
		for _, h := range f.out(v) {
			u := s.Vert[next(h)]
			sumDefect += defect[u]
			sumArea += area[u]
			most = max(most, math.Abs(defect[u]))
		}
		if sumArea > 0 {
			f.curvature[v] = sumDefect / sumArea
		}
		f.turning[v] = most
	}
}
