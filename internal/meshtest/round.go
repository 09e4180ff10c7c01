package meshtest

import (
	"math"

	"heatskin/mesh"
)

// Cylinder is an open tube around z from z = 0 to height: n columns of vertices on
// the circle, m rows of cells; a prism of n flat sides. Jitter moves vertices along
// their columns only, so that the shape stays exactly the prism. Without jitter
// vertex i*(m+1)+j lies at angle 2 pi i/n and height*j/m.
func Cylinder(radius, height float64, n, m int, jitter float64, seed uint64) *mesh.Mesh {
	b := newBuilder(jitter, seed)
	b.grid(n, m, true, false, false, func(i, j float64) [3]float64 {
		sin, cos := math.Sincos(2 * math.Pi * math.Round(i) / float64(n))
		return [3]float64{radius * cos, radius * sin, height * j / float64(m)}
	})
	return b.mesh()
}

// Can is a closed cylinder, z from 0 to height: the side as Cylinder's, each cap n
// columns by rings rows around a vertex in the middle. The side's vertices come first.
func Can(radius, height float64, n, m, rings int) *mesh.Mesh {
	b := newBuilder(0, 0)
	b.grid(n, m, true, false, false, func(i, j float64) [3]float64 {
		sin, cos := math.Sincos(2 * math.Pi * i / float64(n))
		return [3]float64{radius * cos, radius * sin, height * j / float64(m)}
	})
	for top := range 2 {
		z := height * float64(top)
		outer := make([]int32, n) // the rim's vertices, then each ring's inwards
		for i := range outer {
			outer[i] = int32(i*(m+1) + top*m)
		}
		for k := rings - 1; k >= 0; k-- {
			inner := make([]int32, n)
			centre := int32(-1)
			for i := range inner {
				if k == 0 {
					if centre < 0 {
						centre = b.vertex([3]float64{0, 0, z})
					}
					inner[i] = centre
					continue
				}
				sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
				r := radius * float64(k) / float64(rings)
				inner[i] = b.vertex([3]float64{r * cos, r * sin, z})
			}
			for i := range inner {
				next := (i + 1) % n
				p, q, r, s := inner[i], outer[i], outer[next], inner[next]
				if top == 0 {
					q, s = s, q
				}
				if k > 0 {
					b.quad(p, q, r, s)
				} else if top == 1 {
					b.triangle(p, q, r)
				} else {
					b.triangle(p, r, s)
				}
			}
			outer = inner
		}
	}
	return b.mesh()
}

// Fan is n flat sectors round a hub, each with the given angle (radians) at the hub,
// embedded in space. Vertex 0 is the hub; spoke i holds vertices at the given slants
// (rising, above 0), number 1+i*len(slants)+k. If n times the angle exceeds a full
// turn n must be even, and the spokes go up and down in turn (a saddle).
func Fan(n int, angle float64, slants []float64) *mesh.Mesh {
	b := newBuilder(0, 0)
	b.vertex([3]float64{})
	sinHalf, sinTurn, cosTurn := math.Sin(angle/2), math.Sin(math.Pi/float64(n)), math.Cos(math.Pi/float64(n))
	saddle := float64(n)*angle > 2*math.Pi
	if saddle && n%2 == 1 {
		panic("meshtest: Fan: a saddle needs an even number of sectors")
	}
	rho := sinHalf / sinTurn // per unit of slant
	height := -math.Sqrt(max(0, 1-rho*rho))
	if saddle {
		height = math.Sqrt(sinHalf*sinHalf-sinTurn*sinTurn) / cosTurn
		rho = math.Sqrt(1 - height*height)
	}
	for i := range n {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
		z := height
		if saddle && i%2 == 1 {
			z = -height
		}
		for _, l := range slants {
			b.vertex([3]float64{l * rho * cos, l * rho * sin, l * z})
		}
	}
	k := len(slants)
	number := func(i, j int) int32 { return int32(1 + i%n*k + j) }
	for i := range n {
		b.triangle(0, number(i, 0), number(i+1, 0))
		for j := range k - 1 {
			b.quad(number(i, j), number(i, j+1), number(i+1, j+1), number(i+1, j))
		}
	}
	return b.mesh()
}

// Cone is a Fan of n sectors that is inscribed in the cone of half-angle alpha
// (radians, between axis and slant), m rows of equal height up to the given slant.
func Cone(alpha, slant float64, n, m int) *mesh.Mesh {
	slants := make([]float64, m)
	for j := range slants {
		slants[j] = slant * float64(j+1) / float64(m)
	}
	return Fan(n, 2*math.Asin(math.Sin(alpha)*math.Sin(math.Pi/float64(n))), slants)
}

// Frustum is the part of the cone of half-angle alpha between slants l0 and l1, open
// at both rims, n columns by m rows; alpha = pi/2 is a flat annulus. Vertex
// i*(m+1)+j lies at angle 2 pi i/n and slant l0+(l1-l0)*j/m.
func Frustum(alpha, l0, l1 float64, n, m int) *mesh.Mesh {
	b := newBuilder(0, 0)
	sinA, cosA := math.Sincos(alpha)
	b.grid(n, m, true, false, false, func(i, j float64) [3]float64 {
		sin, cos := math.Sincos(2 * math.Pi * i / float64(n))
		l := l0 + (l1-l0)*j/float64(m)
		return [3]float64{l * sinA * cos, l * sinA * sin, l * cosA}
	})
	return b.mesh()
}

// Torus has its axis along z, the tube's centre at distance R, its radius r. Without
// jitter vertex i*nv+j has u = 2 pi i/nu and v = 2 pi j/nv and lies at
// ((R+r cos v) cos u, (R+r cos v) sin u, r sin v).
func Torus(R, r float64, nu, nv int, jitter float64, seed uint64) *mesh.Mesh {
	b := newBuilder(jitter, seed)
	b.grid(nu, nv, true, true, false, func(i, j float64) [3]float64 {
		sinU, cosU := math.Sincos(2 * math.Pi * i / float64(nu))
		sinV, cosV := math.Sincos(2 * math.Pi * j / float64(nv))
		return [3]float64{(R + r*cosV) * cosU, (R + r*cosV) * sinU, r * sinV}
	})
	return b.mesh()
}

// Coil is a tube of radius r, open at both ends, wound round z as a helix of radius
// R that rises by pitch each turn; nu cells along, nv around.
func Coil(turns, R, pitch, r float64, nu, nv int, jitter float64, seed uint64) *mesh.Mesh {
	b := newBuilder(jitter, seed)
	rise := pitch / (2 * math.Pi)
	norm := math.Hypot(R, rise)
	b.grid(nu, nv, false, true, true, func(i, j float64) [3]float64 {
		u := 2 * math.Pi * turns * i / float64(nu)
		sinU, cosU := math.Sincos(u)
		sinV, cosV := math.Sincos(2 * math.Pi * j / float64(nv))
		// The tube's ring spans the helix's normal (-cosU, -sinU, 0) and binormal.
		bx, by, bz := rise*sinU/norm, -rise*cosU/norm, R/norm
		return [3]float64{
			R*cosU + r*(cosV*cosU+sinV*bx),
			R*sinU + r*(cosV*sinU+sinV*by),
			rise*u + r*sinV*bz,
		}
	})
	return b.mesh()
}
