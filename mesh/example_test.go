package mesh_test

import (
	"context"
	"fmt"
	"log"
	"math"
	"os"
	"path/filepath"

	"heatskin/mesh"
)

// ring is a square frame, 3 by 3 with a hole of 1 by 1, bent up along x = 2.
func ring() *mesh.Mesh {
	m, err := mesh.New(
		[]float64{
			0, 0, 0, 1, 0, 0, 2, 0, 0, 2, 0, 1,
			0, 1, 0, 1, 1, 0, 2, 1, 0, 2, 1, 1,
			0, 2, 0, 1, 2, 0, 2, 2, 0, 2, 2, 1,
			0, 3, 0, 1, 3, 0, 2, 3, 0, 2, 3, 1,
		},
		[]int32{
			0, 1, 5, 0, 5, 4, 1, 2, 6, 1, 6, 5, 2, 3, 7, 2, 7, 6,
			4, 5, 9, 4, 9, 8, 6, 7, 11, 6, 11, 10,
			8, 9, 13, 8, 13, 12, 9, 10, 14, 9, 14, 13, 10, 11, 15, 10, 15, 14,
		})
	if err != nil {
		log.Fatal(err)
	}
	return m
}

func ExampleLoad() {
	folder, err := os.MkdirTemp("", "heatskin")
	if err != nil {
		log.Fatal(err)
	}
	defer os.RemoveAll(folder)
	name := filepath.Join(folder, "corner.stl")
	const text = `solid corner
facet normal 0 0 1
 outer loop
  vertex 0 0 0
  vertex 1 0 0
  vertex 0 1 0
 endloop
endfacet
facet normal 1 0 0
 outer loop
  vertex 0 0 0
  vertex 0 1 0
  vertex 0 0 1
 endloop
endfacet
endsolid corner
`
	if err := os.WriteFile(name, []byte(text), 0o600); err != nil {
		log.Fatal(err)
	}
	m, err := mesh.Load(context.Background(), name, nil, mesh.LoadOptions{Weld: math.NaN()})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Println(m.NumVertices(), m.Triangles, m.File.Format)
	// Output: 4 [0 1 2 0 2 3] stl
}

func ExampleMesh_Weld() {
	m := &mesh.Mesh{
		Positions: []float64{0, 0, 0, 1, 0, 0, 0, 1, 0, 1, 0, 1e-4, 1, 1, 0, 0, 1, 0},
		Triangles: []int32{0, 1, 2, 3, 4, 5},
	}
	fmt.Println(m.Weld(0).Triangles)
	fmt.Println(m.Weld(0.001).Triangles)
	// Output:
	// [0 1 2 3 4 2]
	// [0 1 2 1 3 2]
}

func ExampleCheck() {
	r := mesh.Check(ring())
	fmt.Println(r.EulerCharacteristic, *r.Genus, r.Area)
	fmt.Println(r.Verdict)
	// Output:
	// 0 0 8
	// fit for distance and for heat
}

func ExampleBoundaryLoops() {
	for k, loop := range mesh.BoundaryLoops(ring()) {
		fmt.Println(k, loop.Length, loop.Vertices)
	}
	// Output:
	// 0 12 [0 1 2 3 7 11 15 14 13 12 8 4]
	// 1 4 [5 9 10 6]
}

func ExampleCreases() {
	fmt.Println(mesh.Creases(ring(), 45))
	// Output: [[2 6] [10 14]]
}

func ExampleLocator_Nearest() {
	m := ring()
	at, gap := mesh.NewLocator(m).Nearest([3]float64{0.25, 0.5, 2})
	fmt.Println(at.Triangle, m.Position(at), gap)
	// Output: 1 [0.25 0.5 0] 2
}

func ExampleRefine() {
	m := ring()
	fine, err := mesh.Refine(context.Background(), m, 0.25, 1000)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%v %.6g\n", mesh.Check(fine).EdgeLength.Max <= 0.25, mesh.Check(fine).Area)
	_, err = mesh.Refine(context.Background(), m, 0.25, 50)
	fmt.Println(err)
	// Output:
	// true 8
	// edges of at most 0.25 need about 300 more vertices; the budget is 50 (allow longer edges)
}
