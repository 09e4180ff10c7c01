package meshfile_test

import (
	"bytes"
	"context"
	"encoding/binary"
	"fmt"
	"math"
	"testing"

	"github.com/hschendel/stl"

	"heatskin/internal/meshfile"
)

// wavyGrid is a bumpy sheet of 2·n² triangles with coordinates in single precision.
func wavyGrid(n int) (positions []float64, triangles []int32) {
	for i := range n + 1 {
		for j := range n + 1 {
			x, y := 17.3*float64(i)/float64(n), 11.9*float64(j)/float64(n)
			for _, v := range []float64{x, y, math.Sin(3*x) * math.Cos(2*y)} {
				positions = append(positions, float64(float32(v)))
			}
		}
	}
	for i := range n {
		for j := range n {
			a := int32(i*(n+1) + j)
			b, c, d := a+1, a+int32(n)+1, a+int32(n)+2
			triangles = append(triangles, a, c, b, b, c, d)
		}
	}
	return positions, triangles
}

func binarySTL(positions []float64, triangles []int32) []byte {
	b := make([]byte, 80, 84+50*len(triangles)/3)
	b = binary.LittleEndian.AppendUint32(b, uint32(len(triangles)/3))
	for i, v := range triangles {
		if i%3 == 0 {
			b = append(b, make([]byte, 12)...)
		}
		for _, x := range positions[3*v : 3*v+3] {
			b = binary.LittleEndian.AppendUint32(b, math.Float32bits(float32(x)))
		}
		if i%3 == 2 {
			b = append(b, 0, 0)
		}
	}
	return b
}

// asciiSTL writes numbers with the digits that %e gives, as many programs do.
func asciiSTL(positions []float64, triangles []int32) []byte {
	var b bytes.Buffer
	fmt.Fprintln(&b, "solid sheet")
	for f := 0; f < len(triangles); f += 3 {
		fmt.Fprintln(&b, "  facet normal 0.000000e+00 0.000000e+00 1.000000e+00\n    outer loop")
		for _, v := range triangles[f : f+3] {
			fmt.Fprintf(&b, "      vertex %e %e %e\n", positions[3*v], positions[3*v+1], positions[3*v+2])
		}
		fmt.Fprintln(&b, "    endloop\n  endfacet")
	}
	fmt.Fprintln(&b, "endsolid sheet")
	return b.Bytes()
}

func plyText(positions []float64, triangles []int32) []byte {
	var b bytes.Buffer
	fmt.Fprintf(&b, "ply\nformat ascii 1.0\nelement vertex %d\nproperty double x\nproperty double y\nproperty double z\n", len(positions)/3)
	fmt.Fprintf(&b, "element face %d\nproperty list uchar int vertex_indices\nend_header\n", len(triangles)/3)
	for v := 0; v < len(positions); v += 3 {
		fmt.Fprintln(&b, positions[v], positions[v+1], positions[v+2])
	}
	for f := 0; f < len(triangles); f += 3 {
		fmt.Fprintln(&b, 3, triangles[f], triangles[f+1], triangles[f+2])
	}
	return b.Bytes()
}

func plyBytes(positions []float64, triangles []int32) []byte {
	var b []byte
	b = fmt.Appendf(b, "ply\nformat binary_little_endian 1.0\nelement vertex %d\nproperty float x\nproperty float y\nproperty float z\n", len(positions)/3)
	b = fmt.Appendf(b, "element face %d\nproperty list uchar int vertex_indices\nend_header\n", len(triangles)/3)
	for _, x := range positions {
		b = binary.LittleEndian.AppendUint32(b, math.Float32bits(float32(x)))
	}
	for i, v := range triangles {
		if i%3 == 0 {
			b = append(b, 3)
		}
		b = binary.LittleEndian.AppendUint32(b, uint32(v))
	}
	return b
}

func objText(positions []float64, triangles []int32) []byte {
	var b bytes.Buffer
	for v := 0; v < len(positions); v += 3 {
		fmt.Fprintln(&b, "v", positions[v], positions[v+1], positions[v+2])
	}
	for f := 0; f < len(triangles); f += 3 {
		fmt.Fprintf(&b, "f %[1]d//%[1]d %[2]d//%[2]d %[3]d//%[3]d\n", triangles[f]+1, triangles[f+1]+1, triangles[f+2]+1)
	}
	return b.Bytes()
}

// pipe hides everything of a reader but Read, as a pipe or a hashing tee does.
type pipe struct{ r *bytes.Reader }

func (p pipe) Read(b []byte) (int, error) { return p.r.Read(b) }

func benchmarkRead(b *testing.B, file []byte) {
	b.SetBytes(int64(len(file)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := meshfile.Read(context.Background(), pipe{bytes.NewReader(file)}, "sheet", ""); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkBinarySTL(b *testing.B) { benchmarkRead(b, binarySTL(wavyGrid(800))) } // 1.28 million triangles
func BenchmarkASCIISTL(b *testing.B)  { benchmarkRead(b, asciiSTL(wavyGrid(300))) }
func BenchmarkPLYText(b *testing.B)   { benchmarkRead(b, plyText(wavyGrid(300))) }
func BenchmarkPLYBytes(b *testing.B)  { benchmarkRead(b, plyBytes(wavyGrid(800))) }
func BenchmarkOBJ(b *testing.B)       { benchmarkRead(b, objText(wavyGrid(300))) }

// stlSink is what a reader over github.com/hschendel/stl would do with its triangles.
type stlSink struct{ positions []float64 }

func (*stlSink) SetName(string)            {}
func (*stlSink) SetBinaryHeader([]byte)    {}
func (*stlSink) SetASCII(bool)             {}
func (s *stlSink) SetTriangleCount(uint32) {}
func (s *stlSink) AppendTriangle(t stl.Triangle) {
	for _, v := range t.Vertices {
		s.positions = append(s.positions, float64(v[0]), float64(v[1]), float64(v[2]))
	}
}

func BenchmarkBinarySTLByLibrary(b *testing.B) {
	file := binarySTL(wavyGrid(800))
	b.SetBytes(int64(len(file)))
	b.ReportAllocs()
	for b.Loop() {
		if err := stl.CopyAll(bytes.NewReader(file), &stlSink{}); err != nil {
			b.Fatal(err)
		}
	}
}
