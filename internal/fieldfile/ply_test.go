package fieldfile

import (
	"bytes"
	"context"
	"encoding/binary"
	"math"
	"slices"
	"strings"
	"testing"

	"heatskin/internal/meshfile"
	"heatskin/mesh"
)

// The bytes, one after another, as Turk's description lays them out.
func TestPLYLayout(t *testing.T) {
	m := &mesh.Mesh{Positions: []float64{0, 0, 0, 1, 0, 0.1, 0, 1, 0, 5, 5, 5}, Triangles: []int32{0, 1, 2, 2, 1, 3}}
	var b bytes.Buffer
	err := WritePLY(&b, m, []Column{{"u t=½", []float64{2, math.NaN(), 1, math.Inf(1)}}, {"x", []float64{9, 8, 7, 6}}, {"", make([]float64, 4)}})
	if err != nil {
		t.Fatal(err)
	}
	const head = `ply
format binary_little_endian 1.0
comment property u_t=_ holds "u t=\u00bd"
comment property x_ holds "x"
comment property _ holds ""
comment colours run from u_t=_ = 1 to 2
element vertex 4
property double x
property double y
property double z
property double u_t=_
property double x_
property double _
property uchar red
property uchar green
property uchar blue
element face 2
property list uchar int vertex_indices
end_header
`
	text, data, _ := strings.Cut(b.String(), "end_header\n")
	if text+"end_header\n" != head {
		t.Errorf("header\n%s\nwant\n%s", text, head)
	}
	type vertex struct {
		X, Y, Z, U, X2, Empty float64
		Colour                Colour
	}
	type face struct {
		Corners uint8
		Corner  [3]int32
	}
	var vertices [4]vertex
	var faces [2]face
	r := strings.NewReader(data)
	if err := binary.Read(r, binary.LittleEndian, &vertices); err != nil {
		t.Fatal(err)
	}
	if err := binary.Read(r, binary.LittleEndian, &faces); err != nil || r.Len() > 0 {
		t.Fatalf("%v, %d bytes left", err, r.Len())
	}
	if faces != [2]face{{3, [3]int32{0, 1, 2}}, {3, [3]int32{2, 1, 3}}} {
		t.Errorf("faces %v", faces)
	}
	if v := vertices[1]; v.X != 1 || v.Z != 0.1 || !math.IsNaN(v.U) || v.X2 != 8 || v.Colour != NoValue {
		t.Errorf("vertex 1: %v", v)
	}
	if vertices[0].Colour != ColourAt(1) || vertices[2].Colour != ColourAt(0) || vertices[3].Colour != NoValue {
		t.Errorf("colours of the ends: %v", vertices)
	}
}

// What is written is read back to the last bit, block limits and all.
func TestPLYReadsBack(t *testing.T) {
	m := cloud(2*blockRows + 3)
	field := m.Positions[:m.NumVertices()]
	for _, columns := range [][]Column{nil, {{"u", field}}} {
		var b bytes.Buffer
		if err := WritePLY(&b, m, columns); err != nil {
			t.Fatal(err)
		}
		soup, err := meshfile.Read(context.Background(), &b, "field.ply", "", "u")
		if err != nil {
			t.Fatal(err)
		}
		if len(soup.Warnings) > 0 || !slices.Equal(soup.Positions, m.Positions) || !slices.Equal(soup.Triangles, m.Triangles) {
			t.Errorf("the mesh differs; warnings %q", soup.Warnings)
		}
		if columns != nil && !slices.Equal(soup.Properties["u"], field) {
			t.Error("the field differs")
		}
	}
}

// OKLab of the primaries of sRGB, from memory as CSS Color 4's sample code gives
// them, to the digits quoted.
func TestOKLabOfPrimaries(t *testing.T) {
	for _, tc := range []struct{ lab, linear [3]float64 }{
		{[3]float64{1, 0, 0}, [3]float64{1, 1, 1}},
		{[3]float64{0.627955, 0.224863, 0.125846}, [3]float64{1, 0, 0}},
		{[3]float64{0.866440, -0.233888, 0.179498}, [3]float64{0, 1, 0}},
		{[3]float64{0.452014, -0.032457, -0.311528}, [3]float64{0, 0, 1}},
	} {
		got := okLabToLinear(tc.lab[0], tc.lab[1], tc.lab[2])
		for i := range got {
			if math.Abs(got[i]-tc.linear[i]) > 2e-5 { // six digits, steepened by cubes and factors up to 4
				t.Errorf("%v: got %v, want %v", tc.lab, got, tc.linear)
			}
		}
	}
}

// The scale must order values for any eye and on a grey print: CIE 1976 lightness,
// which is no part of its making, rises from step to step. It stays inside sRGB, so
// that nothing is clipped, and away from the grey of what has no value.
func TestColourScale(t *testing.T) {
	before := -1.0
	for i := range 256 {
		at := float64(i) / 255
		sin, cos := math.Sincos((220 + 225*at) * math.Pi / 180)
		chroma := 0.045 + 0.09*math.Sin(math.Pi*at)
		linear := okLabToLinear(0.28+0.65*at, chroma*cos, chroma*sin)
		for _, v := range linear {
			if v < 0 || v > 1 {
				t.Errorf("step %d leaves sRGB: %v", i, linear)
			}
		}
		lightness := 116*math.Cbrt(0.2126*linear[0]+0.7152*linear[1]+0.0722*linear[2]) - 16 // above the linear part
		if lightness <= before {
			t.Errorf("step %d is no lighter than the one before: %v, %v", i, lightness, before)
		}
		before = lightness
		c := ColourAt(at)
		far := 0
		for k := range c {
			far += abs(int(c[k]) - int(NoValue[k]))
		}
		if far < 40 {
			t.Errorf("step %d, %v, is nearly the grey %v", i, c, NoValue)
		}
	}
	if ColourAt(-1) != ColourAt(0) || ColourAt(math.Inf(1)) != ColourAt(1) || ColourAt(math.NaN()) != NoValue {
		t.Error("the ends are not kept")
	}
}

func abs(x int) int { return max(x, -x) }
