package kernel

// A numbering translates between the vertices of the surface that a Solver was made
// for and its own, which come as the faces do: every loop over the surface, from
// assembly to the front, then finds what it needs near what it had before. Only public
// methods translate, on the way in and out; all else is in the Solver's own numbers.
// The zero value leaves numbers as they are.
type numbering struct {
	outer []int32 // surface vertex of each of the Solver's
	inner []int32 // the reverse
}

func newNumbering(outer []int32) numbering {
	n := numbering{outer: outer, inner: make([]int32, len(outer))}
	for i, v := range outer {
		n.inner[v] = int32(i)
	}
	return n
}

// inward is a field by surface vertex in the Solver's order. It may be x itself.
func (n *numbering) inward(x []float64) []float64 { return reordered(x, n.outer) }

// outward is a field of the Solver's by surface vertex. It may be x itself.
func (n *numbering) outward(x []float64) []float64 { return reordered(x, n.inner) }

func reordered(x []float64, from []int32) []float64 {
	if x == nil || from == nil {
		return x
	}
	y := make([]float64, len(x))
	for i, v := range from {
		y[i] = x[v]
	}
	return y
}

// vertexOut is the surface's number of vertex i.
func (n *numbering) vertexOut(i int) int {
	if n.outer == nil {
		return i
	}
	return int(n.outer[i])
}

// vertexIn is the Solver's number of surface vertex v.
func (n *numbering) vertexIn(v int32) int32 {
	if n.inner == nil {
		return v
	}
	return n.inner[v]
}
