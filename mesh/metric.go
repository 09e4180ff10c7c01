package mesh

import (
	"fmt"
	"math"
	"slices"

	"heatskin/internal/parallel"
)

// A Metric gives the edges of a mesh lengths other than those in space. It is made for
// one mesh by NewChartMetric, NewArrivalMetric or NewTensorMetric and set as its Metric; Refine carries
// it over to the mesh that it makes. Nothing but NewSurface looks at it: whatever is
// computed on a Surface follows from the lengths there.
type Metric struct {
	chart  []float64 // g11, g12, g22 of vertex v at 3v; nil: the metric goes by triangle
	fibres []float64 // two vectors for each row, of which a side has its components in an orthonormal frame
	root   []float64 // √det D of each row; nil: nobody asks for it
	row    []int32   // by triangle, in fibres and root
}

// A MetricError is a metric that is none at one vertex or triangle.
type MetricError struct {
	Vertex, Triangle int // one of them; the other is -1
	Want, Got        string
}

func (e *MetricError) Error() string {
	place := fmt.Sprintf("vertex %d", e.Vertex)
	if e.Vertex < 0 {
		place = fmt.Sprintf("triangle %d", e.Triangle)
	}
	return fmt.Sprintf("%s: want %s, got %s", place, e.Want, e.Got)
}

// A NotFlatError is a mesh that is no chart: it does not lie in a plane z = const.
type NotFlatError struct {
	Vertex int
	Z      float64
	Want   float64
}

func (e *NotFlatError) Error() string {
	return fmt.Sprintf("vertex %d has z = %g; a metric in x,y needs a mesh flat in z, here z = %g", e.Vertex, e.Z, e.Want)
}

// leastDefinite is how far from singular a metric must be, as 1 - |g12|/√(g11 g22):
// closer, the heights of triangles are lost in the rounding of their sides.
const leastDefinite = 1e-12

// NewChartMetric is the Riemannian metric g11 dx² + 2 g12 dx dy + g22 dy² over a flat
// mesh m in x, y, given as g11, g12, g22 of vertex v at 3v and linear on each triangle.
// It keeps g. The error is a *MetricError where g is not positive definite at a corner
// of a triangle, or a *NotFlatError. O(n).
func NewChartMetric(m *Mesh, g []float64) (*Metric, error) {
	if len(g) != len(m.Positions) {
		panic("mesh: NewChartMetric: three numbers for each vertex are needed")
	}
	box := noBox()
	for _, v := range m.Triangles {
		box.add(point3(m.Positions, v))
	}
	for _, v := range m.Triangles {
		if first := m.Positions[3*m.Triangles[0]+2]; math.Abs(m.Positions[3*v+2]-first) > 1e-9*box.size() {
			return nil, &NotFlatError{int(v), m.Positions[3*v+2], first}
		}
	}
	for _, v := range m.Triangles {
		g11, g12, g22 := g[3*v], g[3*v+1], g[3*v+2]
		definite := g11 > 0 && g22 > 0 && math.Abs(g12)/math.Sqrt(g11)/math.Sqrt(g22) < 1-leastDefinite
		if !definite || math.IsInf(g11+g22, 1) {
			return nil, &MetricError{int(v), -1, "a positive definite metric (g11 > 0, g11*g22 > g12^2)",
				fmt.Sprintf("g11 = %g, g12 = %g, g22 = %g", g11, g12, g22)}
		}
	}
	return &Metric{chart: g}, nil
}

// NewArrivalMetric is the metric D⁻¹ of a tensor D that is constant on each triangle:
// principal values along and across a direction (x, y, z of triangle f at 3f), which is
// projected into the triangle. A length is the time in which a front arrives whose
// squared speed is the tensor.
//
// Triangles without area have no directions: their neighbours measure them. The error is a *MetricError: a value that
// is not positive and finite, or a direction along the triangle's normal, unless along
// and across are equal. O(n).
func NewArrivalMetric(m *Mesh, direction, along, across []float64) (*Metric, error) {
	t, err := NewTensorMetric(m, direction, along, across)
	if err != nil {
		return nil, err
	}
	for f, root := range t.root {
		for k := range 6 {
			t.fibres[6*f+k] /= math.Sqrt(root)
		}
	}
	t.root = nil
	return t, nil
}

