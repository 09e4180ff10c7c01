package fieldfile

import (
	"bytes"
	"encoding/binary"
	"strings"
	"testing"
)

var twoLines = []Polyline{
	{Points: []float64{0, 0, 0, 1, 0, 0, 1, 2, 0}, S: []float64{0, 1, 3}, Triangles: []int32{7, 8, 8}},
	{Points: []float64{5, 5, 5, 5, 5, 6}, S: []float64{0, 1}, Triangles: []int32{2, 2}},
}

func TestWriteLinesCSV(t *testing.T) {
	var b strings.Builder
	if err := WriteLinesCSV(&b, twoLines); err != nil {
		t.Fatal(err)
	}
	const want = `line,index,x,y,z,s,triangle
0,0,0,0,0,0,7
0,1,1,0,0,1,8
0,2,1,2,0,3,8
1,0,5,5,5,0,2
1,1,5,5,6,1,2
`
	if b.String() != want {
		t.Errorf("got\n%s\nwant\n%s", b.String(), want)
	}
}

// The layout is that of G. Turk, The PLY Polygon File Format, 1994: the header's counts
// and types fix the number of bytes, and edges name their vertices from 0.
func TestWriteLinesPLY(t *testing.T) {
	var b bytes.Buffer
	if err := WriteLinesPLY(&b, twoLines); err != nil {
		t.Fatal(err)
	}
	head, body, found := bytes.Cut(b.Bytes(), []byte("end_header\n"))
	if !found || !bytes.Contains(head, []byte("element vertex 5\n")) || !bytes.Contains(head, []byte("element edge 3\n")) {
		t.Fatalf("header %s", head)
	}
	const vertexBytes, edgeBytes = 4*8 + 4, 3 * 4
	if len(body) != 5*vertexBytes+3*edgeBytes {
		t.Fatalf("%d bytes after the header", len(body))
	}
	var edges [9]int32
	if err := binary.Read(bytes.NewReader(body[5*vertexBytes:]), binary.LittleEndian, &edges); err != nil {
		t.Fatal(err)
	}
	if want := [9]int32{0, 1, 7, 1, 2, 8, 3, 4, 2}; edges != want {
		t.Errorf("edges %v, want %v: a line must not be joined to the next", edges, want)
	}
}
