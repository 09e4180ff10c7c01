package kernel

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// vertices are those of m at which choose is true.
func vertices(m *mesh.Mesh, choose func(x, y, z float64) bool) []int32 {
	var set []int32
	for v := range m.NumVertices() {
		if choose(m.Positions[3*v], m.Positions[3*v+1], m.Positions[3*v+2]) {
			set = append(set, int32(v))
		}
	}
	return set
}

// nearest is the vertex of m nearest to a point.
func nearest(m *mesh.Mesh, x, y, z float64) int {
	best, least := -1, math.Inf(1)
	for v := range m.NumVertices() {
		d := math.Hypot(math.Hypot(m.Positions[3*v]-x, m.Positions[3*v+1]-y), m.Positions[3*v+2]-z)
		if d < least {
			best, least = v, d
		}
	}
	return best
}

// annulus has radii a and b, n columns and m rows whose radii grow geometrically.
func annulus(a, b float64, n, m int) *mesh.Mesh {
	return meshtest.Map(meshtest.Cylinder(1, 1, n, m, 0, 0), func(p [3]float64) [3]float64 {
		r := a * math.Pow(b/a, p[2])
		return [3]float64{r * p[0], r * p[1], 0}
	})
}

// checkOrder fails unless errors fall with about second order in h, which halves.
func checkOrder(t *testing.T, name string, errs []float64, bound float64) {
	t.Helper()
	for i := 1; i < len(errs); i++ {
		if order := math.Log2(errs[i-1] / errs[i]); order < 1.8 || order > 2.6 {
			t.Errorf("%s: order %.2f from errors %.3g", name, order, errs)
		}
	}
	if last := errs[len(errs)-1]; last > bound {
		t.Errorf("%s: error %.3g, want <= %.3g", name, last, bound)
	}
}

// The formula T = h1 h2 h3/(DH) on the equilateral triangle is a cubic that the
// regular subdivision reproduces: the table's values to rounding, at every vertex.
func TestPassageOnTriangleIsExact(t *testing.T) {
	const k = 8
	m := triangleGrid(k)
	rim := vertices(m, func(x, y, _ float64) bool {
		a, b, c := barycentric(x, y)
		return min(a, b, c) < 1e-9
	})
	s := solverFor(t, m, Options{})
	r, err := s.Passage(context.Background(), [][]int32{rim}, 1)
	if err != nil {
		t.Fatal(err)
	}
	height := math.Sqrt(3) / 2
	for v := range m.NumVertices() {
		a, b, c := barycentric(m.Positions[3*v], m.Positions[3*v+1])
		// heights of the point above the sides are the weights times the height
		if want := a * b * c * height * height; math.Abs(r.MeanTime[v]-want) > 1e-15 {
			t.Errorf("vertex %d: %.17g, want %.17g", v, r.MeanTime[v], want)
		}
	}
	// The table agrees with the formula.
	for _, row := range readTable(t, "passage_equilateral.csv").rows {
		if row["bary1"] == "1/3" && number(t, row, "side") == 1 {
			if want := number(t, row, "mean_exit_time"); math.Abs(height*height/27-want) > 1e-16 {
				t.Errorf("centre: formula %.17g, table %.17g", height*height/27, want)
			}
		}
	}
}

func triangleGrid(k int) *mesh.Mesh {
	m := &mesh.Mesh{}
	number := map[[2]int]int32{}
	for i := range k + 1 {
		for j := range k + 1 - i {
			number[[2]int{i, j}] = int32(m.NumVertices())
			m.Positions = append(m.Positions, (float64(i)+float64(j)/2)/float64(k), float64(j)*math.Sqrt(0.75)/float64(k), 0)
		}
	}
	for i := range k {
		for j := range k - i {
			m.Triangles = append(m.Triangles, number[[2]int{i, j}], number[[2]int{i + 1, j}], number[[2]int{i, j + 1}])
			if j < k-i-1 {
				m.Triangles = append(m.Triangles, number[[2]int{i + 1, j}], number[[2]int{i + 1, j + 1}], number[[2]int{i, j + 1}])
			}
		}
	}
	return m
}

func barycentric(x, y float64) (a, b, c float64) {
	c = y / math.Sqrt(0.75)
	b = x - c/2
	return 1 - b - c, b, c
}

