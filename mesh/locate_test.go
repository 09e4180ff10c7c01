package mesh_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// nearestByGrowth finds the distance from p to a triangle by another road than the
// Locator's: the squared distance is convex in the weights, so repeated thirds on two
// nested intervals close in on its least value.
func nearestByGrowth(m *mesh.Mesh, f int, p [3]float64) float64 {
	corner := func(k int) []float64 { v := m.Triangles[3*f+k]; return m.Positions[3*v : 3*v+3] }
	a, b, c := corner(0), corner(1), corner(2)
	d2 := func(u, v float64) (sum float64) { // a + u(b-a) + uv(c-b), 0 <= u, v <= 1
		for i := range 3 {
			d := a[i] + u*(b[i]-a[i]) + u*v*(c[i]-b[i]) - p[i]
			sum += d * d
		}
		return sum
	}
	least := func(g func(float64) float64) float64 {
		lo, hi := 0.0, 1.0
		for range 80 {
			x, y := lo+(hi-lo)/3, hi-(hi-lo)/3
			if g(x) < g(y) {
				hi = y
			} else {
				lo = x
			}
		}
		return min(g(lo), g(0), g(1))
	}
	return math.Sqrt(least(func(u float64) float64 { return least(func(v float64) float64 { return d2(u, v) }) }))
}

func TestNearestAgainstConvexSearch(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for range 300 {
		x := make([]float64, 9)
		for i := range x {
			x[i] = rng.NormFloat64()
		}
		m := &mesh.Mesh{Positions: x, Triangles: []int32{0, 1, 2}}
		l := mesh.NewLocator(m)
		p := [3]float64{2 * rng.NormFloat64(), 2 * rng.NormFloat64(), 2 * rng.NormFloat64()}
		at, gap := l.Nearest(p)
		// The search stops where squares no longer differ: half the digits in the place, all in the distance.
		if want := nearestByGrowth(m, 0, p); math.Abs(gap-want) > 1e-9*(1+want) {
			t.Fatalf("%v to %v: gap %.15g, want %.15g", p, x, gap, want)
		}
		checkPoint(t, m, at, p, gap)
	}
}

// checkPoint holds a result to what it says of itself.
func checkPoint(t *testing.T, m *mesh.Mesh, at mesh.Point, p [3]float64, gap float64) {
	t.Helper()
	sum := 0.0
	for _, w := range at.Weights {
		if w < 0 || w > 1 {
			t.Fatalf("weights %v", at.Weights)
		}
		sum += w
	}
	q := m.Position(at)
	d := math.Sqrt((p[0]-q[0])*(p[0]-q[0]) + (p[1]-q[1])*(p[1]-q[1]) + (p[2]-q[2])*(p[2]-q[2]))
	if math.Abs(sum-1) > 1e-15 || math.Abs(d-gap) > 1e-14*(1+d) {
		t.Fatalf("weights %v add up to %v; the point lies at %v, the gap is %v", at.Weights, sum, d, gap)
	}
}

