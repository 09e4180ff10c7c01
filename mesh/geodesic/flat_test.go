package geodesic_test

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// Every surface here is flat away from its vertices, so round-off is the only error
// allowed: the line crosses some tens to hundreds of triangles, each good to a few ulps.
const rounding = 1e-12

// testdata/reference/distance_box.csv: unfolding in rational arithmetic. How finely
// and how crookedly the faces are cut must not matter.
func TestBoxes(t *testing.T) {
	rows := table(t, "distance_box.csv")
	for _, cut := range []struct {
		name   string
		step   float64 // edge of the grid, as a share of the smallest side; 0: 12 triangles
		jitter float64
		flat   float64 // cells are so many times longer one way
	}{
		{"twelve-triangles", 0, 0, 1},
		{"regular", 0.5, 0, 1},
		{"random", 0.5, 0.24, 1},
		{"fine", 0.125, 0.2, 1},
		{"slivers", 1, 0.2, 40},
	} {
		t.Run(cut.name, func(t *testing.T) {
			solvers := map[[3]float64]*geodesic.Solver{}
			meshes := map[[3]float64]*mesh.Mesh{}
			for i, row := range rows {
				size := point(t, row, "a", "b", "c")
				if solvers[size] == nil {
					least := min(size[0], size[1], size[2])
					var cuts [3]int
					for k := range cuts {
						cuts[k] = 1
						if cut.step > 0 {
							cuts[k] = int(math.Round(size[k] / least / cut.step))
						}
					}
					cuts[0] *= int(cut.flat)
					meshes[size] = meshtest.Box(size[0], size[1], size[2], cuts, cut.jitter, 7)
					solvers[size] = geodesic.NewSolver(meshes[size])
				}
				m := meshes[size]
				from, to := at(t, m, point(t, row, "x1", "y1", "z1")), at(t, m, point(t, row, "x2", "y2", "z2"))
				want := number(t, row["distance"])
				near(t, fmt.Sprintf("row %d there", i), between(t, solvers[size], from, to), want, rounding)
				near(t, fmt.Sprintf("row %d back", i), between(t, solvers[size], to, from), want, rounding)
			}
		})
	}
}

// testdata/reference/distance_platonic.csv: unfolding, and for the tetrahedron the plane
// modulo half-turns.
func TestTetrahedronAndOctahedron(t *testing.T) {
	for _, cuts := range []int{0, 2} {
		solids := map[string]*mesh.Mesh{"tetrahedron": meshtest.Tetrahedron(cuts), "octahedron": meshtest.Octahedron(cuts)}
		corners := map[string]*mesh.Mesh{"tetrahedron": meshtest.Tetrahedron(0), "octahedron": meshtest.Octahedron(0)}
		for i, row := range table(t, "distance_platonic.csv") {
			m := solids[row["solid"]]
			whole := corners[row["solid"]]
			place := func(face, bary string) mesh.Datum {
				var p [3]float64
				names, weights := strings.Split(face, "-"), strings.Fields(bary)
				for k := range 3 {
					v, err := strconv.Atoi(names[k])
					if err != nil {
						t.Fatal(err)
					}
					w := number(t, weights[k])
					if w == 0.3333333333 { // the table prints ten digits
						w = 1.0 / 3
					}
					for axis := range 3 {
						p[axis] += w * whole.Positions[3*v+axis]
					}
				}
				return at(t, m, p)
			}
			s := geodesic.NewSolver(m)
			got := between(t, s, place(row["face1"], row["bary1"]), place(row["face2"], row["bary2"]))
			near(t, fmt.Sprintf("%s cut %d times, row %d", row["solid"], cuts, i), got, number(t, row["distance"]), rounding)
		}
	}
}

// testdata/reference/distance_fan.csv: a straight line, or the way through the hub; the
// rows with more than a full turn need the hub to send the wave out anew.
func TestFans(t *testing.T) {
	slants := []float64{0.5, 1, 1.5, 2}
	for i, row := range table(t, "distance_fan.csv") {
		n := int(number(t, row["n_triangles"]))
		total := number(t, row["total_angle_deg"])
		if total > 360 && n%2 == 1 {
			continue // has no embedding by alternating spokes
		}
		m := meshtest.Fan(n, number(t, row["face_angle_deg"])*math.Pi/180, slants)
		spoke := func(slant, spoke string) mesh.Datum {
			k := int(math.Round(number(t, slant)/0.5)) - 1
			return mesh.AtVertex(int32(1 + int(number(t, spoke))*len(slants) + k))
		}
		got := between(t, geodesic.NewSolver(m), spoke(row["slant1"], row["spoke1"]), spoke(row["slant2"], row["spoke2"]))
		near(t, fmt.Sprintf("row %d", i), got, number(t, row["distance"]), rounding)
	}
}

