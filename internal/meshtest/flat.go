package meshtest

import (
	"math"

	"heatskin/mesh"
)

// Plate is the flat rectangle [0,a] x [0,b] of n by m cells. Without jitter vertex
// i*(m+1)+j lies at (a*i/n, b*j/m). Vertices on the rim stay where they are.
func Plate(a, b float64, n, m int, jitter float64, seed uint64) *mesh.Mesh {
	g := newBuilder(jitter, seed)
	g.grid(n, m, false, false, false, func(i, j float64) [3]float64 {
		return [3]float64{a * i / float64(n), b * j / float64(m), 0}
	})
	return g.mesh()
}

// LPlate is [0,2]^2 without (1,2] x (1,2], in cells of 1/n.
func LPlate(n int, jitter float64, seed uint64) *mesh.Mesh {
	return cutPlate(2*n, func(i, j int) bool { return i >= n && j >= n }, nil, jitter, seed)
}

// SlitPlate is [0,2]^2 in cells of 1/n, cut along x = 1 from y = y0 to y = y1, both
// multiples of 1/n. Vertices on the cut are double, save for its ends inside the
// plate: an end on the rim (y = 0 or 2) is open. The copies on the right side (x >= 1)
// come last, in order of y.
func SlitPlate(n int, y0, y1 float64, jitter float64, seed uint64) *mesh.Mesh {
	lo, hi := int(math.Round(y0*float64(n))), int(math.Round(y1*float64(n)))
	slit := func(j int) bool {
		return lo < j && j < hi || j == lo && lo == 0 || j == hi && hi == 2*n
	}
	return cutPlate(2*n, nil, slit, jitter, seed)
}

// cutPlate is [0,2]^2 in n by n cells, without those that hole names, and with the
// vertices of column n/2 doubled where slit says so.
func cutPlate(n int, hole func(i, j int) bool, slit func(j int) bool, jitter float64, seed uint64) *mesh.Mesh {
	b := newBuilder(jitter, seed)
	h := 2 / float64(n)
	number := make([]int32, (n+1)*(n+1))
	for i := range n + 1 {
		for j := range n + 1 {
			number[i*(n+1)+j] = -1
			used := 0 // cells around the vertex
			for di := -1; di <= 0; di++ {
				for dj := -1; dj <= 0; dj++ {
					ci, cj := i+di, j+dj
					if ci >= 0 && cj >= 0 && ci < n && cj < n && (hole == nil || !hole(ci, cj)) {
						used++
					}
				}
			}
			if used == 0 {
				continue
			}
			dx, dy := b.shift(), b.shift()
			if used < 4 || slit != nil && i == n/2 {
				dx, dy = 0, 0
			}
			number[i*(n+1)+j] = b.vertex([3]float64{h * (float64(i) + dx), h * (float64(j) + dy), 0})
		}
	}
	right := make([]int32, n+1)
	for j := range right {
		v := number[n/2*(n+1)+j]
		if right[j] = v; slit != nil && slit(j) {
			right[j] = b.vertex([3]float64(b.positions[3*v : 3*v+3]))
		}
	}
	for i := range n {
		for j := range n {
			if hole != nil && hole(i, j) {
				continue
			}
			u, v, w, x := number[i*(n+1)+j], number[(i+1)*(n+1)+j], number[(i+1)*(n+1)+j+1], number[i*(n+1)+j+1]
			if slit != nil && i == n/2 {
				u, x = right[j], right[j+1]
			}
			b.quad(u, v, w, x)
		}
	}
	return b.mesh()
}

// Disc is the flat unit disc of n rings: vertex 0 at the centre, ring i holds 6i
// vertices at radius i/n, number 1+3i(i-1)+j at angle 2 pi j/(6i).
func Disc(n int) *mesh.Mesh {
	b := newBuilder(0, 0)
	b.vertex([3]float64{})
	for i := 1; i <= n; i++ {
		for j := range 6 * i {
			sin, cos := math.Sincos(2 * math.Pi * float64(j) / float64(6*i))
			r := float64(i) / float64(n)
			b.vertex([3]float64{r * cos, r * sin, 0})
		}
	}
	number := func(i, j int) int32 {
		if i == 0 {
			return 0
		}
		return int32(1 + 3*i*(i-1) + j%(6*i))
	}
	for i := range n {
		for s := range 6 {
			for j := range i + 1 {
				b.triangle(number(i, s*i+j), number(i+1, s*(i+1)+j), number(i+1, s*(i+1)+j+1))
				if j < i {
					b.triangle(number(i, s*i+j), number(i+1, s*(i+1)+j+1), number(i, s*i+j+1))
				}
			}
		}
	}
	return b.mesh()
}

// Paraboloid is z = x^2+y^2 over the square [-half, half]^2 of n by n cells.
func Paraboloid(half float64, n int, jitter float64, seed uint64) *mesh.Mesh {
	b := newBuilder(jitter, seed)
	b.grid(n, n, false, false, false, func(i, j float64) [3]float64 {
		x, y := half*(2*i/float64(n)-1), half*(2*j/float64(n)-1)
		return [3]float64{x, y, x*x + y*y}
	})
	return b.mesh()
}

// ParaboloidDisc is z = x^2+y^2 over the disc of the given radius, n rings as Disc.
func ParaboloidDisc(radius float64, n int) *mesh.Mesh {
	return Map(Disc(n), func(p [3]float64) [3]float64 {
		x, y := radius*p[0], radius*p[1]
		return [3]float64{x, y, x*x + y*y}
	})
}

// Box is the closed box [0,a] x [0,b] x [0,c], its sides cut into cuts[0], cuts[1]
// and cuts[2] cells; welded. Only vertices inside a face are shifted, within it, so
// that the shape stays exactly the box.
func Box(a, b, c float64, cuts [3]int, jitter float64, seed uint64) *mesh.Mesh {
	g := newBuilder(jitter, seed)
	size := [3]float64{a, b, c}
	known := make(map[[3]int]int32)
	vertex := func(at [3]int) int32 {
		v, ok := known[at]
		if !ok {
			var p [3]float64
			rims := 0
			for axis := range at {
				if at[axis] == 0 || at[axis] == cuts[axis] {
					rims++
				}
			}
			for axis, i := range at {
				x, rim := float64(i), i == 0 || i == cuts[axis]
				if shift := g.shift(); !rim && rims == 1 {
					x += shift
				}
				p[axis] = size[axis] * x / float64(cuts[axis])
			}
			v = g.vertex(p)
			known[at] = v
		}
		return v
	}
	for axis := range 3 {
		u, v := (axis+1)%3, (axis+2)%3 // u x v points along +axis
		for _, side := range []int{0, cuts[axis]} {
			for i := range cuts[u] {
				for j := range cuts[v] {
					corner := func(di, dj int) int32 {
						var at [3]int
						at[axis], at[u], at[v] = side, i+di, j+dj
						return vertex(at)
					}
					p, q, r, s := corner(0, 0), corner(1, 0), corner(1, 1), corner(0, 1)
					if side == 0 {
						q, s = s, q
					}
					g.quad(p, q, r, s)
				}
			}
		}
	}
	return g.mesh()
}
