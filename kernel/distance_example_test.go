package kernel_test

import (
	"context"
	"fmt"
	"log"

	"heatskin/kernel"
	"heatskin/mesh"
)

// An insulating block of 30 x 12 x 12 mm carries a contact at each end, one millimetre
// below the top and one above the bottom. How long is the way along its skin? (H. E.
// Dudeney asked it of a spider and a fly in 1903: the line crosses five of the six
// faces, and is exactly 40.)
func ExampleSolver_Distance() {
	m, err := mesh.New(
		[]float64{0, 0, 0, 30, 0, 0, 30, 12, 0, 0, 12, 0, 0, 0, 12, 30, 0, 12, 30, 12, 12, 0, 12, 12},
		[]int32{0, 2, 1, 0, 3, 2, 4, 5, 6, 4, 6, 7, 0, 1, 5, 0, 5, 4, 1, 2, 6, 1, 6, 5, 2, 3, 7, 2, 7, 6, 3, 0, 4, 3, 4, 7})
	if err != nil {
		log.Fatal(err)
	}
	// Twelve triangles are too few to carry a front: cut them, the shape stays.
	if m, err = mesh.Refine(context.Background(), m, 1, 100000); err != nil {
		log.Fatal(err)
	}
	skin := mesh.NewLocator(m)
	live, _ := skin.Nearest([3]float64{0, 6, 11})
	earth, _ := skin.Nearest([3]float64{30, 6, 1})

	s, err := mesh.NewSurface(m)
	if err != nil {
		log.Fatal(err)
	}
	if err := s.Place([]mesh.Datum{mesh.AtPoint(live), mesh.AtPoint(earth)}); err != nil {
		log.Fatal(err)
	}
	s.Delaunay(1000)
	solver, err := kernel.NewSolver(context.Background(), s, kernel.Options{})
	if err != nil {
		log.Fatal(err)
	}
	// From the first datum, live, to everywhere.
	res, err := solver.Distance(context.Background(), []int{0}, kernel.DistanceOptions{})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("creepage %.6f mm\n", res.Distance[s.Site(1)])
	// Output: creepage 40.000000 mm
}