// A hub that is all but flat must not be taken for flat: chords of the developed
// sectors, either way round, to points inside the triangles. Positions carry the hub's
// angle to some 1e-15.
func TestFansAllButFlat(t *testing.T) {
	slants := []float64{0.25, 0.5, 1, 1.5}
	for _, missing := range []float64{1e-3, 1e-6, 1e-8, 1e-10, 1e-12, -1e-3, -1e-6, -1e-8, -1e-10} {
		for _, n := range []int{12, 13} { // a spoke or a sector across from the source
			if missing < 0 && n%2 == 1 {
				continue // has no embedding by alternating spokes
			}
			angle := (2*math.Pi - missing) / float64(n)
			m := meshtest.Fan(n, angle, slants)
			w, err := geodesic.NewSolver(m).Spread(t.Context(), []mesh.Datum{mesh.AtVertex(3)}, geodesic.Options{Keep: true}) // slant 1 on spoke 0
			if err != nil {
				t.Fatal(err)
			}
			for f := range int32(m.NumTriangles()) {
				// The sector's first spoke, or its last where the numbers go round.
				var spokes []int
				for _, v := range m.Triangles[3*f : 3*f+3] {
					if v > 0 {
						spokes = append(spokes, int(v-1)/len(slants))
					}
				}
				spoke := slices.Min(spokes)
				if slices.Max(spokes) == n-1 && spoke == 0 {
					spoke = n - 1
				}
				for _, weights := range [][3]float64{{1. / 3, 1. / 3, 1. / 3}, {0.1, 0.2, 0.7}, {0.2, 0.7, 0.1}, {0.7, 0.1, 0.2}} {
					p := mesh.Point{Triangle: f, Weights: weights}
					hub, rim := [3]float64(m.Positions), [3]float64(m.Positions[3+3*len(slants)*spoke:])
					arm, along := minus(m.Position(p), hub), minus(rim, hub)
					slant, across := math.Sqrt(dot(arm, arm)), cross(arm, along)
					beta := angle*float64(spoke) + math.Atan2(math.Sqrt(dot(across, across)), dot(arm, along))
					beta = min(beta, angle*float64(n)-beta)
					want := 1 + slant
					if beta < math.Pi {
						want = math.Sqrt(1 + slant*slant - 2*slant*math.Cos(beta))
					}
					if got := w.At(p); math.Abs(got-want) > rounding {
						t.Fatalf("%d sectors, %g short of a full turn, triangle %d, %v: got %.17g, want %.17g",
							n, missing, f, weights, got, want)
					}
				}
			}
		}
	}
}

// testdata/reference/distance_plate.csv: visibility graphs. Slit tips and notches are
// vertices of the boundary at which the line bends.
func TestPlatesWithNotchAndSlit(t *testing.T) {
	for _, jitter := range []float64{0, 0.2} {
		plates := map[string]*mesh.Mesh{
			"L-plate":               meshtest.LPlate(8, jitter, 3),
			"edge-slit plate":       meshtest.SlitPlate(8, 1, 2, jitter, 3),
			"edge-slit plate, lips": meshtest.SlitPlate(8, 1, 2, jitter, 3),
			"inner-slit plate":      meshtest.SlitPlate(8, 0.5, 1.5, jitter, 3),
		}
		for i, row := range table(t, "distance_plate.csv") {
			m := plates[row["plate"]]
			place := func(x, y string) mesh.Datum {
				p := [3]float64{0, number(t, y), 0}
				if lip := strings.TrimRight(x, "+-"); lip != x { // one of two vertices in one place
					p[0] = number(t, lip)
					var copies []int32
					for v := range m.NumVertices() {
						if gap(m.Positions[3*v:], p[:]) < 1e-12 {
							copies = append(copies, int32(v))
						}
					}
					if len(copies) != 2 {
						t.Fatalf("want two vertices at %v, got %v", p, copies)
					}
					if strings.HasSuffix(x, "+") {
						return mesh.AtVertex(copies[1])
					}
					return mesh.AtVertex(copies[0])
				}
				p[0] = number(t, x)
				return at(t, m, p)
			}
			got := between(t, geodesic.NewSolver(m), place(row["x1"], row["y1"]), place(row["x2"], row["y2"]))
			near(t, fmt.Sprintf("%s, row %d, jitter %g", row["plate"], i, jitter), got, number(t, row["distance"]), rounding)
		}
	}
}

// testdata/reference/distance_prism.csv: a prism's side unrolled.
func TestPrisms(t *testing.T) {
	for i, row := range table(t, "distance_prism.csv") {
		radius, n := number(t, row["R"]), int(number(t, row["n_sides"]))
		dz := number(t, row["dz"])
		sin, cos := math.Sincos(2 * math.Pi * number(t, row["k_sides_apart"]) / float64(n))
		for _, jitter := range []float64{0, 0.2} {
			m := meshtest.Cylinder(radius, max(dz, 1), n, 6, jitter, 5)
			from, to := at(t, m, [3]float64{radius, 0, 0}), at(t, m, [3]float64{radius * cos, radius * sin, dz})
			near(t, fmt.Sprintf("row %d, jitter %g", i, jitter), between(t, geodesic.NewSolver(m), from, to),
				number(t, row["distance_on_mesh"]), rounding)
		}
	}
}
