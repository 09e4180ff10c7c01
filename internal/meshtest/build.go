package meshtest

import (
	"math/rand/v2"

	"heatskin/mesh"
)

// builder gathers a mesh, vertex by vertex and triangle by triangle.
type builder struct {
	positions []float64
	triangles []int32
	rng       *rand.Rand // nil: regular
	jitter    float64
}

func newBuilder(jitter float64, seed uint64) *builder {
	b := &builder{jitter: jitter}
	if jitter > 0 {
		b.rng = rand.New(rand.NewPCG(seed, 0x6d657368))
	}
	return b
}

func (b *builder) vertex(p [3]float64) int32 {
	b.positions = append(b.positions, p[:]...)
	return int32(len(b.positions)/3 - 1)
}

func (b *builder) triangle(u, v, w int32) { b.triangles = append(b.triangles, u, v, w) }

// quad adds u, v, w, x in circular order, cut along u-w or, at random, along v-x.
func (b *builder) quad(u, v, w, x int32) {
	if b.rng != nil && b.rng.IntN(2) == 1 {
		u, v, w, x = v, w, x, u
	}
	b.triangle(u, v, w)
	b.triangle(u, w, x)
}

// shift is a random offset in units of the edge, 0 on regular meshes.
func (b *builder) shift() float64 {
	if b.rng == nil {
		return 0
	}
	return b.jitter * (2*b.rng.Float64() - 1)
}

func (b *builder) mesh() *mesh.Mesh {
	m, err := mesh.New(b.positions, b.triangles)
	if err != nil {
		panic("meshtest: a maker built a broken mesh: " + err.Error())
	}
	return m
}

// grid adds an n by m grid of quads over (i, j), 0 <= i <= n, 0 <= j <= m; where a
// direction wraps, its last row is its first. at places the vertex of real (i, j).
// Vertices on a rim keep to it: they are shifted along it if slide, else not at all.
func (b *builder) grid(n, m int, wrapI, wrapJ, slide bool, at func(i, j float64) [3]float64) {
	rows, columns := n+1, m+1
	if wrapI {
		rows = n
	}
	if wrapJ {
		columns = m
	}
	first := int32(len(b.positions) / 3)
	for i := range rows {
		for j := range columns {
			di, dj := b.shift(), b.shift()
			rimI, rimJ := !wrapI && (i == 0 || i == n), !wrapJ && (j == 0 || j == m)
			if rimI || rimJ && !slide {
				di = 0
			}
			if rimJ || rimI && !slide {
				dj = 0
			}
			b.vertex(at(float64(i)+di, float64(j)+dj))
		}
	}
	number := func(i, j int) int32 { return first + int32(i%rows*columns+j%columns) }
	for i := range n {
		for j := range m {
			b.quad(number(i, j), number(i+1, j), number(i+1, j+1), number(i, j+1))
		}
	}
}
