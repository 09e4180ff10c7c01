package meshtest

import (
	"math"
	"math/rand/v2"

	"heatskin/mesh"
)

// Icosphere is a unit sphere of 10*4^k+2 vertices: the icosahedron, each triangle
// cut in four k times, midpoints pushed out to the sphere. Vertices are then moved
// along the sphere by up to jitter times the mean edge.
func Icosphere(k int, jitter float64, seed uint64) *mesh.Mesh {
	m := icosahedron()
	for range k {
		m = quarter(m)
		ontoSphere(m.Positions)
	}
	if jitter > 0 {
		shake(m, jitter, rand.New(rand.NewPCG(seed, 0x69636f)))
	}
	return m
}

// ShakenSphere is a unit sphere of 10*4^k+2 vertices with neither pattern nor even
// spacing: vertices of an icosphere are moved at random, several times over, and the
// triangles follow them (the convex hull of the points: Delaunay on the sphere).
func ShakenSphere(k int, seed uint64) *mesh.Mesh {
	m := Icosphere(k, 0, 0)
	rng := rand.New(rand.NewPCG(seed, 0x7368616b))
	for range 5 {
		shake(m, 0.5, rng)
		flipToHull(m)
	}
	return m
}

// SphereGrid is a unit sphere on circles of latitude: n rows from pole to pole, 2n
// columns. Vertex 0 is the north pole, 1+(i-1)*2n+j lies at colatitude pi*i/n and
// longitude pi*j/n, the last vertex is the south pole.
func SphereGrid(n int) *mesh.Mesh {
	b := newBuilder(0, 0)
	at := func(i, j int) [3]float64 {
		sinT, cosT := math.Sincos(math.Pi * float64(i) / float64(n))
		sinP, cosP := math.Sincos(math.Pi * float64(j) / float64(n))
		return [3]float64{sinT * cosP, sinT * sinP, cosT}
	}
	b.vertex([3]float64{0, 0, 1})
	for i := 1; i < n; i++ {
		for j := range 2 * n {
			b.vertex(at(i, j))
		}
	}
	south := b.vertex([3]float64{0, 0, -1})
	number := func(i, j int) int32 { return int32(1 + (i-1)*2*n + j%(2*n)) }
	for j := range 2 * n {
		b.triangle(0, number(1, j), number(1, j+1))
		for i := 1; i < n-1; i++ {
			b.quad(number(i, j), number(i+1, j), number(i+1, j+1), number(i, j+1))
		}
		b.triangle(number(n-1, j), south, number(n-1, j+1))
	}
	return b.mesh()
}

// Tetrahedron is the regular one with edge 1, each face cut into 4^k triangles.
func Tetrahedron(k int) *mesh.Mesh {
	s := math.Sqrt(1.0 / 8)
	return quarters(k, []float64{s, s, s, s, -s, -s, -s, s, -s, -s, -s, s},
		[]int32{0, 1, 2, 0, 3, 1, 0, 2, 3, 1, 3, 2})
}

// Octahedron is the regular one with edge 1, vertices +x -x +y -y +z -z, each face
// cut into 4^k triangles.
func Octahedron(k int) *mesh.Mesh {
	s := math.Sqrt(0.5)
	return quarters(k, []float64{s, 0, 0, -s, 0, 0, 0, s, 0, 0, -s, 0, 0, 0, s, 0, 0, -s},
		[]int32{0, 2, 4, 2, 1, 4, 1, 3, 4, 3, 0, 4, 2, 0, 5, 1, 2, 5, 3, 1, 5, 0, 3, 5})
}

func quarters(k int, positions []float64, triangles []int32) *mesh.Mesh {
	m := &mesh.Mesh{Positions: positions, Triangles: triangles}
	for range k {
		m = quarter(m)
	}
	return m
}

func icosahedron() *mesh.Mesh {
	g := math.Phi
	m := &mesh.Mesh{
		Positions: []float64{-1, g, 0, 1, g, 0, -1, -g, 0, 1, -g, 0, 0, -1, g, 0, 1, g,
			0, -1, -g, 0, 1, -g, g, 0, -1, g, 0, 1, -g, 0, -1, -g, 0, 1},
		Triangles: []int32{0, 11, 5, 0, 5, 1, 0, 1, 7, 0, 7, 10, 0, 10, 11, 1, 5, 9, 5, 11, 4, 11, 10, 2, 10, 7, 6, 7, 1, 8,
			3, 9, 4, 3, 4, 2, 3, 2, 6, 3, 6, 8, 3, 8, 9, 4, 9, 5, 2, 4, 11, 6, 2, 10, 8, 6, 7, 9, 8, 1},
	}
	ontoSphere(m.Positions)
	return m
}

func ontoSphere(x []float64) {
	for i := 0; i < len(x); i += 3 {
		r := math.Sqrt(x[i]*x[i] + x[i+1]*x[i+1] + x[i+2]*x[i+2])
		x[i], x[i+1], x[i+2] = x[i]/r, x[i+1]/r, x[i+2]/r
	}
}

