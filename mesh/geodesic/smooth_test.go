package geodesic_test

import (
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// A mesh inscribed in a smooth surface gives its distances with an error of second
// order: half the edge, a quarter of the error.

// testdata/reference/distance_sphere.csv has the same closed form.
func TestSphereIsSecondOrder(t *testing.T) {
	last := 0.0
	for _, n := range []int{12, 24, 48, 96} {
		m := meshtest.SphereGrid(n)
		s := geodesic.NewSolver(m)
		sum := 0.0
		for _, source := range []int{0, 1 + (n/3-1)*2*n} {
			w, err := s.Spread(t.Context(), []mesh.Datum{mesh.AtVertex(int32(source))}, geodesic.Options{})
			if err != nil {
				t.Fatal(err)
			}
			a := [3]float64(m.Positions[3*source:])
			for v, d := range w.Distances {
				b := [3]float64(m.Positions[3*v:])
				c := cross(a, b)
				sum += math.Abs(d-math.Atan2(math.Sqrt(dot(c, c)), dot(a, b))) / float64(2*len(w.Distances))
			}
		}
		// 4 in the limit; the coarsest pair gives 3.9.
		if last > 0 && !(last/sum > 3.8 && last/sum < 4.2) {
			t.Errorf("%d rows: mean error %g after %g", n, sum, last)
		}
		last = sum
	}
	if last > 2e-4 {
		t.Errorf("mean error %g at 96 rows", last)
	}
}

// testdata/reference/distance_ellipsoid_unit.csv: Bessel's integrals for half-axes 1, 1, b.
func TestEllipsoidsAreSecondOrder(t *testing.T) {
	rows := table(t, "distance_ellipsoid_unit.csv")
	last := 0.0
	for _, n := range []int{24, 48, 96} {
		solvers := map[float64]*geodesic.Solver{}
		sum := 0.0
		for _, row := range rows {
			b := number(t, row["b"])
			if solvers[b] == nil {
				solvers[b] = geodesic.NewSolver(meshtest.Stretch(meshtest.SphereGrid(n), 1, 1, b))
			}
			vertex := func(latitude, longitude float64) mesh.Datum {
				i := int(math.Round((90 - latitude) / 180 * float64(n)))
				j := int(math.Round(longitude / 180 * float64(n)))
				switch i {
				case 0:
					return mesh.AtVertex(0)
				case n:
					return mesh.AtVertex(int32(1 + (n-1)*2*n))
				}
				return mesh.AtVertex(int32(1 + (i-1)*2*n + j%(2*n)))
			}
			got := between(t, solvers[b], vertex(number(t, row["reduced_lat1_deg"]), 0),
				vertex(number(t, row["reduced_lat2_deg"]), number(t, row["dlon_deg"])))
			want := number(t, row["distance"])
			sum += math.Abs(got-want) / want / float64(len(rows))
		}
		// 4 in the limit.
		if last > 0 && !(last/sum > 3.6 && last/sum < 4.4) {
			t.Errorf("%d rows: mean error %g after %g", n, sum, last)
		}
		last = sum
	}
	if last > 4e-4 {
		t.Errorf("mean error %g at 96 rows", last)
	}
}

// testdata/reference/distance_ellipsoid_earth.csv: lines published by Vincenty (1975) and
// Karney (2013), and others by the same integrals. Each row has a mesh whose rows and
// columns run through its two points.
func TestEarthIsSecondOrder(t *testing.T) {
	last := 0.0
	for _, n := range []int{16, 32, 64} {
		sum, rows := 0.0, 0
		for i, row := range table(t, "distance_ellipsoid_earth.csv") {
			want := number(t, row["distance_over_a"])
			if want < 0.1 {
				continue // five metres: within one triangle
			}
			m, from, to := earth(t, n, row)
			got := between(t, geodesic.NewSolver(m), from, to)
			if math.Abs(got-want) > 20/float64(n*n)*want { // edges are up to twice pi/n
				t.Errorf("%d rows, line %d: got %g, want %g", n, i, got, want)
			}
			sum += math.Abs(got-want) / want
			rows++
		}
		sum /= float64(rows)
		if last > 0 && !(last/sum > 3.5 && last/sum < 4.5) {
			t.Errorf("%d rows: mean error %g after %g", n, sum, last)
		}
		last = sum
	}
}

// earth is an ellipsoid with half-axis 1 and the flattening of row, n rows of triangles
// from pole to pole, and its vertices at the row's two places.
func earth(t *testing.T, n int, row map[string]string) (m *mesh.Mesh, from, to mesh.Datum) {
	f := 1 / number(t, row["inverse_flattening"])
	reduced := func(latitude string) float64 {
		phi := number(t, latitude) * math.Pi / 180
		return math.Atan2((1-f)*math.Sin(phi), math.Cos(phi))
	}
	// Colatitudes and the longitude, and the row and column of a regular grid nearest to
	// each, which are moved there.
	c1, c2 := math.Pi/2-reduced(row["lat1_deg"]), math.Pi/2-reduced(row["lat2_deg"])
	lon := number(t, row["dlon_deg"]) * math.Pi / 180
	step := math.Pi / float64(n)
	r1, r2 := math.Round(c1/step), math.Round(c2/step)
	if r1 == r2 && c1 != c2 {
		if c1 < c2 {
			r2++
		} else {
			r1++
		}
	}
	column := math.Round(lon / step)
	m = meshtest.Map(meshtest.SphereGrid(n), func(p [3]float64) [3]float64 {
		colatitude := math.Atan2(math.Hypot(p[0], p[1]), p[2])
		longitude := math.Atan2(p[1], p[0])
		if longitude < -step/2 {
			longitude += 2 * math.Pi
		}
		colatitude = bend(colatitude, [][2]float64{{0, 0}, {min(r1, r2) * step, min(c1, c2)}, {max(r1, r2) * step, max(c1, c2)}, {math.Pi, math.Pi}})
		longitude = bend(longitude, [][2]float64{{0, 0}, {column * step, lon}, {2 * math.Pi, 2 * math.Pi}})
		sinC, cosC := math.Sincos(colatitude)
		sinL, cosL := math.Sincos(longitude)
		return [3]float64{sinC * cosL, sinC * sinL, (1 - f) * cosC}
	})
	vertex := func(r, c float64) mesh.Datum {
		switch int(r) {
		case 0:
			return mesh.AtVertex(0)
		case n:
			return mesh.AtVertex(int32(m.NumVertices() - 1))
		}
		return mesh.AtVertex(int32(1 + (int(r)-1)*2*n + int(c)%(2*n)))
	}
	return m, vertex(r1, 0), vertex(r2, column)
}

// bend is the broken line through the knots at x.
func bend(x float64, knots [][2]float64) float64 {
	for i := 1; i < len(knots); i++ {
		a, b := knots[i-1], knots[i]
		if x <= b[0]+1e-9 && b[0] > a[0] {
			return a[1] + (x-a[0])*(b[1]-a[1])/(b[0]-a[0])
		}
	}
	return x
}
