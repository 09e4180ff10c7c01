package kernel

import (
	"context"
	"fmt"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// square is a mesh of [-half, half]² in n × n cells, none like another where shaken.
func square(half float64, n int, jitter float64) *mesh.Mesh {
	return meshtest.Map(meshtest.Plate(2*half, 2*half, n, n, jitter, 7), func(p [3]float64) [3]float64 {
		return [3]float64{p[0] - half, p[1] - half, 0}
	})
}

// onChart gives m the metric g11, g12, g22 of each place.
func onChart(t testing.TB, m *mesh.Mesh, g func(x, y float64) (g11, g12, g22 float64)) *mesh.Mesh {
	t.Helper()
	values := make([]float64, len(m.Positions))
	for v := range m.NumVertices() {
		values[3*v], values[3*v+1], values[3*v+2] = g(m.Positions[3*v], m.Positions[3*v+1])
	}
	var err error
	if m.Metric, err = mesh.NewChartMetric(m, values); err != nil {
		t.Fatal(err)
	}
	return m
}

type tensorKind func(m *mesh.Mesh, direction, along, across []float64) (*mesh.Metric, error)

// withFibres gives every triangle the same diffusivities along and across a direction.
func withFibres(t testing.TB, m *mesh.Mesh, kind tensorKind, along, across float64, direction func(f int) [3]float64) *mesh.Mesh {
	t.Helper()
	n := m.NumTriangles()
	way, a, b := make([]float64, 3*n), make([]float64, n), make([]float64, n)
	for f := range n {
		d := direction(f)
		copy(way[3*f:], d[:])
		a[f], b[f] = along, across
	}
	var err error
	if m.Metric, err = kind(m, way, a, b); err != nil {
		t.Fatal(err)
	}
	return m
}

// helix is the direction in a face round the z axis that climbs by angle.
func helix(m *mesh.Mesh, angle float64) func(f int) [3]float64 {
	return func(f int) [3]float64 {
		sum := [2]float64{}
		for _, v := range m.Triangles[3*f : 3*f+3] {
			sum[0], sum[1] = sum[0]+m.Positions[3*v], sum[1]+m.Positions[3*v+1]
		}
		size := math.Hypot(sum[0], sum[1])
		c := math.Cos(angle) / size
		return [3]float64{-c * sum[1], c * sum[0], math.Sin(angle)}
	}
}

// stretched is the heat kernel of the plane for a tensor: with x, y along and across the
// fibres it is that of the plane stretched by 1/√along and 1/√across.
func stretched(along, across, angle, t, dx, dy float64) float64 {
	sin, cos := math.Sincos(angle)
	p, q := dx*cos+dy*sin, dy*cos-dx*sin
	return math.Exp(-(p*p/along+q*q/across)/(4*t)) / (4 * math.Pi * t * math.Sqrt(along*across))
}

// testdata/reference/distance_anisotropic.csv: √(v·D⁻¹v), exact on any flat mesh, whether
// D is given as a tensor or D⁻¹ as a metric.
func TestDistanceTableAnisotropic(t *testing.T) {
	t.Parallel()
	for i, row := range readTable(t, "distance_anisotropic.csv").rows {
		d11, d12, d22 := number(t, row, "D11"), number(t, row, "D12"), number(t, row, "D22")
		to := [3]float64{number(t, row, "vx") / 2, number(t, row, "vy") / 2, 0}
		from := [3]float64{-to[0], -to[1], 0}
		mean, half := (d11+d22)/2, math.Hypot((d11-d22)/2, d12)
		sin, cos := math.Sincos(math.Atan2(2*d12, d11-d22) / 2)
		det := d11*d22 - d12*d12
		for name, m := range map[string]*mesh.Mesh{
			"tensor": withFibres(t, square(6, 9, 0.3), mesh.NewArrivalMetric, mean+half, mean-half, func(int) [3]float64 { return [3]float64{cos, sin, 0.5} }),
			"metric": onChart(t, square(6, 9, 0.3), func(_, _ float64) (float64, float64, float64) { return d22 / det, -d12 / det, d11 / det }),
		} {
			exact(t, m, []question{pair(m, fmt.Sprintf("row %d, %s", i, name), from, to, number(t, row, "distance"))})
		}
	}
}

// A prism of n sides wound at 30 degrees, unrolled: a flat strip with fibres at 30 degrees.
// The distance is the least over the images of the source in neighbouring strips.
func TestDistanceOnWoundCylinder(t *testing.T) {
	const n, along, across, angle = 24, 10.0, 1.0, 30 * degree
	width := 2 * n * math.Sin(math.Pi/n)
	m := meshtest.Cylinder(1, 12, n, 30, 0, 1)
	// The middle of a triangle is a sixth of a side off the middle of its side: the direction
	// there, projected, is less steep by this.
	seen := math.Atan2(math.Sin(angle), math.Cos(angle)*math.Cos(offMiddle(n)))
	withFibres(t, m, mesh.NewArrivalMetric, along, across, helix(m, angle))
	from := nearestTo(m, [3]float64{1, 0, 6})
	got := field(t, m, mesh.AtVertex(int32(from)))
	sin, cos := math.Sincos(seen)
	p := spot(m, from)
	for v, d := range got {
		q := spot(m, v)
		if math.Abs(q[2]-p[2]) > 2 { // farther off, lines would leave the strip at its ends
			continue
		}
		turn := math.Atan2(q[1], q[0]) - math.Atan2(p[1], p[0])
		want := math.Inf(1)
		for image := -8; image <= 8; image++ {
			x, y := width*(turn/(2*math.Pi)+float64(image)), q[2]-p[2]
			want = min(want, math.Hypot((x*cos+y*sin)/math.Sqrt(along), (y*cos-x*sin)/math.Sqrt(across)))
		}
		if math.Abs(d-want) > flatTol*(1+want) {
			t.Fatalf("vertex %d at height %g: got %.15g, want %.15g", v, q[2]-p[2], d, want)
		}
	}
}

// offMiddle is the angle, seen from the axis of a prism of n sides, between the middle
// of a triangle with two corners on one of its upright edges and one on the next, and the
// middle of the side.
func offMiddle(n float64) float64 {
	return math.Atan(math.Tan(math.Pi/n) / 3)
}

// The kernels of a sheet and of a wound cylinder with D = 10 along the fibres and 1
// across, at angles that the mesh knows nothing of: the stretched plane's, and the sum of
// its images on the unrolled strip, with second order.
func TestFibreKernels(t *testing.T) {
	const along, across, time = 10.0, 1.0, 0.01
	const reach = 2 // the plane's kernel is 5e-5 of its peak there, at most
	for _, degrees := range []float64{17, 63, 140} {
		angle := degrees * degree
		sin, cos := math.Sincos(angle)
		secondOrder(t, fmt.Sprintf("sheet at %g degrees", degrees), []int{32, 64, 128}, 0.02, time, func(n int) (*mesh.Mesh, int, func(v int) float64) {
			m := square(reach, n, 0)
			withFibres(t, m, mesh.NewTensorMetric, along, across, func(int) [3]float64 { return [3]float64{cos, sin, 0} })
			return m, nearestTo(m, [3]float64{}), func(v int) float64 {
				return stretched(along, across, angle, time, m.Positions[3*v], m.Positions[3*v+1])
			}
		})
	}
	const angle = 30 * degree
	secondOrder(t, "cylinder", []int{32, 64, 128}, 0.02, time, func(n int) (*mesh.Mesh, int, func(v int) float64) {
		m := meshtest.Cylinder(1, 4, n, n*5/8, 0, 1)
		withFibres(t, m, mesh.NewTensorMetric, along, across, helix(m, angle))
		from := nearestTo(m, [3]float64{1, 0, 2})
		p := spot(m, from)
		return m, from, func(v int) float64 {
			q, sum := spot(m, v), 0.0
			for image := -3; image <= 3; image++ {
				turn := math.Atan2(q[1], q[0]) - math.Atan2(p[1], p[0]) + 2*math.Pi*float64(image)
				sum += stretched(along, across, angle, time, turn, q[2]-p[2])
			}
			return sum
		}
	})
}

func nearestTo(m *mesh.Mesh, p [3]float64) int {
	best := 0
	for v := range m.NumVertices() {
		if apart3(spot(m, v), p) < apart3(spot(m, best), p) {
			best = v
		}
	}
	return best
}

// secondOrder holds a kernel on three meshes against its values, in parts of the largest:
// the error falls like h² and is at most most on the finest.
func secondOrder(t *testing.T, name string, sizes []int, most, time float64, make func(n int) (m *mesh.Mesh, from int, want func(v int) float64)) {
	t.Helper()
	var errs []float64
	for _, n := range sizes {
		m, from, want := make(n)
		s := solverFor(t, m, Options{})
		r, err := s.HeatKernels(context.Background(), at(s.surface.NumVertices, from), []float64{time}, HeatOptions{})
		if err != nil {
			t.Fatal(err)
		}
		worst, peak := 0.0, 0.0
		for v := range m.NumVertices() {
			worst = max(worst, math.Abs(r.Fields[0][v]-want(v)))
			peak = max(peak, want(v))
		}
		errs = append(errs, worst/peak)
		if r.Lowest[0] < -1e-8*r.Largest[0] { // the tolerance in time
			t.Errorf("%s, n = %d: values fall to %.3g of %.3g", name, n, r.Lowest[0], r.Largest[0])
		}
	}
	order := rate(sizes[1:], errs[1:])
	t.Logf("%s: errors %.3g of the peak, order %.2f", name, errs, order)
	if math.Abs(order-2) > 0.25 { // the next term shows
		t.Errorf("%s: order %.2f from errors %.3g", name, order, errs)
	}
	if last := errs[len(errs)-1]; last > most {
		t.Errorf("%s: error %.3g of the peak, want at most %g", name, last, most)
	}
}

func hyperbolic(x, y float64) (float64, float64, float64) {
	r := 1 - x*x - y*y
	return 4 / (r * r), 0, 4 / (r * r)
}

// testdata/reference/distance_hyperbolic.csv: the closed form in the unit disc.
func TestDistanceTableHyperbolic(t *testing.T) {
	refinement{n: []int{40, 80, 160}, mean: 1e-4, most: 2e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := onChart(t, meshtest.Scale(meshtest.Disc(n), 0.85), hyperbolic)
		var questions []question
		for i, row := range readTable(t, "distance_hyperbolic.csv").rows {
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), numbers(t, row, "x1 y1"), numbers(t, row, "x2 y2"), number(t, row, "distance")))
		}
		return m, questions
	}}.test(t)
}

