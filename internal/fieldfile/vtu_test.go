package fieldfile

import (
	"bytes"
	"encoding/binary"
	"encoding/xml"
	"math"
	"strings"
	"testing"

	"heatskin/mesh"
)

// vtuHead is what the XML part of a grid declares, read with Go's own XML reader.
type vtuHead struct {
	Type      string `xml:"type,attr"`
	ByteOrder string `xml:"byte_order,attr"`
	Header    string `xml:"header_type,attr"`
	Piece     struct {
		Points int        `xml:"NumberOfPoints,attr"`
		Cells  int        `xml:"NumberOfCells,attr"`
		Fields []vtuArrow `xml:"PointData>DataArray"`
		Places []vtuArrow `xml:"Points>DataArray"`
		Mesh   []vtuArrow `xml:"Cells>DataArray"`
	} `xml:"UnstructuredGrid>Piece"`
}

type vtuArrow struct {
	Type   string `xml:"type,attr"`
	Name   string `xml:"Name,attr"`
	Format string `xml:"format,attr"`
	Offset int    `xml:"offset,attr"`
}

// The layout is that of the VTK User's Guide, "VTK File Formats": an array's offset
// counts from behind the underscore to its length in bytes (UInt64 here), its data follow.
func TestWriteVTU(t *testing.T) {
	m := &mesh.Mesh{
		Positions: []float64{0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 0.1},
		Triangles: []int32{0, 1, 2, 0, 3, 1},
	}
	columns := []Column{
		{"distance", []float64{0, 1, math.Inf(1), 0.1}},
		{"a<b & \"c\"", []float64{math.NaN(), -1, 5e-324, math.MaxFloat64}},
	}
	var b bytes.Buffer
	if err := WriteVTU(&b, m, columns); err != nil {
		t.Fatal(err)
	}
	text, data, found := bytes.Cut(b.Bytes(), []byte("<AppendedData encoding=\"raw\">\n_"))
	if !found {
		t.Fatalf("no appended data in %q", b.String())
	}
	var head vtuHead
	if err := xml.Unmarshal(append(bytes.Clone(text), "</VTKFile>"...), &head); err != nil {
		t.Fatal(err)
	}
	if head.Type != "UnstructuredGrid" || head.ByteOrder != "LittleEndian" || head.Header != "UInt64" {
		t.Errorf("head %+v", head)
	}
	piece := head.Piece
	if piece.Points != 4 || piece.Cells != 2 || len(piece.Fields) != 2 || len(piece.Places) != 1 || len(piece.Mesh) != 3 {
		t.Fatalf("piece %+v", piece)
	}
	raw := func(a vtuArrow, kind string) []byte {
		if a.Type != kind || a.Format != "appended" {
			t.Errorf("array %+v, want %s appended", a, kind)
		}
		size := int(binary.LittleEndian.Uint64(data[a.Offset:]))
		return data[a.Offset+8 : a.Offset+8+size]
	}
	checkFloats := func(a vtuArrow, want []float64) {
		got := raw(a, "Float64")
		if len(got) != 8*len(want) {
			t.Fatalf("%s: %d bytes, want %d", a.Name, len(got), 8*len(want))
		}
		for i, x := range want {
			if bits := binary.LittleEndian.Uint64(got[8*i:]); bits != math.Float64bits(x) {
				t.Errorf("%s[%d] is %v, want %v", a.Name, i, math.Float64frombits(bits), x)
			}
		}
	}
	for i, c := range columns {
		if piece.Fields[i].Name != c.Name {
			t.Errorf("field %q, want %q", piece.Fields[i].Name, c.Name)
		}
		checkFloats(piece.Fields[i], c.Values)
	}
	checkFloats(piece.Places[0], m.Positions)
	corners := raw(piece.Mesh[0], "Int32")
	for i, v := range m.Triangles {
		if got := binary.LittleEndian.Uint32(corners[4*i:]); got != uint32(v) {
			t.Errorf("corner %d is %d, want %d", i, got, v)
		}
	}
	if got := raw(piece.Mesh[1], "Int64"); !bytes.Equal(got, []byte{3, 0, 0, 0, 0, 0, 0, 0, 6, 0, 0, 0, 0, 0, 0, 0}) {
		t.Errorf("ends %v", got)
	}
	if got := raw(piece.Mesh[2], "UInt8"); !bytes.Equal(got, []byte{5, 5}) {
		t.Errorf("cell types %v, want triangles (5)", got)
	}
	if tail := "\n</AppendedData>\n</VTKFile>\n"; !strings.HasSuffix(b.String(), tail) {
		t.Errorf("the file does not end in %q", tail)
	}
}
