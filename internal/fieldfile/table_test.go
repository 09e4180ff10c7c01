package fieldfile

import (
	"bytes"
	"encoding/csv"
	"errors"
	"io"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"

	"heatskin/mesh"
)

// cloud is a mesh of n random vertices and n random triangles.
func cloud(n int) *mesh.Mesh {
	rng := rand.New(rand.NewPCG(3, 5))
	m := &mesh.Mesh{}
	for range n {
		for range 3 {
			m.Positions = append(m.Positions, rng.NormFloat64()*math.Pow(10, float64(rng.IntN(40)-20)))
			m.Triangles = append(m.Triangles, rng.Int32N(int32(n)))
		}
	}
	return m
}

func TestFieldFileLayout(t *testing.T) {
	m := &mesh.Mesh{Positions: []float64{0, 0.1, -2.5, 1e15, 1e-5, 9.999e-6, 123456789.25, 1e-300, math.MaxFloat64}}
	var b bytes.Buffer
	err := WriteCSV(&b, m, 3, []Column{
		{"distance", []float64{0, math.Inf(1), math.Inf(-1)}}, {"u_t0,5", []float64{math.NaN(), math.Copysign(0, -1), 1.0 / 3}}})
	want := `vertex,x,y,z,distance,"u_t0,5"
0,0,0.1,-2.5,0,nan
1,1e+15,0.00001,9.999e-06,inf,-0
2,123456789.25,1e-300,1.7976931348623157e+308,-inf,0.3333333333333333
`
	if err != nil || b.String() != want {
		t.Errorf("%v\ngot\n%s\nwant\n%s", err, b.String(), want)
	}
}

// encoding/csv and strconv read every number back to its last bit, on any number of
// processors from the same bytes.
func TestFieldsReadBack(t *testing.T) {
	const n = 3*blockRows + 17
	m := cloud(n)
	field := Column{"distance", make([]float64, n)}
	rng := rand.New(rand.NewPCG(1, 2))
	for i := range field.Values {
		for { // any finite bits
			if v := math.Float64frombits(rng.Uint64()); v-v == 0 {
				field.Values[i] = v
				break
			}
		}
	}
	var first []byte
	before := runtime.GOMAXPROCS(0)
	defer runtime.GOMAXPROCS(before)
	for _, processors := range []int{1, 2, 4, 7} {
		runtime.GOMAXPROCS(processors)
		var b bytes.Buffer
		if err := WriteCSV(&b, m, n, []Column{field}); err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = b.Bytes()
		} else if !bytes.Equal(first, b.Bytes()) {
			t.Errorf("%d processors give other bytes", processors)
		}
	}
	records, err := csv.NewReader(bytes.NewReader(first)).ReadAll()
	if err != nil || len(records) != n+1 {
		t.Fatalf("%d records, %v", len(records), err)
	}
	for v, record := range records[1:] {
		want := []float64{float64(v), m.Positions[3*v], m.Positions[3*v+1], m.Positions[3*v+2], field.Values[v]}
		for i, cell := range record {
			if got, err := strconv.ParseFloat(cell, 64); err != nil || math.Float64bits(got) != math.Float64bits(want[i]) {
				t.Fatalf("row %d, column %d: %s (%v), want %v", v, i, cell, err, want[i])
			}
		}
	}
	// ours reads the same
	table, err := ReadTable(bytes.NewReader(first), "field.csv", "vertex", "distance")
	if err != nil {
		t.Fatal(err)
	}
	vertices, err := table.Int32s("vertex", 0, n-1)
	if err != nil || vertices[n-1] != n-1 {
		t.Errorf("vertices end with %d, %v", vertices[n-1], err)
	}
	if values, err := table.Floats("distance"); err != nil || !slices.Equal(values, field.Values) {
		t.Errorf("distances differ, %v", err)
	}
}

