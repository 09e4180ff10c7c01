package meshfile

import (
	"math"
	"testing"
)

// outline makes a soup of one polygon of the points (x, y), tilted in space.
func outline(points [][2]float64) *Soup {
	soup := &Soup{}
	f := face{soup: soup}
	f.begin()
	for i, p := range points {
		soup.Positions = append(soup.Positions, p[0], p[1], 0.5*p[0]-0.25*p[1]) // exact for the shapes below
		f.corner(int32(i))
	}
	f.end(textSource(""))
	return soup
}

// The triangles of a simple polygon all turn as it does, and their areas add up to
// the polygon's own (Gauss's area formula): then they cover it and do not overlap.
func TestPolygonsAreCoveredOnce(t *testing.T) {
	circle := func(k int, radius func(i int) float64) (points [][2]float64) {
		for i := range k {
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(k))
			points = append(points, [2]float64{radius(i) * cos, radius(i) * sin})
		}
		return points
	}
	comb := func(teeth int) (points [][2]float64) {
		for i := range teeth {
			x := float64(i)
			points = append(points, [2]float64{x, 0}, [2]float64{x, 10}, [2]float64{x + 0.5, 10}, [2]float64{x + 0.5, 0})
		}
		return append(points, [2]float64{float64(teeth), -1}, [2]float64{0, -1})
	}
	spiral := func(k int) (points [][2]float64) { // out along one wall, back along the other
		for i := range k {
			a := 6 * math.Pi * float64(i) / float64(k)
			points = append(points, [2]float64{(1 + a) * math.Cos(a), (1 + a) * math.Sin(a)})
		}
		for i := k - 1; i >= 0; i-- {
			a := 6 * math.Pi * float64(i) / float64(k)
			points = append(points, [2]float64{(2 + a) * math.Cos(a), (2 + a) * math.Sin(a)})
		}
		return points
	}
	for name, points := range map[string][][2]float64{
		"square":                {{0, 0}, {1, 0}, {1, 1}, {0, 1}},
		"arrowhead":             {{0, 0}, {2, 1}, {0, 2}, {1, 1}},
		"arrowhead-turned":      {{1, 1}, {0, 0}, {2, 1}, {0, 2}},
		"ell":                   {{0, 0}, {2, 0}, {2, 1}, {1, 1}, {1, 2}, {0, 2}},
		"straight-corners":      {{0, 0}, {1, 0}, {2, 0}, {2, 1}, {2, 2}, {1, 2}, {0, 2}, {0, 1}},
		"frame-with-bridge":     {{0, 0}, {4, 0}, {4, 4}, {0, 4}, {0, 0}, {1, 1}, {1, 3}, {3, 3}, {3, 1}, {1, 1}},
		"many-corners":          circle(500, func(int) float64 { return 1 }),
		"star":                  circle(2000, func(i int) float64 { return 1 + float64(i%2) }),
		"gear-of-50000-corners": circle(50_000, func(i int) float64 { return 1 + 0.1*float64(i/2%2) }),
		"comb-of-1000-teeth":    comb(1000),
		"spiral":                spiral(3000),
	} {
		for _, clockwise := range []bool{false, true} {
			if clockwise {
				for i, j := 0, len(points)-1; i < j; i, j = i+1, j-1 {
					points[i], points[j] = points[j], points[i]
				}
			}
			soup := outline(points)
			if len(points) > 3 {
				c := cutter{positions: soup.Positions, spare: spareTests}
				if !c.cut(soup.Triangles) {
					t.Fatalf("%s: not cut", name)
				}
				// A comb's straight edge costs all pairs; what is curled up costs some hundreds a
				// corner for want of cells that follow it.
				if work := testsPerCorner*len(points) + spareTests - c.tests; c.tests > 0 && work > 1000*len(points) {
					t.Errorf("%s: %d tests for %d corners", name, work, len(points))
				}
			}
			want := 0.0
			for i, p := range points {
				q := points[(i+1)%len(points)]
				want += p[0]*q[1] - p[1]*q[0]
			}
			got := 0.0
			for f := 0; f < len(soup.Triangles); f += 3 {
				a, b, c := points[soup.Triangles[f]], points[soup.Triangles[f+1]], points[soup.Triangles[f+2]]
				twice := (b[0]-a[0])*(c[1]-a[1]) - (c[0]-a[0])*(b[1]-a[1])
				if twice*want <= 0 {
					t.Fatalf("%s: triangle %d (%v %v %v) is flat or turned over", name, f/3, a, b, c)
				}
				got += twice
			}
			const tol = 1e-9 // some ten thousand sums, each good to 1e-16 of at most the whole
			if math.Abs(got-want) > tol*math.Abs(want) || len(soup.Triangles) != 3*(len(points)-2) {
				t.Errorf("%s: %d triangles of twice the area %v, want %d of %v", name, len(soup.Triangles)/3, got, len(points)-2, want)
			}
		}
	}
}

// Faces that no triangles cover once must come out as triangles all the same, soon.
func TestImpossiblePolygonsEnd(t *testing.T) {
	pentagram := [][2]float64{}
	scribble := [][2]float64{}
	for i := range 5 {
		sin, cos := math.Sincos(4 * math.Pi * float64(i) / 5)
		pentagram = append(pentagram, [2]float64{cos, sin})
	}
	for i := range 3000 {
		scribble = append(scribble, [2]float64{math.Sin(1e4 * float64(i*i%977)), math.Cos(1e4 * float64(i*i%1009))})
	}
	huge := [][2]float64{{-1e308, 0}, {1e308, -1e308}, {1e308, 1e308}, {0, 1e300}, {-1e308, 1e308}}
	for name, tc := range map[string]struct {
		points [][2]float64
		warns  bool
	}{
		"pentagram":    {pentagram, true},
		"scribble":     {scribble, true},
		"one-place":    {make([][2]float64, 100), false},
		"line":         {[][2]float64{{0, 0}, {1, 1}, {2, 2}, {3, 3}, {1, 1}}, false},
		"beyond-range": {huge, false},
	} {
		soup := outline(tc.points)
		c := cutter{positions: soup.Positions, spare: 1000}
		if whole := c.cut(soup.Triangles); whole == tc.warns {
			t.Errorf("%s: cut %v", name, whole)
		}
		if work := testsPerCorner*len(tc.points) + 1000 - c.tests; c.tests < -2*len(tc.points) {
			t.Errorf("%s: %d tests for %d corners", name, work, len(tc.points))
		}
		for _, v := range soup.Triangles {
			if v < 0 || int(v) >= len(tc.points) {
				t.Fatalf("%s: corner %d", name, v)
			}
		}
		if len(soup.Triangles) != 3*(len(tc.points)-2) {
			t.Errorf("%s: %d triangles", name, len(soup.Triangles)/3)
		}
	}
}
