package kernel

import (
	"context"
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// A question asks for one distance of a reference table.
type question struct {
	name     string
	from, to mesh.Datum
	want     float64
}

// pair is the question between the places of m nearest to p and q.
func pair(m *mesh.Mesh, name string, p, q [3]float64, want float64) question {
	l := mesh.NewLocator(m)
	a, _ := l.Nearest(p)
	b, _ := l.Nearest(q)
	return question{name, mesh.AtPoint(a), mesh.AtPoint(b), want}
}

// answers are the relative errors of all questions on one mesh, from each end.
func answers(t testing.TB, m *mesh.Mesh, questions []question) []float64 {
	t.Helper()
	var data []mesh.Datum
	for _, q := range questions {
		data = append(data, q.from, q.to)
	}
	s, v := placed(t, m, data...)
	from := map[int32][]float64{}
	misses := make([]float64, len(questions))
	for i, q := range questions {
		at := s.Site(2 * i)
		if from[at] == nil {
			from[at] = ask(t, v, []int{2 * i})
		}
		got := from[at][s.Site(2*i+1)]
		misses[i] = math.Abs(got-q.want) / max(q.want, 1e-12)
		if math.IsNaN(got) || math.IsInf(got, 0) {
			t.Errorf("%s: got %v, want %v", q.name, got, q.want)
		}
	}
	return misses
}

func exact(t *testing.T, m *mesh.Mesh, questions []question) {
	t.Helper()
	for i, e := range answers(t, m, questions) {
		if q := questions[i]; !(e <= flatTol) {
			t.Errorf("%s: off by %.3g relative from %.17g", q.name, e, q.want)
		}
	}
}

func numbers(t *testing.T, row map[string]string, columns string) (p [3]float64) {
	t.Helper()
	for i, c := range strings.Fields(columns) {
		p[i] = number(t, row, c)
	}
	return p
}

// testdata/reference/distance_box.csv: unfolding in rational arithmetic; among them
// Dudeney's room (Weekly Dispatch, 14 June 1903), where the shortest line of 40 crosses
// five faces, and Kotani's farthest point of the 1 x 1 x 2 box.
func TestDistanceTableBox(t *testing.T) {
	for _, cut := range []struct {
		name   string
		step   float64 // of the grid, as a share of the smallest side
		jitter float64
		flat   int // cells are so many times shorter along x
	}{
		{"regular", 0.125, 0, 1},
		{"random", 0.125, 0.24, 1},
		{"slivers", 0.25, 0.2, 20},
	} {
		t.Run(cut.name, func(t *testing.T) {
			t.Parallel()
			meshes := map[[3]float64]*mesh.Mesh{}
			questions := map[[3]float64][]question{}
			for i, row := range readTable(t, "distance_box.csv").rows {
				size := numbers(t, row, "a b c")
				m := meshes[size]
				if m == nil {
					var cuts [3]int
					for k := range cuts {
						cuts[k] = int(math.Round(size[k] / min(size[0], size[1], size[2]) / cut.step))
					}
					cuts[0] *= cut.flat
					m = meshtest.Box(size[0], size[1], size[2], cuts, cut.jitter, 7)
					meshes[size] = m
				}
				questions[size] = append(questions[size], pair(m, fmt.Sprintf("row %d", i),
					numbers(t, row, "x1 y1 z1"), numbers(t, row, "x2 y2 z2"), number(t, row, "distance")))
			}
			for size, m := range meshes {
				exact(t, m, questions[size])
			}
		})
	}
}

// testdata/reference/distance_platonic.csv: unfolding, and for the tetrahedron the plane
// modulo half-turns.
func TestDistanceTablePlatonic(t *testing.T) {
	t.Parallel()
	corners := map[string]*mesh.Mesh{"tetrahedron": meshtest.Tetrahedron(0), "octahedron": meshtest.Octahedron(0)}
	fine := map[string]*mesh.Mesh{"tetrahedron": meshtest.Tetrahedron(4), "octahedron": meshtest.Octahedron(4)}
	questions := map[string][]question{}
	for i, row := range readTable(t, "distance_platonic.csv").rows {
		solid := row["solid"]
		place := func(face, bary string) (p [3]float64) {
			weights := strings.Fields(row[bary])
			for k, name := range strings.Split(row[face], "-") {
				v, err := strconv.Atoi(name)
				if err != nil {
					t.Fatal(err)
				}
				w, err := strconv.ParseFloat(weights[k], 64)
				if err != nil {
					t.Fatal(err)
				}
				if weights[k] == "0.3333333333" { // the table prints ten digits
					w = 1.0 / 3
				}
				for axis, x := range spot(corners[solid], v) {
					p[axis] += w * x
				}
			}
			return p
		}
		questions[solid] = append(questions[solid], pair(fine[solid], fmt.Sprintf("%s, row %d", solid, i),
			place("face1", "bary1"), place("face2", "bary2"), number(t, row, "distance")))
	}
	for solid, m := range fine {
		exact(t, m, questions[solid])
	}
}

// testdata/reference/distance_fan.csv: a straight line, or the way through the hub. In
// the rows with more than a full turn the hub is a saddle that sends the front out anew.
func TestDistanceTableFan(t *testing.T) {
	t.Parallel()
	const rings = 20
	saddles := 0
	for i, row := range readTable(t, "distance_fan.csv").rows {
		n, total := integer(t, row, "n_triangles"), number(t, row, "total_angle_deg")
		if total > 360 && n%2 == 1 {
			continue // no embedding by spokes that go up and down in turn
		}
		if total > 360 {
			saddles++
		}
		var slants []float64
		for k := range rings {
			slants = append(slants, 2*float64(k+1)/rings)
		}
		m := meshtest.Fan(n, number(t, row, "face_angle_deg")*degree, slants)
		spoke := func(slant, spoke string) mesh.Datum {
			k := int(math.Round(number(t, row, slant)*rings/2)) - 1
			return mesh.AtVertex(int32(1 + integer(t, row, spoke)*rings + k))
		}
		exact(t, m, []question{{fmt.Sprintf("row %d", i), spoke("slant1", "spoke1"), spoke("slant2", "spoke2"), number(t, row, "distance")}})
	}
	if saddles < 4 {
		t.Errorf("the table had %d saddles, want 4 or more", saddles)
	}
}

// testdata/reference/distance_plate.csv: visibility graphs. Slit tips and notches are
// vertices of the rim at which the line bends.
func TestDistanceTablePlate(t *testing.T) {
	for _, jitter := range []float64{0, 0.24} {
		t.Run(fmt.Sprintf("jitter=%g", jitter), func(t *testing.T) {
			t.Parallel()
			plates := map[string]*mesh.Mesh{
				"L-plate":               meshtest.LPlate(16, jitter, 3),
				"edge-slit plate":       meshtest.SlitPlate(16, 1, 2, jitter, 3),
				"edge-slit plate, lips": meshtest.SlitPlate(16, 1, 2, jitter, 3),
				"inner-slit plate":      meshtest.SlitPlate(16, 0.5, 1.5, jitter, 3),
			}
			questions := map[string][]question{}
			for i, row := range readTable(t, "distance_plate.csv").rows {
				m := plates[row["plate"]]
				place := func(x, y string) mesh.Datum {
					lip := strings.TrimRight(row[x], "+-")
					px, err := strconv.ParseFloat(lip, 64)
					if err != nil {
						t.Fatal(err)
					}
					p := [3]float64{px, number(t, row, y), 0}
					if lip == row[x] {
						at, _ := mesh.NewLocator(m).Nearest(p)
						return mesh.AtPoint(at)
					}
					var lips []int32 // left, right
					for v := range m.NumVertices() {
						if apart3(spot(m, v), p) < 1e-12 {
							lips = append(lips, int32(v))
						}
					}
					if len(lips) != 2 {
						t.Fatalf("want two vertices at %v, got %v", p, lips)
					}
					if strings.HasSuffix(row[x], "+") {
						return mesh.AtVertex(lips[1])
					}
					return mesh.AtVertex(lips[0])
				}
				questions[row["plate"]] = append(questions[row["plate"]], question{fmt.Sprintf("%s, row %d", row["plate"], i),
					place("x1", "y1"), place("x2", "y2"), number(t, row, "distance")})
			}
			for plate, m := range plates {
				exact(t, m, questions[plate])
			}
		})
	}
}

// testdata/reference/distance_prism.csv: a prism's side unrolled.
func TestDistanceTablePrism(t *testing.T) {
	t.Parallel()
	for i, row := range readTable(t, "distance_prism.csv").rows {
		n, k := integer(t, row, "n_sides"), integer(t, row, "k_sides_apart")
		radius, dz := number(t, row, "R"), number(t, row, "dz")
		for _, jitter := range []float64{0, 0.2} {
			height := max(dz, 0.5)
			m := meshtest.Cylinder(radius, height, n, 24, jitter, 5)
			sin, cos := math.Sincos(2 * math.Pi * float64(k) / float64(n))
			exact(t, m, []question{pair(m, fmt.Sprintf("row %d, jitter %g", i, jitter),
				[3]float64{radius, 0, 0}, [3]float64{radius * cos, radius * sin, dz}, number(t, row, "distance_on_mesh"))})
		}
	}
}

// Smooth tables: the mesh is inscribed in the curved surface and the error has to fall
// faster than h. Each is asked on three meshes. The bounds on the finest are two or three
// times what the chords of its triangles explain, (π/n)²/6 or so: little room is left
// for the front.

// rate is the order in h of the errors on meshes of n cells a side: the slope of the
// line through them on doubly logarithmic paper.
func rate(n []int, e []float64) float64 {
	var sx, sy, sxx, sxy float64
	for i := range n {
		x, y := -math.Log(float64(n[i])), math.Log(e[i])
		sx, sy, sxx, sxy = sx+x, sy+y, sxx+x*x, sxy+x*y
	}
	c := float64(len(n))
	return (c*sxy - sx*sy) / (c*sxx - sx*sx)
}

// A refinement is a table asked on finer and finer meshes.
type refinement struct {
	n         []int // cells a side
	mean      float64
	most      float64 // bounds on the finest mesh
	order     float64 // least order of the mean
	questions func(n int) (*mesh.Mesh, []question)
}

// test holds the front and exact propagation over the same triangles to the table: on
// these meshes both are off by the chords, and hardly by more.
func (r refinement) test(t *testing.T) {
	t.Helper()
	t.Parallel()
	r.hold(t, "front", answers)
	if m, _ := r.questions(r.n[0]); m.Metric == nil { // else positions do not tell lengths
		r.hold(t, "exact propagation", exactAnswers)
	}
}

func (r refinement) hold(t *testing.T, method string, answers func(testing.TB, *mesh.Mesh, []question) []float64) {
	t.Helper()
	var means []float64
	var last []float64
	var asked []question
	for _, n := range r.n {
		m, questions := r.questions(n)
		last, asked = answers(t, m, questions), questions
		sum := 0.0
		for _, e := range last {
			sum += e
		}
		means = append(means, sum/float64(len(last)))
	}
	order := math.Inf(1)
	if means[0] > flatTol { // else the line runs over flat faces alone
		order = rate(r.n, means)
	}
	t.Logf("%s: mean %.3g, order %.2f", method, means, order)
	for i, e := range last {
		t.Logf("%s: %s: off by %.3g of %.6g", method, asked[i].name, e, asked[i].want)
		if !(e <= r.most) {
			t.Errorf("%s: %s: off by %.3g of %.6g, want at most %g", method, asked[i].name, e, asked[i].want, r.most)
		}
	}
	if got := means[len(means)-1]; !(got <= r.mean) {
		t.Errorf("%s: mean error %.3g, want at most %g", method, got, r.mean)
	}
	if !(order >= r.order) {
		t.Errorf("%s: errors fall with order %.2f in h, want at least %g", method, order, r.order)
	}
}

// exactAnswers are the answers of exact propagation; each wave ends at its target.
func exactAnswers(t testing.TB, m *mesh.Mesh, questions []question) []float64 {
	t.Helper()
	g := geodesic.NewSolver(m)
	misses := make([]float64, len(questions))
	for i, q := range questions {
		wave, err := g.Spread(context.Background(), []mesh.Datum{q.from}, geodesic.Options{Targets: []mesh.Datum{q.to}, TargetsOnly: true})
		if err != nil {
			t.Fatal(err)
		}
		misses[i] = math.Abs(wave.Targets[0]-q.want) / max(q.want, 1e-12)
	}
	return misses
}

// testdata/reference/distance_sphere.csv: great circles. The rows between points 0.001
// degrees from a pole lie inside one triangle.
func TestDistanceTableSphere(t *testing.T) {
	refinement{n: []int{36, 72, 144}, mean: 1e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := meshtest.SphereGrid(n)
		var questions []question
		for i, row := range readTable(t, "distance_sphere.csv").rows {
			radius := number(t, row, "R")
			if number(t, row, "distance") == 0 || radius != 1 {
				continue
			}
			at := func(theta, phi string) [3]float64 {
				sinT, cosT := math.Sincos(number(t, row, theta) * degree)
				sinP, cosP := math.Sincos(number(t, row, phi) * degree)
				return [3]float64{sinT * cosP, sinT * sinP, cosT}
			}
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), at("theta1_deg", "phi1_deg"), at("theta2_deg", "phi2_deg"), number(t, row, "distance")))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/distance_cylinder.csv: the side unrolled.
func TestDistanceTableCylinder(t *testing.T) {
	refinement{n: []int{36, 72, 144}, mean: 1e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := meshtest.Cylinder(1, 4, n, n/2, 0, 1)
		var questions []question
		for i, row := range readTable(t, "distance_cylinder.csv").rows {
			radius := number(t, row, "R")
			at := func(z, phi string) [3]float64 {
				sin, cos := math.Sincos(number(t, row, phi) * degree)
				return [3]float64{cos, sin, number(t, row, z) / radius}
			}
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), at("z1", "phi1_deg"), at("z2", "phi2_deg"), number(t, row, "distance")/radius))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/distance_can.csv: round the side or over the cap, whichever is
// shorter.
func TestDistanceTableCan(t *testing.T) {
	refinement{n: []int{48, 96, 192}, mean: 1e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := meshtest.Can(1, 2, n, n/3, n/6)
		var questions []question
		for i, row := range readTable(t, "distance_can.csv").rows {
			sin, cos := math.Sincos(number(t, row, "dphi_deg") * degree)
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), [3]float64{1, 0, number(t, row, "z1")},
				[3]float64{cos, sin, number(t, row, "z2")}, number(t, row, "distance")))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/distance_cone.csv: the cone unrolled. The apex is a vertex of the
// mesh that no shortest line passes.
func TestDistanceTableCone(t *testing.T) {
	for i, row := range readTable(t, "distance_cone.csv").rows {
		alpha := number(t, row, "half_angle_deg") * degree
		outer := max(number(t, row, "slant1"), number(t, row, "slant2"))
		t.Run(fmt.Sprintf("row=%d", i), func(t *testing.T) {
			refinement{n: []int{36, 72, 144}, mean: 2e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
				m := meshtest.Cone(alpha, 1.5*outer, n, n/2)
				return m, coneQuestion(t, m, row, alpha, -1) // Cone's tip is up
			}}.test(t)
		})
	}
}