// testdata/reference/kernel_hyperbolic.csv: McKean's integral, on rings of the hyperbolic
// disc of radius 3; beyond it are 7e-11 of the kernel at t = 0.1.
func TestHyperbolicKernel(t *testing.T) {
	const radius, time = 3.0, 0.1
	values := map[float64]float64{} // by distance
	for _, row := range readTable(t, "kernel_hyperbolic.csv").rows {
		if number(t, row, "t") == time {
			values[number(t, row, "r")] = number(t, row, "value")
		}
	}
	var errs []float64
	sizes := []int{24, 48, 96}
	for _, n := range sizes {
		disc := meshtest.Disc(n)
		m := onChart(t, meshtest.Map(disc, func(p [3]float64) [3]float64 {
			r := math.Hypot(p[0], p[1])
			if r == 0 {
				return p
			}
			k := math.Tanh(radius*r/2) / r
			return [3]float64{k * p[0], k * p[1], 0}
		}), hyperbolic)
		s := solverFor(t, m, Options{})
		res, err := s.HeatKernels(context.Background(), at(s.surface.NumVertices, 0), []float64{time}, HeatOptions{})
		if err != nil {
			t.Fatal(err)
		}
		worst, compared := 0.0, 0
		for v := range m.NumVertices() {
			r := radius * math.Hypot(disc.Positions[3*v], disc.Positions[3*v+1])
			want, listed := values[math.Round(4*r)/4]
			if listed && math.Abs(r-math.Round(4*r)/4) < 1e-9 {
				compared++
				worst = max(worst, math.Abs(res.Fields[0][v]-want))
			}
		}
		if compared < 12 {
			t.Fatalf("n = %d: only %d values compared", n, compared)
		}
		errs = append(errs, worst/values[0])
	}
	order := rate(sizes, errs)
	t.Logf("errors %.3g of the peak, order %.2f", errs, order)
	if math.Abs(order-2) > 0.25 || errs[2] > 0.01 {
		t.Errorf("errors %.3g of the peak fall with order %.2f", errs, order)
	}
}

