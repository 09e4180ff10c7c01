package meshtest

import (
	"math"
	"math/rand/v2"

	"heatskin/mesh"
)

// Map is m with its vertices moved by f.
func Map(m *mesh.Mesh, f func(p [3]float64) [3]float64) *mesh.Mesh {
	positions := make([]float64, 0, len(m.Positions))
	for v := range m.NumVertices() {
		p := f(position(m, int32(v)))
		positions = append(positions, p[:]...)
	}
	return &mesh.Mesh{Positions: positions, Triangles: m.Triangles}
}

// Scale is m with all lengths times factor.
func Scale(m *mesh.Mesh, factor float64) *mesh.Mesh { return Stretch(m, factor, factor, factor) }

// Stretch is m with each axis scaled by itself: a sphere becomes an ellipsoid.
func Stretch(m *mesh.Mesh, x, y, z float64) *mesh.Mesh {
	return Map(m, func(p [3]float64) [3]float64 { return [3]float64{x * p[0], y * p[1], z * p[2]} })
}

// Translate is m moved by d.
func Translate(m *mesh.Mesh, d [3]float64) *mesh.Mesh {
	return Map(m, func(p [3]float64) [3]float64 { return [3]float64{p[0] + d[0], p[1] + d[1], p[2] + d[2]} })
}

// Rotate is m turned about the axis through the origin by angle (radians).
func Rotate(m *mesh.Mesh, axis [3]float64, angle float64) *mesh.Mesh {
	r := math.Sqrt(dot(axis, axis))
	k := [3]float64{axis[0] / r, axis[1] / r, axis[2] / r}
	sin, cos := math.Sincos(angle)
	return Map(m, func(p [3]float64) [3]float64 { // Rodrigues' formula
		c, d := cross(k, p), (1-cos)*dot(k, p)
		return [3]float64{
			cos*p[0] + sin*c[0] + d*k[0],
			cos*p[1] + sin*c[1] + d*k[1],
			cos*p[2] + sin*c[2] + d*k[2],
		}
	})
}

// Renumber is m with vertex v called perm[v]; perm is a permutation.
func Renumber(m *mesh.Mesh, perm []int32) *mesh.Mesh {
	positions := make([]float64, len(m.Positions))
	for v, to := range perm {
		copy(positions[3*to:3*to+3], m.Positions[3*v:3*v+3])
	}
	triangles := make([]int32, len(m.Triangles))
	for h, v := range m.Triangles {
		triangles[h] = perm[v]
	}
	return &mesh.Mesh{Positions: positions, Triangles: triangles}
}

// Permutation is a random one of 0 to n-1.
func Permutation(n int, seed uint64) []int32 {
	perm := make([]int32, n)
	for i, v := range rand.New(rand.NewPCG(seed, 0x7065726d)).Perm(n) {
		perm[i] = int32(v)
	}
	return perm
}

// Shuffle is m with its triangles in random order, each begun at a random corner.
func Shuffle(m *mesh.Mesh, seed uint64) *mesh.Mesh {
	rng := rand.New(rand.NewPCG(seed, 0x73687566))
	triangles := make([]int32, 0, len(m.Triangles))
	for _, f := range rng.Perm(m.NumTriangles()) {
		k := rng.IntN(3)
		for c := range 3 {
			triangles = append(triangles, m.Triangles[3*f+(k+c)%3])
		}
	}
	return &mesh.Mesh{Positions: m.Positions, Triangles: triangles}
}

// Reverse is m with a random fraction of its triangles turned round.
func Reverse(m *mesh.Mesh, fraction float64, seed uint64) *mesh.Mesh {
	rng := rand.New(rand.NewPCG(seed, 0x72657665))
	triangles := append([]int32(nil), m.Triangles...)
	for f := 0; f < len(triangles); f += 3 {
		if rng.Float64() < fraction {
			triangles[f+1], triangles[f+2] = triangles[f+2], triangles[f+1]
		}
	}
	return &mesh.Mesh{Positions: m.Positions, Triangles: triangles}
}

// Join is all the meshes as one, each with vertices of its own.
func Join(meshes ...*mesh.Mesh) *mesh.Mesh {
	b := newBuilder(0, 0)
	for _, m := range meshes {
		first := int32(len(b.positions) / 3)
		b.positions = append(b.positions, m.Positions...)
		for _, v := range m.Triangles {
			b.triangles = append(b.triangles, first+v)
		}
	}
	return b.mesh()
}

// Soup is m with a vertex of its own for every corner, as an STL file holds it.
func Soup(m *mesh.Mesh) *mesh.Mesh {
	b := newBuilder(0, 0)
	for _, v := range m.Triangles {
		b.triangles = append(b.triangles, b.vertex(position(m, v)))
	}
	return b.mesh()
}