// testdata/reference/distance_frustum.csv: the cone unrolled, without its tip. Lines bend
// round the inner rim, whose vertices send the front out anew.
func TestDistanceTableFrustum(t *testing.T) {
	for i, row := range readTable(t, "distance_frustum.csv").rows {
		alpha := number(t, row, "half_angle_deg") * degree
		inner, outer := number(t, row, "slant_inner_rim"), max(number(t, row, "slant1"), number(t, row, "slant2"))
		t.Run(fmt.Sprintf("row=%d", i), func(t *testing.T) {
			refinement{n: []int{36, 72, 144}, mean: 3e-4, most: 3e-4, order: 1, questions: func(n int) (*mesh.Mesh, []question) {
				m := meshtest.Frustum(alpha, inner, 1.25*outer, n, n/2)
				return m, coneQuestion(t, m, row, alpha, 1)
			}}.test(t)
		})
	}
}

func coneQuestion(t *testing.T, m *mesh.Mesh, row map[string]string, alpha, up float64) []question {
	sinA, cosA := math.Sincos(alpha)
	at := func(slant, phi float64) [3]float64 {
		sin, cos := math.Sincos(phi)
		return [3]float64{slant * sinA * cos, slant * sinA * sin, up * slant * cosA}
	}
	return []question{pair(m, "distance", at(number(t, row, "slant1"), 0),
		at(number(t, row, "slant2"), number(t, row, "dphi_deg")*degree), number(t, row, "distance"))}
}

