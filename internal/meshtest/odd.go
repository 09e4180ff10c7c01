package meshtest

import (
	"math"

	"heatskin/mesh"
)

// MoebiusBand is a band of n by m cells with a half twist: one side, one rim, and no
// orientation that all triangles share.
func MoebiusBand(n, m int) *mesh.Mesh {
	b := newBuilder(0, 0)
	for i := range n {
		for j := range m + 1 {
			u := 2 * math.Pi * float64(i) / float64(n)
			w := float64(j)/float64(m) - 0.5
			sin, cos := math.Sincos(u)
			r := 1 + w*math.Cos(u/2)
			b.vertex([3]float64{r * cos, r * sin, w * math.Sin(u/2)})
		}
	}
	number := func(i, j int) int32 {
		if i == n { // the last column is the first, upside down
			i, j = 0, m-j
		}
		return int32(i*(m+1) + j)
	}
	for i := range n {
		for j := range m {
			b.quad(number(i, j), number(i+1, j), number(i+1, j+1), number(i, j+1))
		}
	}
	return b.mesh()
}

// Book is flat unit pages, pages of them, spread evenly round the spine that they
// share (x = y = 0, z from 0 to 1): n cells along the spine and across each page. With
// more than two pages every edge on the spine has that many faces. Vertices 0 to n are
// the spine; all pages run along it the same way, so that they are not of one orientation.
func Book(pages, n int) *mesh.Mesh {
	b := newBuilder(0, 0)
	h := 1 / float64(n)
	for k := range n + 1 {
		b.vertex([3]float64{0, 0, h * float64(k)})
	}
	for page := range pages {
		sin, cos := math.Sincos(2 * math.Pi * float64(page) / float64(pages))
		first := int32(len(b.positions) / 3)
		for i := 1; i <= n; i++ {
			for k := range n + 1 {
				r := h * float64(i)
				b.vertex([3]float64{r * cos, r * sin, h * float64(k)})
			}
		}
		number := func(i, k int) int32 {
			if i == 0 {
				return int32(k)
			}
			return first + int32((i-1)*(n+1)+k)
		}
		for i := range n {
			for k := range n {
				b.quad(number(i, k), number(i+1, k), number(i+1, k+1), number(i, k+1))
			}
		}
	}
	return b.mesh()
}