func paraboloid(x, y float64) (float64, float64, float64) { return 1 + 4*x*x, 4 * x * y, 1 + 4*y*y }

// testdata/reference/distance_paraboloid.csv and distance_paraboloid_meridian.csv, asked
// of the flat chart with the paraboloid's metric.
func TestDistanceTableParaboloidByMetric(t *testing.T) {
	refinement{n: []int{40, 80, 160}, mean: 2e-4, most: 5e-4, order: 1.5, questions: func(n int) (*mesh.Mesh, []question) {
		m := onChart(t, square(2, n, 0), paraboloid)
		var questions []question
		for i, row := range readTable(t, "distance_paraboloid.csv").rows {
			questions = append(questions, pair(m, fmt.Sprintf("row %d", i), numbers(t, row, "x1 y1"), numbers(t, row, "x2 y2"), number(t, row, "distance")))
		}
		for i, row := range readTable(t, "distance_paraboloid_meridian.csv").rows {
			questions = append(questions, pair(m, fmt.Sprintf("meridian %d", i), [3]float64{}, [3]float64{number(t, row, "r"), 0, 0}, number(t, row, "arc_length")))
		}
		return m, questions
	}}.test(t)
}

// The kernel by the paraboloid's metric and that on its mesh in space tend to each other
// with second order.
func TestParaboloidByMetricAgreesWithItsMesh(t *testing.T) {
	const time = 0.05
	secondOrder(t, "paraboloid", []int{20, 40, 80}, 0.002, time, func(n int) (*mesh.Mesh, int, func(v int) float64) {
		solid := meshtest.Paraboloid(1, n, 0, 1)
		from := nearestTo(solid, [3]float64{0.5, 0, 0.25})
		s := solverFor(t, solid, Options{})
		r, err := s.HeatKernels(context.Background(), at(s.surface.NumVertices, from), []float64{time}, HeatOptions{})
		if err != nil {
			t.Fatal(err)
		}
		chart := onChart(t, meshtest.Map(solid, func(p [3]float64) [3]float64 { return [3]float64{p[0], p[1], 0} }), paraboloid)
		return chart, from, func(v int) float64 { return r.Fields[0][v] }
	})
}