// testdata/reference/distance_paraboloid.csv: Clairaut integrals. Row 6, from (1, 0) to
// (-1, 0), passes round the bottom: 2.829 and not 2 s(1) = 2.958.
func TestDistanceTableParaboloid(t *testing.T) {
	refinement{n: []int{40, 80, 160}, mean: 5e-5, most: 1e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := meshtest.Paraboloid(1.25, n, 0, 1)
		var questions []question
		for i, row := range readTable(t, "distance_paraboloid.csv").rows {
			at := func(columns string) [3]float64 {
				p := numbers(t, row, columns)
				p[2] = p[0]*p[0] + p[1]*p[1]
				return p
			}
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), at("x1 y1"), at("x2 y2"), number(t, row, "distance")))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/distance_paraboloid_meridian.csv: arc length from the apex.
func TestDistanceTableParaboloidMeridian(t *testing.T) {
	refinement{n: []int{40, 80, 160}, mean: 1e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := meshtest.Paraboloid(2, n, 0, 1)
		var questions []question
		for i, row := range readTable(t, "distance_paraboloid_meridian.csv").rows {
			r := number(t, row, "r")
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), [3]float64{}, [3]float64{r, 0, r * r}, number(t, row, "arc_length")))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/distance_torus.csv: shooting along the geodesic equation.
func TestDistanceTableTorus(t *testing.T) {
	refinement{n: []int{72, 120, 240}, mean: 1e-4, most: 3e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := meshtest.Torus(2, 1, n, n/24*12, 0, 1)
		var questions []question
		for i, row := range readTable(t, "distance_torus.csv").rows {
			at := func(u, v string) [3]float64 {
				sinU, cosU := math.Sincos(number(t, row, u) * degree)
				sinV, cosV := math.Sincos(number(t, row, v) * degree)
				return [3]float64{(2 + cosV) * cosU, (2 + cosV) * sinU, sinV}
			}
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), at("u1_deg", "v1_deg"), at("u2_deg", "v2_deg"), number(t, row, "distance")))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/distance_ellipsoid_unit.csv: Bessel's auxiliary sphere, for
// half-axes 1, 1, 2/3 and 1, 1, 3/2.
func TestDistanceTableEllipsoid(t *testing.T) {
	for _, shape := range []string{"oblate", "prolate"} {
		t.Run(shape, func(t *testing.T) {
			refinement{n: []int{24, 48, 120}, mean: 1e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
				var m *mesh.Mesh
				var questions []question
				for i, row := range readTable(t, "distance_ellipsoid_unit.csv").rows {
					if !strings.HasPrefix(row["name"], shape) {
						continue
					}
					b := number(t, row, "b")
					if m == nil {
						m = meshtest.Stretch(meshtest.SphereGrid(n), 1, 1, b)
					}
					at := func(beta, lambda float64) [3]float64 {
						sinB, cosB := math.Sincos(beta * degree)
						sinL, cosL := math.Sincos(lambda * degree)
						return [3]float64{cosB * cosL, cosB * sinL, b * sinB}
					}
					questions = append(questions, pair(m, fmt.Sprintf("row %d", i), at(number(t, row, "reduced_lat1_deg"), 0),
						at(number(t, row, "reduced_lat2_deg"), number(t, row, "dlon_deg")), number(t, row, "distance")))
				}
				return m, questions
			}}.test(t)
		})
	}
}
