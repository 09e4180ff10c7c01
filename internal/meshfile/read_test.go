package meshfile_test

import (
	"bytes"
	"compress/gzip"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"runtime"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/hschendel/stl"

	"heatskin/internal/meshfile"
)

func read(file []byte, name, format string, want ...string) (*meshfile.Soup, error) {
	return meshfile.Read(context.Background(), bytes.NewReader(file), name, format, want...)
}

func zipped(t *testing.T, file []byte) []byte {
	t.Helper()
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	if _, err := z.Write(file); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// corners lists a soup's triangles by the places of their corners.
func corners(soup *meshfile.Soup) (all [][3]float64) {
	for _, v := range soup.Triangles {
		all = append(all, [3]float64(soup.Positions[3*v:3*v+3]))
	}
	return all
}

var (
	cornerPositions = []float64{0, 0, 0, 1, 0, 0, 0, 2, 0, 0, 0, -4.5} // exact in single precision
	cornerTriangles = []int32{0, 2, 1, 0, 1, 3, 1, 2, 3, 2, 0, 3}
)

// A tetrahedron written by hand in every dialect must be the same one from each.
// The layouts are those of the descriptions that the package comment names.
func TestDialects(t *testing.T) {
	ascii := string(asciiSTL(cornerPositions, cornerTriangles))
	solid := func(from, to int) string { return string(asciiSTL(cornerPositions, cornerTriangles[from:to])) }
	begun := binarySTL(cornerPositions, cornerTriangles)
	copy(begun, "solid but binary\n facet normal")
	plain := binarySTL(cornerPositions, cornerTriangles)
	plyRest := "0 0 0\n1 0 0\n0 2 0\n0 0 -4.5\n3 0 2 1\n3 0 1 3\n3 1 2 3\n3 2 0 3\n"
	plyHead := "ply\nformat ascii 1.0\ncomment by hand\nelement vertex 4\nproperty float x\nproperty float y\nproperty float z\nelement face 4\nproperty list uchar int vertex_indices\nend_header\n"
	bom := "\xef\xbb\xbf"
	for _, tc := range []struct {
		name, format string
		file         string
		indexed      bool
	}{
		{"stl-binary", "stl", string(plain), false},
		{"stl-binary-begins-with-solid", "stl", string(begun), false},
		{"stl-ascii", "stl", ascii, false},
		{"stl-ascii-crlf", "stl", strings.ReplaceAll(ascii, "\n", "\r\n"), false},
		{"stl-ascii-cr", "stl", strings.ReplaceAll(ascii, "\n", "\r"), false},
		{"stl-ascii-upper-case", "stl", strings.ToUpper(ascii), false},
		{"stl-ascii-blank-lines-and-comments", "stl", bom + "\n# made by hand\n// and again\n" + strings.ReplaceAll(ascii, "\n", "\n\n ; so\n"), false},
		{"stl-ascii-nameless", "stl", strings.ReplaceAll(ascii, " sheet", ""), false},
		{"stl-ascii-no-facet-normal", "stl", strings.ReplaceAll(ascii, "0.000000e+00 0.000000e+00 1.000000e+00", "-nan(ind) nan nan"), false},
		{"stl-ascii-several-solids", "stl", solid(0, 3) + "\n" + solid(3, 9) + solid(9, 12), false},
		{"stl-ascii-name-with-control-bytes", "stl", strings.Replace(ascii, "sheet", "sh\x00\x01et", 1), false},
		{"stl-ascii-one-line", "stl", strings.Replace(strings.Join(strings.Fields(ascii), " "), "sheet", "sheet\n", 1), false},
		{"ply-ascii", "ply", plyHead + plyRest, true},
		{"ply-ascii-crlf", "ply", strings.ReplaceAll(plyHead+plyRest, "\n", "\r\n"), true},
		{"ply-ascii-cr", "ply", strings.ReplaceAll(plyHead+plyRest, "\n", "\r"), true},
		{"ply-vertex_index", "ply", strings.Replace(plyHead, "vertex_indices", "vertex_index", 1) + plyRest, true},
		{"obj", "obj", "# by hand\nmtllib a b.mtl\no part\nv 0 0 0\nv 1 0 0 0.5 0.5 0.5\nv 0 2 0\nv 0 0 -4.5 1\nvn 0 0 1\nvt 0 0\n" +
			"s off\nusemtl red\nf 1 3 2\nf 1/1 2/1 4/1\nf 2//1 3//1 4//1\nf 3/1/1 1/1/1 4/1/1\nl 1 2\n", true},
		{"obj-negative", "obj", "v 0 0 0\nv 1 0 0\nv 0 2 0\nf -3 -1 -2\nv 0 0 -4.5\nf -4 -3 -1\nf -3//-1 -2//-1 -1//-1\nf -2/-1 -4/-1 -1/-1\n", true},
		{"obj-continued", "obj", "# no line goes on behind this: \\\nv 0 \\\n0 0\nv 1 0\\\r\n 0\ncall a \\\nf 9 9 9\nv 0 2 0\nv 0 0 -4.5\nf 1 3 \\\n2\nf 1 2 4\nf 2 3 4\nf 3 1 4", true},
		{"obj-faces-first", "obj", "g a\nf 1 3 2\nf 1 2 4\nf 2 3 4\nf 3 1 4\nv 0 0 0\nv 1 0 0\nv 0 2 0\nv 0 0 -4.5", true},
		{"off", "off", "OFF\n4 4 6\n0 0 0\n1 0 0\n0 2 0\n0 0 -4.5\n3 0 2 1\n3 0 1 3\n3 1 2 3\n3 2 0 3\n", true},
		{"off-counts-beside-header", "off", "OFF 4 4\n0 0 0\n1 0 0\n\n0 2 0 # comment\n0 0 -4.5\n3 0 2 1\n3 0 1 3\n3 1 2 3\n3 2 0 3", true},
		{"off-coloured", "off", "# by hand\nCOFF\n# counts\n4 4 0\n0 0 0 255 0 0 255\n1 0 0 1 1 1 1\n0 2 0 0 0 0 1\n0 0 -4.5 0 0 0 1\n3 0 2 1 255 0 0\n3 0 1 3\n3 1 2 3 0.5 0.5 0.5 1\n3 2 0 3 7\n", true},
		{"off-normals-and-textures", "off", "STCNOFF\r\n4 4 0\r\n0 0 0 0 0 1 1 1 1 1 0 0\r\n1 0 0\r\n0 2 0\r\n0 0 -4.5\r\n3 0 2 1\r\n3 0 1 3\r\n3 1 2 3\r\n3 2 0 3\r\n", true},
	} {
		t.Run(tc.name, func(t *testing.T) {
			for _, way := range []string{"plain", "gzip", "bytewise"} {
				var r io.Reader = strings.NewReader(tc.file)
				switch way {
				case "gzip":
					r = bytes.NewReader(zipped(t, []byte(tc.file)))
				case "bytewise":
					r = iotest.OneByteReader(r)
				}
				soup, err := meshfile.Read(context.Background(), r, "part.dat", "")
				if err != nil {
					t.Fatalf("%s: %v", way, err)
				}
				if len(soup.Warnings) > 0 || soup.Format != tc.format || soup.Indexed != tc.indexed {
					t.Errorf("%s: warnings %q, format %s, indexed %v", way, soup.Warnings, soup.Format, soup.Indexed)
				}
				want := corners(&meshfile.Soup{Positions: cornerPositions, Triangles: cornerTriangles})
				if !slices.Equal(corners(soup), want) {
					t.Errorf("%s: got %v, want %v", way, corners(soup), want)
				}
			}
		})
	}
}

// github.com/hschendel/stl is a second opinion on both STL variants.
func TestSTLAgainstLibrary(t *testing.T) {
	positions, triangles := wavyGrid(20)
	for name, file := range map[string][]byte{
		"binary": binarySTL(positions, triangles), "ascii": asciiSTL(positions, triangles),
	} {
		theirs, err := stl.ReadAll(bytes.NewReader(file))
		if err != nil {
			t.Fatal(err)
		}
		var want [][3]float64
		for _, triangle := range theirs.Triangles {
			for _, v := range triangle.Vertices {
				want = append(want, [3]float64{float64(v[0]), float64(v[1]), float64(v[2])})
			}
		}
		ours, err := read(file, name, "")
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(corners(ours), want) {
			t.Errorf("%s: our triangles differ from the library's", name)
		}
		for _, ascii := range []bool{false, true} { // and what the library writes
			var b bytes.Buffer
			theirs.IsAscii = ascii
			if err := theirs.WriteAll(&b); err != nil {
				t.Fatal(err)
			}
			again, err := read(b.Bytes(), name, "")
			if err != nil {
				t.Fatal(err)
			}
			if !slices.Equal(corners(again), want) {
				t.Errorf("%s, written by the library (ASCII: %v): our triangles differ", name, ascii)
			}
		}
	}
}

// A PLY of every type, either byte order, properties and elements in any order.
func TestPLYTypes(t *testing.T) {
	types := []string{"char", "uchar", "short", "ushort", "int", "uint", "float", "double",
		"int8", "uint8", "int16", "uint16", "int32", "uint32", "float32", "float64"}
	put := func(b []byte, order binary.AppendByteOrder, kind string, v float64) []byte {
		switch kind {
		case "char", "int8", "uchar", "uint8":
			return append(b, byte(int(v)))
		case "short", "int16", "ushort", "uint16":
			return order.AppendUint16(b, uint16(int(v)))
		case "int", "int32", "uint", "uint32":
			return order.AppendUint32(b, uint32(int(v)))
		case "float", "float32":
			return order.AppendUint32(b, math.Float32bits(float32(v)))
		}
		return order.AppendUint64(b, math.Float64bits(v))
	}
	places := []float64{0, 0, 0, 100, 0, 0, 100, 100, 0, 0, 100, 50} // fit every type
	heat := []float64{1, 2, 3, 4}
	for i, kind := range types {
		index := types[i%6]
		head := "element camera 2\nproperty list ushort %[1]s angles\nproperty %[1]s zoom\n" +
			"element vertex 4\nproperty %[1]s heat\nproperty %[1]s z\nproperty list uchar short odd\nproperty uchar red\nproperty %[1]s x\nproperty %[1]s y\n" +
			"element empty 4000000000\nelement face 2\nproperty float quality\nproperty list %[2]s %[2]s vertex_indices\nproperty list uchar double more\n" +
			"element tail 3\nproperty int a\nproperty double b\nend_header\n"
		head = fmt.Sprintf(head, kind, index)
		for name, order := range map[string]binary.AppendByteOrder{
			"binary_little_endian": binary.LittleEndian, "binary_big_endian": binary.BigEndian,
		} {
			b := []byte("ply\nformat " + name + " 1.0\n" + head)
			for range 2 { // cameras
				b = put(b, order, "ushort", 3)
				for range 4 {
					b = put(b, order, kind, 7)
				}
			}
			for v := range 4 {
				b = put(b, order, kind, heat[v])
				b = put(b, order, kind, places[3*v+2])
				b = put(b, order, "uchar", float64(v))
				for range v {
					b = put(b, order, "short", -3)
				}
				b = put(b, order, "uchar", 200)
				b = put(b, order, kind, places[3*v])
				b = put(b, order, kind, places[3*v+1])
			}
			for _, face := range [][]float64{{0, 1, 2}, {0, 2, 3}} {
				b = put(b, order, "float", 0.5)
				b = put(b, order, index, 3)
				for _, v := range face {
					b = put(b, order, index, v)
				}
				b = put(b, order, "uchar", 1)
				b = put(b, order, "double", 2)
			}
			b = append(b, make([]byte, 3*12)...)
			soup, err := read(b, "all.ply", "", "heat", "x", "lacking", "odd")
			if err != nil {
				t.Fatalf("%s, %s: %v", kind, name, err)
			}
			if len(soup.Warnings) > 0 || !slices.Equal(soup.Positions, places) || !slices.Equal(soup.Triangles, []int32{0, 1, 2, 0, 2, 3}) {
				t.Errorf("%s, %s: got %v %v, warnings %q", kind, name, soup.Positions, soup.Triangles, soup.Warnings)
			}
			if got := soup.Properties; len(got) != 2 || !slices.Equal(got["heat"], heat) || !slices.Equal(got["x"], []float64{0, 100, 100, 0}) {
				t.Errorf("%s, %s: properties %v", kind, name, got)
			}
			for cut := range b { // truncated anywhere: an error, never a mesh
				if kind != "short" && kind != "double" {
					break // two kinds suffice
				}
				if _, err := read(b[:cut], "all.ply", ""); err == nil {
					t.Fatalf("%s, %s: cut to %d of %d bytes and accepted", kind, name, cut, len(b))
				}
			}
		}
	}
}

// Where a header's lines end in a lone CR, a first data byte that looks like LF is data.
func TestPLYLineEndsBeforeData(t *testing.T) {
	head := "ply\nformat binary_little_endian 1.0\nelement vertex 3\nproperty uchar u\nproperty char x\nproperty char y\nproperty char z\n" +
		"element face 1\nproperty list uchar uchar vertex_indices\nend_header\n"
	data := "\n\x00\x00\x00\x01\x01\x00\x00\x02\x00\x01\x00\x03\x00\x01\x02"
	for _, end := range []string{"\n", "\r\n", "\r"} {
		soup, err := read([]byte(strings.ReplaceAll(head, "\n", end)+data), "ends.ply", "", "u")
		if err != nil {
			t.Errorf("lines that end in %q: %v", end, err)
			continue
		}
		if !slices.Equal(soup.Properties["u"], []float64{10, 1, 2}) || len(soup.Warnings) > 0 {
			t.Errorf("lines that end in %q: u = %v, warnings %q", end, soup.Properties["u"], soup.Warnings)
		}
	}
}

// The cube of Turk's description of 1994 (from memory: 8 vertices, 6 quadrilaterals,
// here with the properties mixed up), as text: six faces of area 1 (12 triangles).
func TestPLYTextOfQuads(t *testing.T) {
	const cube = `ply
format ascii 1.0
comment made by hand
obj_info six sides
element vertex 8
property float x
property float y
property float z
property list uchar int near
property float u
element face 6
property uchar red
property list uchar int vertex_index
element edge 1
property int a
property int b
end_header
0 0 0  0  1
0 0 1  2 5 6  nan
0 1 1  0  -inf
0 1 0  0  4
1 0 0  0  5
1 0 1  0  6
1 1 1  0  7
1 1 0  0  1e3
255 4 0 1 2 3
255 4 7 6 5 4
255 4 0 4 5 1
255 4 1 5 6 2
255 4 2 6 7 3
255 4 3 7 4 0
0 1
`
	soup, err := read([]byte(cube), "cube.ply", "", "u")
	if err != nil {
		t.Fatal(err)
	}
	area := 0.0
	all := corners(soup)
	for f := 0; f < len(all); f += 3 {
		var a, b [3]float64
		for i := range 3 {
			a[i], b[i] = all[f+1][i]-all[f][i], all[f+2][i]-all[f][i]
		}
		area += math.Sqrt(math.Pow(a[1]*b[2]-a[2]*b[1], 2)+math.Pow(a[2]*b[0]-a[0]*b[2], 2)+math.Pow(a[0]*b[1]-a[1]*b[0], 2)) / 2
	}
	if len(all) != 36 || area != 6 { // halves and ones: exact
		t.Errorf("%d corners, area %v", len(all), area)
	}
	if u := soup.Properties["u"]; len(u) != 8 || !math.IsNaN(u[1]) || !math.IsInf(u[2], -1) || u[7] != 1000 {
		t.Errorf("u = %v", u)
	}
}

// What is wrong, where, what belongs there, and what stood there.
func TestRefusals(t *testing.T) {
	stlBytes := binarySTL(cornerPositions, cornerTriangles)
	damaged := func(at int, bytes ...byte) string {
		b := slices.Clone(stlBytes)
		copy(b[at:], bytes)
		return string(b)
	}
	packed := zipped(t, asciiSTL(wavyGrid(20)))
	flipped := slices.Clone(packed)
	flipped[len(flipped)-6] ^= 1 // in the checksum
	facet := "solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\nvertex 1 0 0\nvertex 0 1 0\nendloop\nendfacet\n"
	ply := "ply\nformat ascii 1.0\nelement vertex 3\nproperty float x\nproperty float y\nproperty float z\nelement face 1\nproperty list uchar int vertex_indices\nend_header\n0 0 0\n1 0 0\n0 1 0\n"
	plyb := "ply\nformat binary_little_endian 1.0\nelement vertex 1\nproperty float x\nproperty float y\nproperty float z\nelement face 1\nproperty list char int vertex_indices\nend_header\n"
	for _, tc := range []struct{ name, file, format, want string }{
		{"a.stl", "", "", "a.stl: byte 0: want a mesh (STL, PLY, OBJ or OFF), got an empty file"},
		{"-", "\xef\xbb\xbf", "", `-:1: want a mesh (STL "solid", PLY "ply", OFF "OFF", or OBJ statements), got end of file`},
		{"a.txt", "\n\nDear Sir,\n", "", `a.txt:3: want a mesh (STL "solid", PLY "ply", OFF "OFF", or OBJ statements), got "Dear"`},
		{"a.stl", "Dear Sir,\n", "", `a.stl:1: want "solid", got "Dear"`},
		{"a.ply", "Dear Sir,\n", "", `a.ply:1: want "ply", got "Dear"`},
		{"a.OFF.gz", "Dear Sir,\n", "", `a.OFF.gz:1: want the number of vertices, 0 to 2147483647, got "Dear"`},
		{"-", "Dear Sir,\n", "off", `-:1: want the number of vertices, 0 to 2147483647, got "Dear"`},
		{"a.obj", "\x01\x02\x03\x04", "", `a.obj: byte 0: want the text that begins a file named .obj, got "\x01\x02\x03\x04"`},
		{"a.obj", "Dear Sir,\n", "", "a.obj: want at least one triangle, got none (OBJ file with 0 vertices)"},
		{"-", "solid", "step", `want a mesh format out of stl, ply, obj, off, got "step"`},
		{"a.stl", "\x00\x01\x02", "", "a.stl: byte 3: want the 84 bytes that begin a binary STL file, got end of file after 3 bytes"},
		{"a.stl", string(stlBytes[:200]), "", "a.stl: byte 200: want triangle 3 of the 4 that the header declares, got end of file 16 bytes into it"},
		{"a.stl", damaged(80, 0xff, 0xff, 0xff, 0xff), "", "a.stl: byte 80: want a count of at most 715827882 triangles in a binary STL file, got 4294967295"},
		{"a.stl", damaged(80, 0, 0, 0, 0x20), "", "a.stl: byte 284: want triangle 5 of the 536870912 that the header declares, got end of file 0 bytes into it"},
		{"a.stl", damaged(80, 0), "", "a.stl: want at least one triangle, got none (STL file with 0 vertices)"},
		{"a.stl", damaged(84+50+12+16, 0, 0, 0xc0, 0x7f), "", "a.stl: byte 162: want a finite y of corner 2 of triangle 2, got NaN"},
		{"a.stl", damaged(84+12+32, 0, 0, 0x80, 0xff), "", "a.stl: byte 128: want a finite z of corner 3 of triangle 1, got -Inf"},
		{"a.stl", facet, "", `a.stl:9: want "facet" or "endsolid", got end of file`},
		{"a.stl", facet + "endsolid\nsold b\n", "", `a.stl:10: want "solid", got "sold"`},
		{"a.stl", facet[:len(facet)-9] + "facet", "", `a.stl:8: want "endfacet", got "facet"`},
		{"a.stl", strings.Replace(facet, "outer", "inner", 1), "", `a.stl:3: want "outer loop", got "inner"`},
		{"a.stl", strings.Replace(facet, "loop", "lop", 1), "", `a.stl:3: want "loop", got "lop"`},
		{"a.stl", strings.Replace(facet, "normal", "noraml", 1), "", `a.stl:2: want "normal", got "noraml"`},
		{"a.stl", strings.Replace(facet, "vertex 1 0 0", "vertx 1 0 0", 1), "", `a.stl:5: want "vertex" or "endloop", got "vertx"`},
		{"a.stl", strings.Replace(facet, "1 0 0", "1,0 0 0", 1), "", `a.stl:5: want the vertex's x, got "1,0"`},
		{"a.stl", strings.Replace(facet, "1 0 0", "1 0", 1), "", `a.stl:5: want the vertex's z, got end of line`},
		{"a.stl", strings.Replace(facet, "1 0 0", "1 1e39 0", 1), "", `a.stl:5: want the vertex's y, got "1e39", which is not finite in single precision`},
		{"a.stl", "solid a\nendsolid a\n", "", "a.stl: want at least one triangle, got none (STL file with 0 vertices)"},
		{"a.ply", "ply\nformat ascii 2.0\n", "", `a.ply:2: want version 1.0, got "2.0"`},
		{"a.ply", "ply\nformat text 1.0\n", "", `a.ply:2: want the format ascii, binary_little_endian or binary_big_endian, got "text"`},
		{"a.ply", "ply\nelement vertex 3\n", "", `a.ply:3: want "end_header", got end of file`},
		{"a.ply", "ply\nend_header\n", "", `a.ply:2: want "format", got "end_header"`},
		{"a.ply", "ply\nproperty float x\n", "", `a.ply:2: want "element" before "property", got "property"`},
		{"a.ply", "ply\nelement vertex 4000000000\n", "", `a.ply:2: want the number of "vertex" elements, 0 to 2147483647, got "4000000000"`},
		{"a.ply", "ply\nelement vertex -1\n", "", `a.ply:2: want the number of "vertex" elements, 0 to 2147483647, got "-1"`},
		{"a.ply", "ply\nelement vertex 1\nproperty half x\n", "", `a.ply:3: want a type (char, uchar, short, ushort, int, uint, float or double), got "half"`},
		{"a.ply", "ply\nelement vertex 1\nproperty list float int x\n", "", `a.ply:3: want an integer type for the list's length, got "float"`},
		{"a.ply", "ply\nelement vertex 1\nproperty int x\nproperty int x\n", "", `a.ply:4: want another property (it is declared already), got "x"`},
		{"a.ply", "ply\nelement vertex 1\nelement vertex 1\n", "", `a.ply:3: want another element (it is declared already), got "vertex"`},
		{"a.ply", "ply\nvertex 1\n", "", `a.ply:2: want "element", "property", "comment" or "end_header", got "vertex"`},
		{"a.ply", "ply\nformat ascii 1.0\nend_header\n", "", `a.ply:1: want an "element vertex" in the header, got none`},
		{"a.ply", "ply\nformat ascii 1.0\nelement vertex 1\nproperty float x\nend_header\n", "", `a.ply:3: want a scalar property "y" in the element vertex, got none`},
		{"a.ply", strings.Replace(ply, "vertex_indices", "corners", 1), "", `a.ply:7: want an integer list "vertex_indices" or "vertex_index" in the element face, got none`},
		{"a.ply", ply, "", `a.ply:13: want face 0 of the 1 that the header declares, got end of file`},
		{"a.ply", ply + "3 0 1 3\n", "", `a.ply:13: want a vertex number from 0 to 2, got "3"`},
		{"a.ply", ply + "3 0 1\n", "", `a.ply:13: want a vertex number from 0 to 2, got end of line`},
		{"a.ply", ply + "-3 0 1\n", "", `a.ply:13: want the number of corners of face 0, got "-3"`},
		{"a.ply", strings.Replace(ply, "1 0 0", "1 inf 0", 1), "", `a.ply:11: want the y of vertex 1, got "inf", which is not finite`},
		{"a.ply", strings.Replace(ply, "element face 1", "element face 0", 1), "", "a.ply: want at least one triangle, got none (PLY file with 3 vertices)"},
		{"a.ply", plyb, "", "a.ply: byte " + fmt.Sprint(len(plyb)+0) + ": want vertex 0 of the 1 that the header declares, got end of file"},
		{"a.ply", plyb + "\x00\x00\x00\x00\x00\x00\xc0\x7f", "", "a.ply: byte " + fmt.Sprint(len(plyb)+8) + ": want vertex 0 of the 1 that the header declares, got end of file"},
		{"a.ply", plyb + "\x00\x00\x00\x00\x00\x00\xc0\x7f\x00\x00\x00\x00", "", "a.ply: byte " + fmt.Sprint(len(plyb)+4) + ": want a finite y of vertex 0, got NaN"},
		{"a.ply", plyb + strings.Repeat("\x00", 12) + "\xff", "", "a.ply: byte " + fmt.Sprint(len(plyb)+12) + ": want the number of corners of face 0 of the 1 that the header declares, got -1"},
		{"a.ply", plyb + strings.Repeat("\x00", 12) + "\x03\x00\x00\x00\x00\x00\x01\x00\x00", "", "a.ply: byte " + fmt.Sprint(len(plyb)+21) + ": want 3 more corners of face 0, got end of file"},
		{"a.ply", plyb + strings.Repeat("\x00", 12) + "\x03\x00\x00\x00\x00\x00\x01\x00\x00\x00\x00\x00\x00", "", "a.ply: byte " + fmt.Sprint(len(plyb)+17) + ": want a vertex number from 0 to 0, got 256"},
		{"a.obj", "v 0 0 0\nv 1 0\n", "", "a.obj:2: want the z of vertex 2, got end of line"},
		{"a.obj", "v 0 0 0\nf 1 2 x\n", "", `a.obj:2: want a vertex number, 1 or more or down to -1, got "x"`},
		{"a.obj", "v 0 0 0\nf 0 1 1\n", "", `a.obj:2: want a vertex number, 1 or more or down to -1, got "0"`},
		{"a.obj", "v 0 0 0\nf 1 1 -2\n", "", `a.obj:2: want a vertex number, 1 or more or down to -1, got "-2"`},
		{"a.obj", "v 0 0 0\nf 1/2/3/4 1 1\n", "", `a.obj:2: want a vertex number, 1 or more or down to -1, got "1/2/3/4"`},
		{"a.obj", "v 0 0 0\nf 1 1 1\nf 1 7 1\nv 1 1 1\n", "", `a.obj:3: want a vertex number from 1 to 2, got "7"`},
		{"a.obj", "v 0 0 0\nv 1 1 1\n", "", "a.obj: want at least one triangle, got none (OBJ file with 2 vertices)"},
		{"a.off", "4OFF\n", "", `a.off:1: want an OFF file in three dimensions, got "4OFF"`},
		{"a.off", "OFF BINARY\n", "", `a.off:1: want the ASCII variant of OFF, got "BINARY"`},
		{"a.off", "OFF\n3\n", "", "a.off:2: want the number of faces, 0 to 715827882, behind that of the vertices, got end of line"},
		{"a.off", "OFF\n4000000000 1 0\n", "", `a.off:2: want the number of vertices, 0 to 2147483647, got "4000000000"`},
		{"a.off", "OFF\n1 4000000000 0\n", "", `a.off:2: want the number of faces, 0 to 715827882, behind that of the vertices, got "4000000000"`},
		{"a.off", "OFF\n3 1 0\n0 0 0\n1 0 0\n", "", "a.off:5: want vertex 2 of the 3 that the header declares, got end of file"},
		{"a.off", "OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 0", "", "a.off:5: want face 0 of the 1 that the header declares, got end of file"},
		{"bad.off", "OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 0\n3 0 1 3\n", "", `bad.off:6: want a vertex number from 0 to 2, got "3"`},
		{"a.off", "OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 0\n-3 0 1 2\n", "", `a.off:6: want the number of corners of face 0, got "-3"`},
		{"a.stl.gz", string(packed[:len(packed)/2]), "", ""},
		{"a.stl.gz", string(flipped), "", ""},
		{"a.stl.gz", "\x1f\x8b\x08", "", "a.stl.gz: byte 3: want gzip data (bytes counted in the compressed file), got unexpected EOF"},
	} {
		_, err := read([]byte(tc.file), tc.name, tc.format)
		if err == nil {
			t.Errorf("%q is accepted; want %s", tc.file, tc.want)
			continue
		}
		if tc.want == "" && !strings.Contains(err.Error(), "want gzip data") || tc.want != "" && err.Error() != tc.want {
			t.Errorf("got  %v\nwant %s", err, tc.want)
		}
		var syntax *meshfile.SyntaxError
		var none *meshfile.NoTrianglesError
		var format *meshfile.FormatError
		if !errors.As(err, &syntax) && !errors.As(err, &none) && !errors.As(err, &format) {
			t.Errorf("%v is a %T", err, err)
		}
	}
}

func TestWarnings(t *testing.T) {
	ascii := string(asciiSTL(cornerPositions, cornerTriangles))
	off := "OFF\n4 3 0\n0 0 0\n1 0 0\n0 2 0\n0 0 -4.5\n3 0 2 1\n2 0 1\n3 1 2 3\n"
	ply := "ply\nformat ascii 1.0\nelement vertex 3\nproperty float x\nproperty float y\nproperty float z\nelement face 2\nproperty list uchar int vertex_indices\nend_header\n0 0 0\n1 0 0 9\n0 1 0\n3 0 1 2\n0\n"
	for _, tc := range []struct {
		file, format string
		triangles    int
		want         string
	}{
		{string(binarySTL(cornerPositions, cornerTriangles)) + "1234567", "", 4, "7 bytes after the last of 4 triangles are ignored"},
		{string(binarySTL(cornerPositions, cornerTriangles)), "obj", 4, "read as STL, which its content is, not as OBJ"},
		{ascii + "\x1a", "", 4, "what follows the last solid from line 31 on is ignored"},
		{strings.Replace(ascii, "    endloop", "vertex 1 1 1\nendloop", 1), "", 5, "facets of more than three corners (1) are split"},
		{strings.Replace(ascii, "      vertex 0.000000e+00 0.000000e+00 0.000000e+00\n", "", 1), "", 3, "faces of fewer than three corners (1, the first at line 7) are left out"},
		{"v 0 3 0\nv 2 -3 0\nv -3 1 0\nv 3 1 0\nv -2 -3 0\nf 1 4 3\nf 1 2 3 4 5\n", "", 4,
			"faces that cross themselves or are far from flat (1) come out as overlapping triangles, the first as those from 1 on"},
		{off, "", 2, "faces of fewer than three corners (1, the first at line 8) are left out"},
		{off + "\n 17\n", "", 2, "faces of fewer than three corners (1, the first at line 8) are left out; what follows the last face from line 11 on is ignored"},
		{ply, "", 1, "faces of fewer than three corners (1, the first at line 14) are left out; values beyond those that the header declares are ignored in lines of text (1 of them, from line 11 on)"},
		{ply + "\n4", "", 1, "faces of fewer than three corners (1, the first at line 14) are left out; values beyond those that the header declares are ignored in lines of text (1 of them, from line 11 on); what follows the last element from line 16 on is ignored"},
		{"v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1\nf 1 2\nf 1 2 3\nf\n", "", 1, "faces of fewer than three corners (3, the first at line 4) are left out"},
		{string(plyBytes(wavyGrid(1))) + "end", "", 2, "3 bytes after the last element are ignored"},
	} {
		soup, err := read([]byte(tc.file), "odd", tc.format)
		if err != nil {
			t.Errorf("%v; want a warning: %s", err, tc.want)
			continue
		}
		if got := strings.Join(soup.Warnings, "; "); got != tc.want || len(soup.Triangles) != 3*tc.triangles {
			t.Errorf("%d triangles, warnings %q; want %d, %q", len(soup.Triangles)/3, got, tc.triangles, tc.want)
		}
	}
}

// Equal points must have equal bits: no -0 from any format.
func TestNoNegativeZero(t *testing.T) {
	positions := []float64{math.Copysign(0, -1), 0, 0, 1, math.Copysign(0, -1), 0, 0, 1, math.Copysign(0, -1)}
	triangles := []int32{0, 1, 2}
	off := "OFF\n3 1 0\n-0 0 0\n1 -0.0 0\n0 1 -0e5\n3 0 1 2\n"
	for _, file := range [][]byte{binarySTL(positions, triangles), asciiSTL(positions, triangles), plyText(positions, triangles),
		plyBytes(positions, triangles), objText(positions, triangles), []byte(off)} {
		soup, err := read(file, "zero", "")
		if err != nil {
			t.Fatal(err)
		}
		for i, x := range soup.Positions {
			if math.Signbit(x) {
				t.Errorf("%s: coordinate %d is %v", soup.Format, i, x)
			}
		}
	}
}

// A promise must not claim memory: the headers here declare up to 2^31 of something
// and deliver next to nothing. The buffers take 2 MiB, gzip some hundred KiB.
func TestLyingHeadersClaimNoMemory(t *testing.T) {
	plyHead := "ply\nformat binary_big_endian 1.0\nelement vertex 2147483647\nproperty float x\nproperty float y\nproperty float z\nproperty float u\n"
	one := "ply\nformat binary_big_endian 1.0\nelement vertex 1\nproperty float x\nproperty float y\nproperty float z\n"
	zeros := strings.Repeat("\x00", 16)
	for name, file := range map[string]string{
		"stl":              strings.Repeat("\x01", 80) + "\x00\x00\x00\x2a" + strings.Repeat("\x00", 60),
		"ply-vertices":     plyHead + "end_header\n" + zeros,
		"ply-faces":        one + "element face 2147483647\nproperty list int int vertex_indices\nend_header\n" + zeros,
		"ply-corners":      one + "element face 1\nproperty list int int vertex_indices\nend_header\n" + zeros[:12] + "\x7f\xff\xff\xff",
		"ply-other-list":   one + "property list uint double w\nend_header\n" + zeros[:12] + "\xff\xff\xff\xff",
		"ply-other-rows":   one + "element far 9000000000000000000\nproperty double a\nproperty double b\nend_header\n" + zeros[:12],
		"ply-text":         strings.Replace(plyHead, "binary_big_endian", "ascii", 1) + "end_header\n1 2 3 4\n",
		"off":              "OFF\n2147483647 700000000 0\n0 0 0\n",
		"off-corners":      "OFF\n1 1 0\n0 0 0\n999999999999 0 0 0\n",
		"obj-far-corner":   "v 0 0 0\nf 1 2147483646 1\n",
		"gzip-of-comments": string(zipped(t, append([]byte("v 0 0 0\n"), bytes.Repeat([]byte("# nothing at all, and no end of it\n    \n\r"), 1<<18)...))),
		"gzip-of-blanks":   string(zipped(t, append([]byte("OFF\n1 1 0\n0 0 0\n"), bytes.Repeat([]byte(" "), 1<<23)...))),
		"gzip-of-a-word":   string(zipped(t, append([]byte("OFF\n1 1 0\n0 0 "), bytes.Repeat([]byte("7"), 1<<23)...))),
		"gzip-of-a-name":   string(zipped(t, append([]byte("solid "), bytes.Repeat([]byte("name"), 1<<21)...))),
	} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, err := meshfile.Read(context.Background(), pipe{bytes.NewReader([]byte(file))}, "-", "")
		runtime.ReadMemStats(&after)
		if err == nil {
			t.Errorf("%s: accepted", name)
		}
		if claimed := after.TotalAlloc - before.TotalAlloc; claimed > 4<<20 {
			t.Errorf("%s: %d bytes allocated for a file of %d (%v)", name, claimed, len(file), err)
		}
	}
}