// Two layers in series between ends held at 0 and 1: linear in each, with the same flux.
// The field is piecewise linear and the elements are exact for it, whether the layers are
// isotropic, D = 1 and 25, or plies that cross, with D = 10 along and then across the way.
func TestLayersInSeries(t *testing.T) {
	for _, tc := range []struct {
		name          string
		along, across [2]float64 // of the layers, along y and along x
	}{
		{"isotropic", [2]float64{1, 25}, [2]float64{1, 25}},
		{"plies", [2]float64{1, 10}, [2]float64{10, 1}},
	} {
		m := meshtest.Plate(2, 1, 8, 4, 0, 1)
		n := m.NumTriangles()
		way, along, across := make([]float64, 3*n), make([]float64, n), make([]float64, n)
		for f := range n {
			x := 0.0
			for _, v := range m.Triangles[3*f : 3*f+3] {
				x += m.Positions[3*v] / 3
			}
			layer := 0
			if x > 1 {
				layer = 1
			}
			way[3*f+1], along[f], across[f] = 1, tc.along[layer], tc.across[layer]
		}
		var err error
		if m.Metric, err = mesh.NewTensorMetric(m, way, along, across); err != nil {
			t.Fatal(err)
		}
		s := solverFor(t, m, Options{})
		hold := make([]float64, s.surface.NumVertices)
		for v := range hold {
			hold[v] = math.NaN()
			if v < m.NumVertices() && (m.Positions[3*v] == 0 || m.Positions[3*v] == 2) {
				hold[v] = m.Positions[3*v] / 2
			}
		}
		u, _, err := s.Steady(context.Background(), &Problem{Diffusivity: 1, Hold: hold})
		if err != nil {
			t.Fatal(err)
		}
		flux := 1 / (1/tc.across[0] + 1/tc.across[1])
		for v := range m.NumVertices() {
			x := m.Positions[3*v]
			want := flux * x / tc.across[0]
			if x > 1 {
				want = flux * (1/tc.across[0] + (x-1)/tc.across[1])
			}
			if math.Abs(u[v]-want) > 1e-12 { // some ulps for each of 45 unknowns
				t.Errorf("%s, x = %g: got %.15g, want %.15g", tc.name, x, u[v], want)
			}
		}
	}
}