// NewTensorMetric is the metric of a diffusion tensor D, given as to NewArrivalMetric,
// for the operator div(D grad u). On a surface the stiffness of a metric does not depend
// on its scale: that of D⁻¹ times √det D, the root of the determinant, is that of D. The
// scale can be chosen so that areas are those in space, g = √det D · D⁻¹: the mass then
// is, too, and triangles of different isotropic tensors agree on lengths in space. The
// factor √det D is Surface.Density. It is no metric for distances: take NewArrivalMetric.
func NewTensorMetric(m *Mesh, direction, along, across []float64) (*Metric, error) {
	n := m.NumTriangles()
	if len(direction) != 3*n || len(along) != n || len(across) != n {
		panic("mesh: a tensor metric: a direction and two numbers for each triangle are needed")
	}
	t := &Metric{fibres: make([]float64, 6*n), root: make([]float64, n), row: make([]int32, n)}
	for f := range n {
		t.row[f] = int32(f)
		for _, d := range [2]float64{along[f], across[f]} {
			if !(d > 0) || math.IsInf(d, 1) {
				return nil, &MetricError{-1, f, "diffusivities above 0", fmt.Sprintf("along = %g, across = %g", along[f], across[f])}
			}
		}
		t.root[f] = math.Sqrt(along[f]) * math.Sqrt(across[f])
		a, b, c := m.Triangles[3*f], m.Triangles[3*f+1], m.Triangles[3*f+2]
		if !hasArea(m.Positions, a, b, c) {
			continue
		}
		p := point3(m.Positions, a)
		side := minus3(point3(m.Positions, b), p)
		normal := unit3(cross3(side, minus3(point3(m.Positions, c), p)))
		fibre := unit3([3]float64(direction[3*f : 3*f+3]))
		up := dot3(fibre, normal)
		for axis := range fibre {
			fibre[axis] -= up * normal[axis]
		}
		if !(length3(fibre) > 1e-9) { // less is rounding of a direction along the normal
			if along[f] != across[f] {
				return nil, &MetricError{-1, f, "a direction that is not along the normal", fmt.Sprintf("%g,%g,%g", direction[3*f], direction[3*f+1], direction[3*f+2])}
			}
			fibre = side // any will do
		}
		fibre = unit3(fibre)
		weft := cross3(normal, fibre)
		narrow := math.Sqrt(math.Sqrt(across[f]) / math.Sqrt(along[f]))
		for axis := range 3 {
			t.fibres[6*f+axis] = fibre[axis] * narrow
			t.fibres[6*f+3+axis] = weft[axis] / narrow
		}
	}
	return t, nil
}

func unit3(p [3]float64) [3]float64 {
	size := max(math.Abs(p[0]), math.Abs(p[1]), math.Abs(p[2]))
	if !(size > 0) {
		return p
	}
	p = [3]float64{p[0] / size, p[1] / size, p[2] / size}
	size = length3(p)
	return [3]float64{p[0] / size, p[1] / size, p[2] / size}
}

// length is that of the straight line from vertex a to b, as triangle f sees it. On a
// chart the square of the speed is linear along the line, from p² to q², say, and the
// integral of its root is 2/3 (p² + pq + q²)/(p + q).
func (t *Metric) length(x []float64, f, a, b int32) float64 {
	if t.chart != nil {
		if a > b {
			a, b = b, a // both ways the same to the last bit
		}
		dx, dy := x[3*b]-x[3*a], x[3*b+1]-x[3*a+1]
		speed := func(g []float64) float64 {
			return math.Sqrt(max(0, g[0]*dx*dx+2*g[1]*dx*dy+g[2]*dy*dy))
		}
		p, q := speed(t.chart[3*a:]), speed(t.chart[3*b:])
		if p+q == 0 {
			return 0
		}
		return 2 * (p - p*(q/(p+q)) + q) / 3
	}
	d := minus3(point3(x, b), point3(x, a))
	g := t.fibres[6*t.row[f]:][:6]
	return math.Hypot(dot3(d, [3]float64(g[:3])), dot3(d, [3]float64(g[3:])))
}

