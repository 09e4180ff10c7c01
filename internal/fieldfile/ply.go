package fieldfile

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"heatskin/mesh"
)

// WritePLY writes m with its fields: for each vertex the doubles x, y, z and one
// double a column, and colours by the first column from its smallest to its largest
// finite value (see ColourAt); then the triangles. A column's name becomes legal in
// PLY by turning blanks and what is not ASCII into "_", and unique by appending "_";
// a comment tells the original. It panics if a column is not as long as m. The error
// is w's.
func WritePLY(w io.Writer, m *mesh.Mesh, columns []Column) error {
	n, triangles := m.NumVertices(), m.NumTriangles()
	head := []byte("ply\nformat binary_little_endian 1.0\n")
	names := plyNames(columns)
	for i, c := range columns {
		if len(c.Values) != n {
			panic("fieldfile: a column is not as long as the mesh")
		}
		if names[i] != c.Name {
			head = fmt.Appendf(head, "comment property %s holds %s\n", names[i], strconv.QuoteToASCII(c.Name))
		}
	}
	var low, perStep float64
	if len(columns) > 0 {
		var high float64
		low, high = finiteRange(columns[0].Values)
		perStep = 1 / (high - low)
		head = fmt.Appendf(head, "comment colours run from %s = %v to %v\n", names[0], low, high)
	}
	head = fmt.Appendf(head, "element vertex %d\nproperty double x\nproperty double y\nproperty double z\n", n)
	for _, name := range names {
		head = fmt.Appendf(head, "property double %s\n", name)
	}
	if len(columns) > 0 {
		head = append(head, "property uchar red\nproperty uchar green\nproperty uchar blue\n"...)
	}
	head = fmt.Appendf(head, "element face %d\nproperty list uchar int vertex_indices\nend_header\n", triangles)
	if _, err := w.Write(head); err != nil {
		return err
	}
	blocksOf := func(rows int) int { return (rows + blockRows - 1) / blockRows }
	err := writeBlocks(w, blocksOf(n), func(b []byte, block int) []byte {
		for v := block * blockRows; v < min(n, (block+1)*blockRows); v++ {
			for _, x := range m.Positions[3*v : 3*v+3] {
				b = binary.LittleEndian.AppendUint64(b, math.Float64bits(x))
			}
			for _, c := range columns {
				b = binary.LittleEndian.AppendUint64(b, math.Float64bits(c.Values[v]))
			}
			if len(columns) > 0 {
				c := valueColour(columns[0].Values[v], low, perStep)
				b = append(b, c[0], c[1], c[2])
			}
		}
		return b
	})
	if err != nil {
		return err
	}
	return writeBlocks(w, blocksOf(triangles), func(b []byte, block int) []byte {
		for f := block * blockRows; f < min(triangles, (block+1)*blockRows); f++ {
			b = append(b, 3)
			for _, v := range m.Triangles[3*f : 3*f+3] {
				b = binary.LittleEndian.AppendUint32(b, uint32(v))
			}
		}
		return b
	})
}

// finiteRange is the smallest and the largest finite value; 0 and 0 if there is none.
func finiteRange(values []float64) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, v := range values {
		if v-v == 0 {
			low, high = min(low, v), max(high, v)
		}
	}
	if low > high {
		return 0, 0
	}
	return low, high
}

// valueColour is the colour of a value, perStep being 1/(high-low), which is infinite
// for a constant field (all of it at the path's middle) and 0 beyond the range of
// doubles.
func valueColour(v, low, perStep float64) Colour {
	switch {
	case v-v != 0:
		return NoValue
	case perStep == 0 || math.IsInf(perStep, 0):
		return ColourAt(0.5)
	}
	return ColourAt((v - low) * perStep)
}

// plyNames makes the columns' names legal and unique.
func plyNames(columns []Column) []string {
	taken := map[string]bool{"x": true, "y": true, "z": true, "red": true, "green": true, "blue": true}
	names := make([]string, len(columns))
	for i, c := range columns {
		name := strings.Map(func(r rune) rune {
			if r <= ' ' || r >= 0x7f {
				return '_'
			}
			return r
		}, c.Name)
		for name == "" || taken[name] {
			name += "_"
		}
		taken[name] = true
		names[i] = name
	}
	return names
}