// Fibres that run round the origin, 10 along and 1 across: r^s cos θ with s = √10 is
// steady (by hand, in polar coordinates). Every triangle takes the direction at its middle,
// so that neighbours never agree on the edge between them, on a shaken mesh.
func TestFibresThatTurn(t *testing.T) {
	const along, across = 10.0, 1.0
	var errs []float64
	sizes := []int{16, 32, 64}
	for _, n := range sizes {
		m := meshtest.Translate(meshtest.Plate(1, 1, n, n, 0.25, 3), [3]float64{1, 0.5, 0})
		withFibres(t, m, mesh.NewTensorMetric, along, across, helix(m, 0))
		s := solverFor(t, m, Options{})
		want := func(v int) float64 {
			x, y := m.Positions[3*v], m.Positions[3*v+1]
			return math.Pow(math.Hypot(x, y), math.Sqrt(along/across)) * math.Cos(math.Atan2(y, x))
		}
		hold := make([]float64, s.surface.NumVertices)
		largest := 0.0
		for v := range hold {
			hold[v] = math.NaN()
			if v >= m.NumVertices() {
				continue
			}
			if x, y := m.Positions[3*v], m.Positions[3*v+1]; x == 1 || x == 2 || y == 0.5 || y == 1.5 {
				hold[v] = want(v)
				largest = max(largest, math.Abs(hold[v]))
			}
		}
		u, _, err := s.Steady(context.Background(), &Problem{Diffusivity: 1, Hold: hold})
		if err != nil {
			t.Fatal(err)
		}
		worst := 0.0
		for v := range m.NumVertices() {
			worst = max(worst, math.Abs(u[v]-want(v)))
		}
		errs = append(errs, worst/largest)
	}
	t.Logf("errors %.3g of the largest value, order %.2f", errs, rate(sizes, errs))
	// First order, not reached yet where 2 % of an edge are in dispute, as at n = 16.
	if last := math.Log2(errs[1] / errs[2]); last < 0.8 || errs[2] > 0.0025 {
		t.Errorf("errors %.3g of the largest value, order %.2f at last", errs, last)
	}
}