// On a strip the formulas are parabolas, which a structured grid reproduces at its
// vertices, save that with a reflecting end the two corners there have a third more and
// a third less mass than a quarter of a cell: an area of h²/12 too much or too little,
// which is felt as some h³.
func TestPassageAcrossAStrip(t *testing.T) {
	rows := 0
	for _, row := range readTable(t, "passage_strip.csv").rows {
		length, x, d := number(t, row, "L"), number(t, row, "x"), number(t, row, "D")
		for _, width := range []float64{0.3, 1e-5} { // the latter's cells are 1:15000, and the long way is what counts
			m := meshtest.Plate(length, width, 40, 6, 0, 0)
			ends := vertices(m, func(x, _, _ float64) bool {
				return x == length || x == 0 && row["boundary"] == "both ends absorb"
			})
			v := nearest(m, x, 0, 0)
			if math.Abs(m.Positions[3*v]-x) > 1e-12 {
				continue
			}
			rows++
			r, err := solverFor(t, m, Options{}).Passage(context.Background(), [][]int32{ends}, d)
			if err != nil {
				t.Fatal(err)
			}
			// Condition 1e3. Edge lengths, which are all that the surface keeps, hold the
			// height of a cell of 1:15000 to 1e-7 only.
			tolerance := 1e-12
			if width < 1e-3 {
				tolerance = 1e-7
			}
			if row["boundary"] != "both ends absorb" {
				tolerance = 1e-4
			}
			if want := number(t, row, "mean_exit_time"); math.Abs(r.MeanTime[v]-want) > tolerance*want {
				t.Errorf("%s L=%g x=%g D=%g width %g: %.15g, want %.15g", row["boundary"], length, x, d, width, r.MeanTime[v], want)
			}
		}
	}
	if rows < 8 {
		t.Errorf("%d rows compared", rows)
	}
}

func TestPassageConverges(t *testing.T) {
	rim := func(m *mesh.Mesh, radius float64) []int32 {
		return vertices(m, func(x, y, _ float64) bool { return math.Abs(math.Hypot(x, y)-radius) < 1e-9 })
	}
	// Disc: T = (R² - r²)/(4D), the table's second row, r = 0.5. (At the hub, where the
	// rings' pattern has its one odd vertex, the error is h² log h: order 1.7.)
	want := number(t, readTable(t, "passage_disc.csv").rows[1], "mean_exit_time")
	var errs []float64
	for _, n := range []int{8, 16, 32} {
		m := meshtest.Disc(n)
		r, err := solverFor(t, m, Options{}).Passage(context.Background(), [][]int32{rim(m, 1)}, 1)
		if err != nil {
			t.Fatal(err)
		}
		errs = append(errs, math.Abs(r.MeanTime[nearest(m, 0.5, 0, 0)]-want)/want)
	}
	checkOrder(t, "disc", errs, 2e-3)

	// Rectangle, all edges absorb.
	row := readTable(t, "passage_rectangle.csv").rows[0]
	want, errs = number(t, row, "mean_exit_time"), nil
	for _, n := range []int{8, 16, 32} {
		m := meshtest.Plate(1, 1, n, n, 0, 0)
		edge := vertices(m, func(x, y, _ float64) bool { return x == 0 || y == 0 || x == 1 || y == 1 })
		r, err := solverFor(t, m, Options{}).Passage(context.Background(), [][]int32{edge}, 1)
		if err != nil {
			t.Fatal(err)
		}
		errs = append(errs, math.Abs(r.MeanTime[nearest(m, 0.5, 0.5, 0)]-want)/want)
	}
	checkOrder(t, "square", errs, 2e-3)

	// Annulus: three kinds of rim, and which rim comes first.
	for _, row := range readTable(t, "passage_annulus.csv").rows {
		a, b, radius, d := number(t, row, "a"), number(t, row, "b"), number(t, row, "r"), number(t, row, "D")
		if b/a > 3 {
			continue
		}
		columns := []string{"mean_exit_both_absorb", "mean_exit_inner_reflects", "mean_exit_outer_reflects", "prob_outer_first"}
		errs := map[string][]float64{}
		for _, rows := range []int{8, 16, 32} {
			m := annulus(a, b, 8*rows, rows)
			s := solverFor(t, m, Options{})
			inner, outer := rim(m, a), rim(m, b)
			both, err := s.Passage(context.Background(), [][]int32{outer, inner}, d)
			if err != nil {
				t.Fatal(err)
			}
			onlyOuter, err := s.Passage(context.Background(), [][]int32{outer}, d)
			if err != nil {
				t.Fatal(err)
			}
			onlyInner, err := s.Passage(context.Background(), [][]int32{inner}, d)
			if err != nil {
				t.Fatal(err)
			}
			for k, field := range [][]float64{both.MeanTime, onlyOuter.MeanTime, onlyInner.MeanTime, both.Reach[0]} {
				// Interpolate in log r between the two rows that hold the radius: the rows
				// are even in it, and the cubic through four of them is far below h².
				got := alongRows(m, field, math.Log(radius/a)/math.Log(b/a)*float64(rows), rows)
				want := number(t, row, columns[k])
				errs[columns[k]] = append(errs[columns[k]], math.Abs(got-want)/want)
			}
			for v, p := range both.Reach[0] {
				if math.Abs(p+both.Reach[1][v]-1) > 1e-15 || p < 0 || p > 1 {
					t.Fatalf("vertex %d: probabilities %g and %g", v, p, both.Reach[1][v])
				}
			}
		}
		for column, e := range errs {
			if column == "prob_outer_first" {
				if e[2] > 1e-4 { // rows even in log r carry ln r exactly, but for the chords
					t.Errorf("annulus r=%g %s: errors %.3g", radius, column, e)
				}
				continue
			}
			checkOrder(t, fmt.Sprintf("annulus r=%g %s", radius, column), e, 2e-3)
		}
	}
}

