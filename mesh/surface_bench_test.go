package mesh_test

import (
	"math/rand/v2"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// scattered is a sphere of 163 842 jittered vertices whose triangles come in random
// order and whose vertices are numbered as the triangles name them, as in an STL file
// that a parallel exporter wrote: the worst case for the memory's caches.
func scattered() *mesh.Mesh {
	m := meshtest.Icosphere(7, 0.25, 1)
	order := rand.New(rand.NewPCG(3, 4)).Perm(m.NumTriangles())
	number := make(map[int32]int32, m.NumVertices())
	s := &mesh.Mesh{}
	for _, f := range order {
		for _, v := range m.Triangles[3*f : 3*f+3] {
			if _, known := number[v]; !known {
				number[v] = int32(len(number))
				s.Positions = append(s.Positions, m.Positions[3*v:3*v+3]...)
			}
			s.Triangles = append(s.Triangles, number[v])
		}
	}
	return s
}

func BenchmarkSurface(b *testing.B) {
	m := scattered()
	must := func(s *mesh.Surface, err error) *mesh.Surface {
		if err != nil {
			b.Fatal(err)
		}
		return s
	}
	b.Run("NewSurface", func(b *testing.B) {
		for b.Loop() {
			must(mesh.NewSurface(m))
		}
	})
	b.Run("Delaunay", func(b *testing.B) {
		for b.Loop() {
			b.StopTimer()
			s := must(mesh.NewSurface(m))
			b.StartTimer()
			s.Delaunay(1000)
		}
	})
	s := must(mesh.NewSurface(m))
	s.Delaunay(1000)
	b.Run("Renumbered", func(b *testing.B) {
		for b.Loop() {
			s.Renumbered()
		}
	})
	s, _ = s.Renumbered()
	b.Run("Laplacian", func(b *testing.B) {
		for b.Loop() {
			s.Laplacian()
		}
	})
	b.Run("LumpedMass", func(b *testing.B) {
		for b.Loop() {
			s.LumpedMass()
		}
	})
	b.Run("Components", func(b *testing.B) {
		for b.Loop() {
			s.Components()
		}
	})
}
