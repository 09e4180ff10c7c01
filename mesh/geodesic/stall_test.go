package geodesic

import (
	"errors"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// A wave that crosses halfedges and comes no farther is given up. No mesh known does
// that, so patience is cut to nothing, and all edges of a rim are left at once.
func TestStall(t *testing.T) {
	m := meshtest.Plate(1, 1, 10, 10, 0, 0) // vertex 11i+j at (i, j)/10
	var rim [][2]int32
	for i := range int32(10) {
		rim = append(rim, [2]int32{11 * i, 11*i + 11})
	}
	for _, patience := range []int{5, 40} { // the rim has 10 halfedges
		v, err := NewSolver(m).start([]mesh.Datum{mesh.AtEdges(rim)}, Options{}, false)
		if err != nil {
			t.Fatal(err)
		}
		v.patience = patience
		var stall *StallError
		if err = v.run(t.Context()); errors.As(err, &stall) != (patience == 5) {
			t.Errorf("patience %d: got %v", patience, err)
		}
	}
}