// What WriteTable quotes encoding/csv reads back as it was.
func TestTextsReadBack(t *testing.T) {
	texts := []string{"plain", "", " blank ends ", "comma, quote \" and\nline", `""`, "Grüße", "-", "1,5"}
	for _, series := range [][]Series{
		{Text("id", texts)}, {Text("a \"name\"", texts), Ints("n", []int32{1, -2, 3, 4, 5, 6, 7, 8}), Floats("f", make([]float64, 8))},
	} {
		var b bytes.Buffer
		if err := WriteTable(&b, len(texts), series...); err != nil {
			t.Fatal(err)
		}
		records, err := csv.NewReader(&b).ReadAll()
		if err != nil || len(records) != len(texts)+1 {
			t.Fatalf("%d records, %v", len(records), err)
		}
		for i, text := range texts {
			if records[i+1][0] != text {
				t.Errorf("got %q, want %q", records[i+1][0], text)
			}
		}
	}
}

type fullAfter struct{ left int }

func (f *fullAfter) Write(p []byte) (int, error) {
	if f.left -= len(p); f.left < 0 {
		return 0, io.ErrShortWrite
	}
	return len(p), nil
}

func TestWritersReportErrors(t *testing.T) {
	m := cloud(4 * blockRows)
	columns := []Column{{"u", make([]float64, m.NumVertices())}}
	for _, left := range []int{0, 100, 200_000} {
		if err := WriteCSV(&fullAfter{left}, m, m.NumVertices(), columns); err != io.ErrShortWrite {
			t.Errorf("CSV: %v", err)
		}
		if err := WritePLY(&fullAfter{left}, m, columns); err != io.ErrShortWrite {
			t.Errorf("PLY: %v", err)
		}
	}
}

func TestReadTable(t *testing.T) {
	const file = "\xef\xbb\xbfnote, y ,x,id,z\r\n\"a, b\",2,1.5, p1 ,3\r\n\r\n, -2e3 ,+.5,\"p \"\"2\"\"\",0\r\n"
	table, err := ReadTable(strings.NewReader(file), "probes.csv", "id", "x", "y", "z")
	if err != nil {
		t.Fatal(err)
	}
	if table.Rows() != 2 || !slices.Equal(table.Line, []int{2, 4}) || !slices.Equal(table.Texts("id"), []string{"p1", `p "2"`}) {
		t.Errorf("%d rows, lines %v, id %q", table.Rows(), table.Line, table.Texts("id"))
	}
	if y, err := table.Floats("y"); err != nil || !slices.Equal(y, []float64{2, -2000}) {
		t.Errorf("y = %v, %v", y, err)
	}
	var b bytes.Buffer
	if err := WriteTable(&b, 2, table.Others("id", "x", "y", "z")...); err != nil || b.String() != "note\n\"a, b\"\n\"\"\n" {
		t.Errorf("carried over: %q, %v", b.String(), err)
	}
	values, err := ReadTable(strings.NewReader("u\ninf\n-inf\nnan\n1\n"), "u.csv", "u")
	if err != nil {
		t.Fatal(err)
	}
	if u, err := values.FieldValues("u"); err != nil || !math.IsInf(u[0], 1) || !math.IsInf(u[1], -1) || !math.IsNaN(u[2]) || u[3] != 1 {
		t.Errorf("u = %v, %v", u, err)
	}
}

