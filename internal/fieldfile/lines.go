package fieldfile

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
)

// A Polyline is a line in space, for WriteLinesPLY and WriteLinesCSV: point i at
// Points[3i:3i+3], the length S[i] run so far, and the triangle that holds the
// stretch which begins there.
type Polyline struct {
	Points    []float64
	S         []float64
	Triangles []int32
}

// WriteLinesCSV writes the lines as the table line,index,x,y,z,s,triangle. The error
// is w's.
func WriteLinesCSV(w io.Writer, lines []Polyline) error {
	var line, index, triangles []int32
	var s []float64
	var axes [3][]float64
	for k, l := range lines {
		for i, run := range l.S {
			line, index = append(line, int32(k)), append(index, int32(i))
			for axis := range axes {
				axes[axis] = append(axes[axis], l.Points[3*i+axis])
			}
			s, triangles = append(s, run), append(triangles, l.Triangles[i])
		}
	}
	return WriteTable(w, len(s), Ints("line", line), Ints("index", index),
		Floats("x", axes[0]), Floats("y", axes[1]), Floats("z", axes[2]), Floats("s", s), Ints("triangle", triangles))
}

// WriteLinesPLY writes the lines in binary little endian PLY: vertices with the doubles
// x, y, z, s and the int line, and edges (vertex1, vertex2) that join each to the next,
// with the triangle that they run over. The error is w's.
func WriteLinesPLY(w io.Writer, lines []Polyline) error {
	points, edges := 0, 0
	for _, l := range lines {
		points += len(l.S)
		edges += max(0, len(l.S)-1)
	}
	b := fmt.Appendf(nil, "ply\nformat binary_little_endian 1.0\n"+
		"element vertex %d\nproperty double x\nproperty double y\nproperty double z\nproperty double s\nproperty int line\n"+
		"element edge %d\nproperty int vertex1\nproperty int vertex2\nproperty int triangle\nend_header\n", points, edges)
	for k, l := range lines {
		for i, s := range l.S {
			for _, x := range [4]float64{l.Points[3*i], l.Points[3*i+1], l.Points[3*i+2], s} {
				b = binary.LittleEndian.AppendUint64(b, math.Float64bits(x))
			}
			b = binary.LittleEndian.AppendUint32(b, uint32(k))
		}
	}
	first := 0
	for _, l := range lines {
		for i := range max(0, len(l.S)-1) {
			b = binary.LittleEndian.AppendUint32(b, uint32(first+i))
			b = binary.LittleEndian.AppendUint32(b, uint32(first+i+1))
			b = binary.LittleEndian.AppendUint32(b, uint32(l.Triangles[i]))
		}
		first += len(l.S)
	}
	_, err := w.Write(b)
	return err
}