// alongRows is the cubic interpolation of field along column 0 of a cylinder grid at
// the fractional row at.
func alongRows(_ *mesh.Mesh, field []float64, at float64, rows int) float64 {
	first := min(max(int(at)-1, 0), rows-3)
	sum := 0.0
	for i := first; i < first+4; i++ {
		w := 1.0
		for j := first; j < first+4; j++ {
			if j != i {
				w *= (at - float64(j)) / float64(i-j)
			}
		}
		sum += w * field[i]
	}
	return sum
}

// Components without a target are never left: infinite time, probability 0.
func TestPassageAcrossComponents(t *testing.T) {
	m := meshtest.Join(meshtest.Plate(1, 1, 4, 4, 0, 0), meshtest.Icosphere(1, 0, 0))
	m.Positions = append(m.Positions, 7, 7, 7)
	s := solverFor(t, m, Options{})
	r, err := s.Passage(context.Background(), [][]int32{{0}, {24}}, 1)
	if err != nil {
		t.Fatal(err)
	}
	if r.MeanTime[0] != 0 || r.MeanTime[24] != 0 || !(r.MeanTime[12] > 0) || math.IsInf(r.MeanTime[12], 0) {
		t.Errorf("plate: times %g %g %g", r.MeanTime[0], r.MeanTime[24], r.MeanTime[12])
	}
	if !math.IsInf(r.MeanTime[30], 1) || r.Reach[0][30] != 0 || r.Reach[1][30] != 0 || r.Unreached != 1 || len(r.Warnings) != 1 {
		t.Errorf("sphere: time %g, probabilities %g %g, %d unreached, warnings %q", r.MeanTime[30], r.Reach[0][30], r.Reach[1][30], r.Unreached, r.Warnings)
	}
	last := m.NumVertices() - 1
	if !math.IsNaN(r.MeanTime[last]) || !math.IsNaN(r.Reach[1][last]) {
		t.Errorf("vertex in no triangle: %g, %g; want NaN", r.MeanTime[last], r.Reach[1][last])
	}
	if math.Abs(r.Reach[0][12]-0.5) > 1e-14 { // the plate's middle, by symmetry
		t.Errorf("middle: %g, want 0.5", r.Reach[0][12])
	}
}

func TestPassageRefusesBadTargets(t *testing.T) {
	m := meshtest.Tetrahedron(0)
	m.Positions = append(m.Positions, 7, 7, 7)
	s := solverFor(t, m, Options{})
	for name, targets := range map[string][][]int32{
		"none": {}, "empty": {{}}, "below 0": {{-1}}, "beyond": {{5}}, "no triangle": {{4}}, "shared": {{0, 1}, {1}},
	} {
		var bad *TargetError
		if _, err := s.Passage(context.Background(), targets, 1); !errors.As(err, &bad) {
			t.Errorf("%s: got %v, want a *TargetError", name, err)
		}
	}
	var bad *OptionError
	if _, err := s.Passage(context.Background(), [][]int32{{0}}, -1); !errors.As(err, &bad) {
		t.Errorf("diffusivity -1: got %v, want an *OptionError", err)
	}
}

func ExampleSolver_Passage() {
	// A square sheet with side 1 that can be left over two opposite edges.
	m := meshtest.Plate(1, 1, 2, 2, 0, 0)
	surface, err := mesh.NewSurface(m)
	if err != nil {
		fmt.Println(err)
		return
	}
	surface.Delaunay(100)
	s, err := NewSolver(context.Background(), surface, Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	left, right := []int32{0, 1, 2}, []int32{6, 7, 8}
	r, err := s.Passage(context.Background(), [][]int32{left, right}, 1)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("from the middle: %.3f, left first with probability %.2f\n", r.MeanTime[4], r.Reach[0][4])
	// Output:
	// from the middle: 0.125, left first with probability 0.50
}