func TestReadTableRefusals(t *testing.T) {
	for _, tc := range []struct{ file, want string }{
		{"", "p.csv:1: want a header row (needed: id, x), got an empty file"},
		{"\xef\xbb\xbf\n\n", "p.csv:1: want a header row (needed: id, x), got an empty file"},
		{"id;x\n1;2\n", `p.csv:1, column id: want one column of that name (needed: id, x), got the header "id;x"`},
		{"\nid,y\n", `p.csv:2, column x: want one column of that name (needed: id, x), got the header "id,y"`},
		{"id,x,x\n", "p.csv:1, column x: want one column of that name (needed: id, x), got 2 of that name"},
		{"id,x\n1,2\n\n1\n", "p.csv:4: want 2 cells, as in the header, got 1"},
		{"id,x\n1,2,3\n", "p.csv:2: want 2 cells, as in the header, got 3"},
		{"id,x\n1,2\"3\n", "p.csv:2: want quotes around a whole cell, got one in byte 4 of the line"},
		{"id,x\n1,\"2\n3\n", "p.csv:2: want a quote at the end of each quoted cell, got a stray or missing one at byte 3 of line 3"},
		{"id,x\n1,\n", `p.csv:2, column x: want a finite number, got ""`},
		{"id,x\n\"a\nb\",2\n2,1,5\n", "p.csv:4: want 2 cells, as in the header, got 3"},
		{"id,x\n\"a\nb\",2\n2,nan\n", `p.csv:4, column x: want a finite number, got "nan"`},
		{"id,x\n1,1e999\n", `p.csv:2, column x: want a finite number, got "1e999"`},
		{"id,x\n1,0x1p4\n", `p.csv:2, column x: want a finite number, got "0x1p4"`},
		{"id,x\n1.5,1\n", `p.csv:2, column id: want a whole number from 0 to 9, got "1.5"`},
		{"id,x\n9,1\n10,1\n", `p.csv:3, column id: want a whole number from 0 to 9, got "10"`},
		{"id,x\n-1,1\n", `p.csv:2, column id: want a whole number from 0 to 9, got "-1"`},
	} {
		table, err := ReadTable(strings.NewReader(tc.file), "p.csv", "id", "x")
		if err == nil {
			if _, err = table.Floats("x"); err == nil {
				_, err = table.Int32s("id", 0, 9)
			}
		}
		var refused *TableError
		if !errors.As(err, &refused) || err.Error() != tc.want {
			t.Errorf("%q:\ngot  %v\nwant %s", tc.file, err, tc.want)
		}
	}
	if _, err := ReadTable(&brokenReader{}, "p.csv"); !errors.Is(err, io.ErrClosedPipe) || !strings.HasPrefix(err.Error(), "p.csv: ") {
		t.Errorf("a broken reader: %v", err)
	}
}

type brokenReader struct{}

func (*brokenReader) Read([]byte) (int, error) { return 0, io.ErrClosedPipe }

func FuzzReadTable(f *testing.F) {
	f.Add([]byte("id,x\n1,2\n"))
	f.Add([]byte("\xef\xbb\xbf\"i\"\"d\", x \r\n\r\n\"1\n\",2\r\n"))
	f.Fuzz(func(t *testing.T, file []byte) {
		table, err := ReadTable(bytes.NewReader(file), "t.csv")
		if err != nil {
			var refused *TableError
			if !errors.As(err, &refused) || refused.Line < 1 {
				t.Errorf("%v", err)
			}
			return
		}
		if len(table.cells) != table.Rows()*len(table.Names) || len(table.cells) > len(file) {
			t.Fatalf("%d cells, %d rows, %d names", len(table.cells), table.Rows(), len(table.Names))
		}
		for _, name := range table.Names {
			if _, err := table.Floats(name); err == nil {
				if _, err := table.FieldValues(name); err != nil {
					t.Errorf("finite, but no value: %v", err)
				}
			}
		}
	})
}

func BenchmarkWriteCSV(b *testing.B) {
	m := cloud(655_362)
	for i := range m.Positions { // singles, as from an STL
		m.Positions[i] = float64(float32(math.Sin(float64(i))))
	}
	columns := []Column{{"distance", m.Positions[:m.NumVertices()]}}
	for b.Loop() {
		if err := WriteCSV(io.Discard, m, m.NumVertices(), columns); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkWritePLY(b *testing.B) {
	m := cloud(655_362)
	columns := []Column{{"distance", m.Positions[:m.NumVertices()]}}
	for b.Loop() {
		if err := WritePLY(io.Discard, m, columns); err != nil {
			b.Fatal(err)
		}
	}
}