// quarter cuts each triangle in four at its edges' midpoints.
func quarter(m *mesh.Mesh) *mesh.Mesh {
	b := newBuilder(0, 0)
	b.positions = append(make([]float64, 0, 4*len(m.Positions)), m.Positions...)
	b.triangles = make([]int32, 0, 4*len(m.Triangles))
	middle := make(map[[2]int32]int32, len(m.Triangles)/2)
	mid := func(u, v int32) int32 {
		key := [2]int32{min(u, v), max(u, v)}
		w, ok := middle[key]
		if !ok {
			p, q := position(m, u), position(m, v)
			w = b.vertex([3]float64{(p[0] + q[0]) / 2, (p[1] + q[1]) / 2, (p[2] + q[2]) / 2})
			middle[key] = w
		}
		return w
	}
	for f := 0; f < len(m.Triangles); f += 3 {
		u, v, w := m.Triangles[f], m.Triangles[f+1], m.Triangles[f+2]
		uv, vw, wu := mid(u, v), mid(v, w), mid(w, u)
		b.triangle(u, uv, wu)
		b.triangle(uv, v, vw)
		b.triangle(wu, vw, w)
		b.triangle(uv, vw, wu)
	}
	return b.mesh()
}

// shake moves the vertices of a unit sphere along it by up to amount times the mean
// edge, each unless one of its triangles would turn over.
func shake(m *mesh.Mesh, amount float64, rng *rand.Rand) {
	n := m.NumVertices()
	edge := math.Sqrt(4 * math.Pi / float64(m.NumTriangles()) * 4 / math.Sqrt(3))
	start := make([]int32, n+1)
	for _, v := range m.Triangles {
		start[v+1]++
	}
	for v := range n {
		start[v+1] += start[v]
	}
	around := make([]int32, len(m.Triangles))
	fill := append([]int32(nil), start[:n]...)
	for h, v := range m.Triangles {
		around[fill[v]] = int32(h / 3)
		fill[v]++
	}
	for v := range n {
		x := m.Positions[3*v : 3*v+3]
		old := [3]float64(x)
		for axis := range x {
			x[axis] += amount * edge * (2*rng.Float64() - 1)
		}
		ontoSphere(x)
		for _, f := range around[start[v]:start[v+1]] {
			// A sliver is refused too: the bound is a tenth of the mean triangle's volume under the origin.
			if volume(m, m.Triangles[3*f:3*f+3]) < 0.1*edge*edge*math.Sqrt(3)/2 {
				copy(x, old[:])
				break
			}
		}
	}
}

// volume is six times that of the tetrahedron on the origin.
func volume(m *mesh.Mesh, corners []int32) float64 {
	p, q, r := position(m, corners[0]), position(m, corners[1]), position(m, corners[2])
	return p[0]*(q[1]*r[2]-q[2]*r[1]) + p[1]*(q[2]*r[0]-q[0]*r[2]) + p[2]*(q[0]*r[1]-q[1]*r[0])
}

// flipToHull turns edges until the closed mesh is locally convex everywhere.
func flipToHull(m *mesh.Mesh) {
	twin := twins(m)
	t := m.Triangles
	next := func(h int32) int32 { return h - h%3 + (h+1)%3 }
	stack := make([]int32, len(t))
	for h := range stack {
		stack[h] = int32(h)
	}
	for len(stack) > 0 {
		h := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		o := twin[h]
		hn, on := next(h), next(o)
		hp, op := next(hn), next(on)
		u, v, w, x := t[h], t[hn], t[hp], t[op]
		p, q, r, s := position(m, u), position(m, v), position(m, w), position(m, x)
		a, b, c := minus(q, p), minus(r, p), minus(s, p)
		if dot(cross(a, b), c) <= 1e-12*dot(a, a)*math.Sqrt(dot(c, c)) { // below or in the plane
			continue
		}
		// (u v w), (v u x) become (x v w), (w u x): edge h is now x-w.
		outA, outB := twin[hp], twin[op] // across w-u and x-v
		t[h], t[o] = x, w
		link := func(a, b int32) { twin[a], twin[b] = b, a }
		link(h, outB)
		link(o, outA)
		link(hp, op)
		stack = append(stack, h, o, hn, on)
	}
}

// twins pairs the halfedges of a closed, oriented mesh.
func twins(m *mesh.Mesh) []int32 {
	twin := make([]int32, len(m.Triangles))
	seen := make(map[[2]int32]int32, len(m.Triangles))
	for h, u := range m.Triangles {
		v := m.Triangles[h-h%3+(h+1)%3]
		seen[[2]int32{u, v}] = int32(h)
		if o, ok := seen[[2]int32{v, u}]; ok {
			twin[h], twin[o] = o, int32(h)
		}
	}
	return twin
}
