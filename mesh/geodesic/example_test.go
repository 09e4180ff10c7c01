package geodesic_test

import (
	"context"
	"fmt"
	"log"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// A room of 30 by 12 by 12 feet: from near the ceiling in the middle of one end wall to
// near the floor in the middle of the other (Dudeney, Weekly Dispatch, 14 June 1903).
func ExamplePath() {
	room := meshtest.Box(30, 12, 12, [3]int{30, 12, 12}, 0, 0)
	locate := func(x, y, z float64) mesh.Datum {
		for v := range room.NumVertices() {
			if p := room.Positions[3*v : 3*v+3]; p[0] == x && p[1] == y && p[2] == z {
				return mesh.AtVertex(int32(v))
			}
		}
		panic("no vertex there")
	}
	line, err := geodesic.Path(context.Background(), room,
		[]mesh.Datum{locate(0, 6, 11)}, []mesh.Datum{locate(30, 6, 1)})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%.12f, equally short ones: %v\n", line.Length, line.Several)
	// Output:
	// 40.000000000000, equally short ones: true
}

// Every vertex's distance from the rim of an open tube, along the surface.
func ExampleField() {
	tube := meshtest.Cylinder(1, 2, 12, 4, 0, 0) // vertex 5i+j is at angle i and height j/2
	rim := mesh.Datum{Vertex: -1}
	for i := range int32(12) {
		rim.Edges = append(rim.Edges, [2]int32{5 * i, 5 * (i + 1) % 60})
	}
	d, err := geodesic.Field(context.Background(), tube, []mesh.Datum{rim}, geodesic.Options{})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%.3f\n", d[:5])
	// Output:
	// [0.000 0.500 1.000 1.500 2.000]
}

// One Solver serves many questions; a wave that is to stop early costs only what it
// runs over.
func ExampleSolver_Spread() {
	s := geodesic.NewSolver(meshtest.Octahedron(4)) // edge 1, tips are vertices 0 to 5
	from, to := []mesh.Datum{mesh.AtVertex(0)}, []mesh.Datum{mesh.AtVertex(1), mesh.AtVertex(2)}
	w, err := s.Spread(context.Background(), from, geodesic.Options{Targets: to})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("all: %.6f\n", w.Targets)
	if w, err = s.Spread(context.Background(), from, geodesic.Options{Targets: to, Any: true}); err != nil {
		log.Fatal(err)
	}
	fmt.Printf("the nearest: %.6f\n", w.Targets)
	// Output:
	// all: [1.732051 1.000000]
	// the nearest: [+Inf 1.000000]
}

// A wave that keeps its windows gives the distance of any point.
func ExampleWave_At() {
	s := geodesic.NewSolver(meshtest.Plate(1, 1, 1, 1, 0, 0)) // two triangles
	w, err := s.Spread(context.Background(), []mesh.Datum{mesh.AtVertex(0)}, geodesic.Options{Keep: true})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%.6f\n", w.At(mesh.Point{Triangle: 0, Weights: [3]float64{0.5, 0.25, 0.25}}))
	// Output:
	// 0.559017
}
