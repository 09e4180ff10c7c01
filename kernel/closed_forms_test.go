package kernel

import (
	"context"
	"fmt"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// Heat kernels on domains with closed forms (tables: series against images, 20 digits),
// insulated and held. For each time and source the largest error over the table's
// points, relative to the largest value, falls with second order in h.
func TestKernelClosedForms(t *testing.T) {
	for _, tc := range []struct {
		table, edge, column string // rows whose column has the value edge
		meshes              []*mesh.Mesh
		times               []float64
		rim                 func(x, y, z float64) bool
		find                func(m *mesh.Mesh, row map[string]string) place
		bound               float64
	}{
		{"kernel_square.csv", "insulated", "edge", plates(16, 32, 64), []float64{0.05, 0.1, 0.5}, nil, inSquare(t), 2e-3},
		{"kernel_square.csv", "held", "edge", plates(16, 32, 64), []float64{0.05, 0.1}, func(x, y, _ float64) bool { return x == 0 || y == 0 || x == 1 || y == 1 }, inSquare(t), 5e-3},
		{"kernel_cylinder_finite.csv", "insulated", "rims", tubes(32, 64, 128), []float64{0.1, 0.5, 1}, nil, onTube(t), 3e-3},
		{"kernel_cylinder_finite.csv", "held", "rims", tubes(32, 64, 128), []float64{0.1, 0.5}, func(_, _, z float64) bool { return z == 0 || z == 2 }, onTube(t), 5e-3},
		{"kernel_disc.csv", "insulated", "edge", discs(16, 32, 64), []float64{0.05}, nil, inDisc(t), 5e-3},
		{"kernel_disc.csv", "held", "edge", discs(16, 32, 64), []float64{0.05, 0.1}, func(x, y, _ float64) bool { return math.Hypot(x, y) > 1-1e-9 }, inDisc(t), 5e-3},
	} {
		rows := readTable(t, tc.table).rows
		errs := map[string][]float64{}
		for _, m := range tc.meshes {
			s := solverFor(t, m, Options{})
			n := len(s.lumped)
			var edge []int32
			if tc.rim != nil {
				edge = vertices(m, tc.rim)
			}
			fields := map[int][][]float64{} // by source vertex
			worst, peak := map[string]float64{}, map[string]float64{}
			for _, row := range rows {
				k := index(tc.times, number(t, row, "t"))
				if row[tc.column] != tc.edge || k < 0 {
					continue
				}
				p := tc.find(m, row)
				if fields[p.source] == nil {
					r, err := s.Diffuse(context.Background(), &Problem{Load: at(n, p.source), Hold: held(n, 0, edge)}, tc.times, FlowOptions{})
					if err != nil {
						t.Fatal(err)
					}
					fields[p.source] = r.Fields
					if tc.rim == nil { // insulated: both engines
						h, err := s.HeatKernels(context.Background(), at(n, p.source), tc.times, HeatOptions{})
						if err != nil {
							t.Fatal(err)
						}
						for i := range tc.times {
							if d := maxDiff(h.Fields[i], r.Fields[i]); d > 2e-8*h.Largest[i] {
								t.Errorf("%s %s t=%g: HeatKernels and Diffuse differ by %g", tc.table, tc.edge, tc.times[i], d)
							}
						}
					}
				}
				key := fmt.Sprintf("%s %s t=%g from %s", tc.table, tc.edge, tc.times[k], row["x0"]+row["z0"]+row["r0"])
				want := number(t, row, "value")
				worst[key] = max(worst[key], math.Abs(fields[p.source][k][p.at]-want))
				peak[key] = max(peak[key], want)
			}
			if len(worst) == 0 {
				t.Fatalf("%s %s: no rows", tc.table, tc.edge)
			}
			for key := range worst {
				errs[key] = append(errs[key], worst[key]/peak[key])
			}
		}
		for key, e := range errs {
			checkOrder(t, key, e, tc.bound)
		}
	}
}

// A place is a table row's source and the vertex at which it gives the value.
type place struct{ source, at int }

func index(list []float64, x float64) int {
	for i, y := range list {
		if x == y {
			return i
		}
	}
	return -1
}

func inSquare(t *testing.T) func(*mesh.Mesh, map[string]string) place {
	return func(m *mesh.Mesh, row map[string]string) place {
		return place{
			nearest(m, number(t, row, "x0"), number(t, row, "y0"), 0),
			nearest(m, number(t, row, "x"), number(t, row, "y"), 0),
		}
	}
}

func onTube(t *testing.T) func(*mesh.Mesh, map[string]string) place {
	return func(m *mesh.Mesh, row map[string]string) place {
		sin, cos := math.Sincos(number(t, row, "theta"))
		return place{
			nearest(m, 1, 0, number(t, row, "z0")),
			nearest(m, cos, sin, number(t, row, "z")),
		}
	}
}

func inDisc(t *testing.T) func(*mesh.Mesh, map[string]string) place {
	return func(m *mesh.Mesh, row map[string]string) place {
		sin, cos := math.Sincos(number(t, row, "theta"))
		r := number(t, row, "r")
		return place{
			nearest(m, number(t, row, "r0"), 0, 0),
			nearest(m, r*cos, r*sin, 0),
		}
	}
}

func tubes(sizes ...int) []*mesh.Mesh {
	var all []*mesh.Mesh
	for _, n := range sizes {
		all = append(all, meshtest.Cylinder(1, 2, n, n/2, 0, 0))
	}
	return all
}

func discs(sizes ...int) []*mesh.Mesh {
	var all []*mesh.Mesh
	for _, n := range sizes {
		all = append(all, meshtest.Disc(n))
	}
	return all
}