// clone is a copy that may grow with the mesh.
func (t *Metric) clone() *Metric {
	return &Metric{chart: slices.Clone(t.chart), fibres: t.fibres, root: t.root, row: slices.Clone(t.row)}
}

// divide gives a new vertex, at the part s of the way from a to b, its metric.
func (t *Metric) divide(a, b int32, s float64) {
	if t.chart != nil {
		for k := range int32(3) {
			p, q := t.chart[3*a+k], t.chart[3*b+k]
			t.chart = append(t.chart, p+s*(q-p))
		}
	}
}

// inherit gives a new triangle the tensor of triangle f, which it is cut from.
func (t *Metric) inherit(f int32) {
	if t.row != nil {
		t.row = append(t.row, t.row[f])
	}
}

// jump is the disagreement on a length, relative, from which two tensors are not blended.
// Fibres that turn by a few degrees from one triangle to the next stay below.
const jump = 0.05

// measure takes the lengths of the surface's edges from the mesh's metric; vertex has
// the mesh's number of each vertex. Where the triangles of an edge do not agree, its
// length is the root mean square of theirs: then every triangle at such an edge stands
// for a mixture of tensors, and what is computed is first order in the mesh size there.
// Across a jump, each triangle keeps its own length: stiffness and mass, sums over
// triangles, are then those of linear elements, but the edge cannot be flipped. A metric
// for distance is blended there too, as a front must go on from a length that both know.
func (s *Surface) measure(vertex []int32) error {
	t := s.mesh.Metric
	own := make([]float64, len(s.Vert))
	parallel.EachBlock(s.NumFaces(), func(_, lo, hi int) {
		for h := int32(3 * lo); h < int32(3*hi); h++ {
			own[h] = t.length(s.mesh.Positions, s.parent[h/3], vertex[s.Vert[h]], vertex[s.head(h)])
		}
	})
	longest := slices.Max(own)
	if !(longest >= 1e-140 && longest <= 1e140) { // as in checkRange
		return &RangeError{Size: longest}
	}
	for h := range int32(len(own)) {
		mean, first := own[h], true
		sum, count := 0.0, 0.0
		s.aroundEdge(h, func(g int32) {
			first = first && h <= g
			if own[g] > 0 {
				sum += (own[g] / longest) * (own[g] / longest)
				count++
			}
		})
		if !first {
			continue
		}
		if t.chart == nil && count > 0 {
			mean = longest * math.Sqrt(sum/count)
		}
		off := 0.0
		s.aroundEdge(h, func(g int32) {
			s.Length[g] = mean
			if own[g] > 0 {
				off = max(off, math.Abs(own[g]-mean)/mean)
			}
		})
		if t.root != nil && off > jump {
			s.aroundEdge(h, func(g int32) {
				if own[g] > 0 {
					s.Length[g] = own[g]
				}
			})
			continue
		}
		s.Mismatch = max(s.Mismatch, off)
	}
	if t.root != nil {
		s.Density = make([]float64, s.NumFaces())
		for f, parent := range s.parent {
			s.Density[f] = t.root[t.row[parent]]
		}
	}
	return nil
}

// aroundEdge calls do for every halfedge of the edge of h.
func (s *Surface) aroundEdge(h int32, do func(g int32)) {
	do(h)
	for g := s.Glue[h]; g != h; g = s.Glue[g] {
		do(g)
	}
}