// The tree must find what a walk through all triangles finds, on smooth, flat,
// sliver-ridden, folded and scattered surfaces, near them, on them and far away.
func TestLocatorAgainstEachTriangle(t *testing.T) {
	bracket, _ := meshtest.Bracket(20, 9)
	soup := &mesh.Mesh{}
	rng := rand.New(rand.NewPCG(5, 6))
	for i := range int32(300) {
		for range 9 {
			soup.Positions = append(soup.Positions, float64(rng.IntN(5))) // many coincide, many are flat
		}
		soup.Triangles = append(soup.Triangles, 3*i, 3*i+1, 3*i+2)
	}
	for name, m := range map[string]*mesh.Mesh{
		"sphere":  meshtest.ShakenSphere(3, 1),
		"box":     meshtest.Box(3, 2, 1, [3]int{6, 4, 2}, 0.2, 1),
		"bracket": bracket,
		"soup":    soup,
		"slit":    meshtest.SlitPlate(4, 0.5, 1.5, 0, 0),
	} {
		all := mesh.NewLocator(m)
		ones := make([]*mesh.Locator, m.NumTriangles()) // one triangle each
		for f := range ones {
			one := mesh.NewLocator(&mesh.Mesh{Positions: m.Positions, Triangles: m.Triangles[3*f : 3*f+3]})
			if one.Triangles() == 1 {
				ones[f] = one
			}
		}
		for k := range 150 {
			f := rng.IntN(m.NumTriangles())
			u, v := rng.Float64(), rng.Float64()
			if k%3 == 0 { // a vertex or a middle of an edge: ties
				u, v = float64(rng.IntN(2)), float64(rng.IntN(3))/2
			}
			p := m.Position(mesh.Point{Triangle: int32(f), Weights: [3]float64{1 - u, u * (1 - v), u * v}})
			if k%2 == 0 {
				for axis := range p {
					p[axis] += math.Pow(10, -3+4*rng.Float64()) * rng.NormFloat64()
				}
			}
			at, gap := all.Nearest(p)
			checkPoint(t, m, at, p, gap)
			best, first := math.Inf(1), -1
			for f, one := range ones {
				if one != nil {
					if _, g := one.Nearest(p); g < best {
						best, first = g, f
					}
				}
			}
			if gap != best || int(at.Triangle) != first {
				t.Fatalf("%s: %v: triangle %d at %v; want %d at %v", name, p, at.Triangle, gap, first, best)
			}
		}
	}
}

// A sliver's points must be found to rounding of its length, however flat it is.
func TestNearestOnSlivers(t *testing.T) {
	for _, height := range []float64{1e-3, 1e-6, 1e-9, 1e-12} {
		m := &mesh.Mesh{Positions: []float64{0, 0, 0, 1, 0, 0, 0.37, height, 0}, Triangles: []int32{0, 1, 2}}
		l := mesh.NewLocator(m)
		p := [3]float64{0.61, 0.3 * height, 0.25}
		at, gap := l.Nearest(p)
		q := m.Position(at)
		if math.Abs(gap-0.25) > 1e-16 || math.Abs(q[0]-0.61) > 3e-16 || math.Abs(q[1]-0.3*height) > 1e-16 || q[2] != 0 {
			t.Errorf("height %v: %v at %v", height, q, gap)
		}
	}
}

func TestNearestFarAway(t *testing.T) {
	l := mesh.NewLocator(meshtest.Tetrahedron(1))
	if _, gap := l.Nearest([3]float64{1e300, 0, 0}); math.Abs(gap-1e300) > 1e285 {
		t.Errorf("gap %v, want 1e300", gap)
	}
}

// scanned is how many places a Locator looks up before it builds its tree.
const scanned = 32

func BenchmarkNewLocator(b *testing.B) {
	m := meshtest.Icosphere(8, 0.2, 1)
	for b.Loop() {
		l := mesh.NewLocator(m)
		b.StopTimer()
		for range scanned {
			l.Nearest([3]float64{2, 0, 0})
		}
		b.StartTimer()
		l.Nearest([3]float64{2, 0, 0})
	}
}

func BenchmarkScan(b *testing.B) {
	m := meshtest.Icosphere(8, 0.2, 1)
	for b.Loop() {
		b.StopTimer()
		l := mesh.NewLocator(m)
		b.StartTimer()
		l.Nearest([3]float64{1, 0.5, 0})
	}
}

func BenchmarkNearest(b *testing.B) {
	l := mesh.NewLocator(meshtest.Icosphere(8, 0.2, 1))
	for range scanned + 1 {
		l.Nearest([3]float64{2, 0, 0})
	}
	rng := rand.New(rand.NewPCG(1, 2))
	for b.Loop() {
		x, y, z := rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
		r := math.Sqrt(x*x+y*y+z*z) / (1 + 0.001*rng.NormFloat64())
		l.Nearest([3]float64{x / r, y / r, z / r})
	}
}