// Reading allocates by the doubling of slices, never by the triangle.
func TestNoGarbagePerTriangle(t *testing.T) {
	for name, file := range map[string][]byte{
		"stl": binarySTL(wavyGrid(100)), "stl-ascii": asciiSTL(wavyGrid(100)), "ply-ascii": plyText(wavyGrid(100)),
		"ply": plyBytes(wavyGrid(100)), "obj": objText(wavyGrid(100)),
	} {
		allocations := testing.AllocsPerRun(1, func() {
			if _, err := read(file, name, ""); err != nil {
				t.Fatal(err)
			}
		})
		if allocations > 200 { // 20 000 triangles
			t.Errorf("%s: %v allocations", name, allocations)
		}
	}
}

// A reader that fails after so many bytes, or at which the context ends.
type breaking struct {
	r     io.Reader
	after int
	err   error
	stop  func()
}

func (b *breaking) Read(p []byte) (int, error) {
	if b.after <= 0 {
		if b.stop == nil {
			return 0, b.err
		}
		b.stop()
	}
	n, err := b.r.Read(p[:min(len(p), 1<<16)])
	b.after -= n
	return n, err
}

func TestInterruptedAndBrokenReads(t *testing.T) {
	plain := asciiSTL(wavyGrid(100))
	broken := errors.New("the disk is gone")
	for name, file := range map[string][]byte{"plain": plain, "gzip": zipped(t, plain)} {
		_, err := meshfile.Read(context.Background(), &breaking{r: bytes.NewReader(file), after: len(file) / 2, err: broken}, "a.stl", "")
		if !errors.Is(err, broken) || !strings.HasPrefix(err.Error(), "a.stl: byte ") || strings.Count(err.Error(), "byte") != 1 {
			t.Errorf("%s: broken read gave %v", name, err)
		}
		ctx, stop := context.WithCancel(context.Background())
		_, err = meshfile.Read(ctx, &breaking{r: bytes.NewReader(file), after: len(file) / 2, stop: stop}, "a.stl", "")
		if err != context.Canceled {
			t.Errorf("%s: interrupted read gave %v", name, err)
		}
		stop()
	}
	idle := &breaking{r: idleReader{}, after: 1}
	if _, err := meshfile.Read(context.Background(), idle, "-", "stl"); !errors.Is(err, io.ErrNoProgress) {
		t.Errorf("a reader that gives nothing: %v", err)
	}
}

type idleReader struct{}

func (idleReader) Read([]byte) (int, error) { return 0, nil }
