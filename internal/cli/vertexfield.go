package cli

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"heatskin/internal/fieldfile"
	"heatskin/internal/meshfile"
	"heatskin/mesh"
)

// initialFlag is --initial: a field by vertex, from a table or a PLY file.
type initialFlag struct {
	file, column string

	table *fieldfile.Table
	ply   []float64
}

// set reads FILE.csv, FILE.csv:COLUMN or FILE.ply:PROPERTY.
func (f *initialFlag) set(text string) error {
	f.file, f.column = text, "u"
	if i := strings.LastIndexByte(text, ':'); i >= 0 && text[i+1:] != "" && !strings.Contains(text[i:], "/") {
		f.file, f.column = text[:i], text[i+1:]
	}
	if f.isPLY() && f.file != text || extension(f.file) == ".csv" {
		return nil
	}
	return errors.New("want FILE.csv (columns vertex,u), FILE.csv:COLUMN or FILE.ply:PROPERTY")
}

func (f *initialFlag) isPLY() bool {
	return extension(f.file) == ".ply" || strings.HasSuffix(strings.ToLower(f.file), ".ply.gz")
}

// open reads the file. The error is a refusal.
func (f *initialFlag) open(ctx context.Context) (err error) {
	if f.file == "" {
		return nil
	}
	if !f.isPLY() {
		f.table, err = readTable(f.file, "vertex", f.column)
		return refuse(err)
	}
	in, err := openInput(f.file)
	if err != nil {
		return refuse(err)
	}
	defer in.Close()
	soup, err := meshfile.Read(ctx, in, f.file, "ply", f.column)
	if err != nil {
		return refuse(err)
	}
	var found bool
	if f.ply, found = soup.Properties[f.column]; !found {
		return refusef("%s: want a vertex property %q that is one number, got none of that name", f.file, f.column)
	}
	return nil
}

// values are those of the n vertices of the mesh. The error is a refusal.
func (f *initialFlag) values(s *mesh.Surface, n int) ([]float64, error) {
	if f.table == nil {
		if len(f.ply) != n {
			return nil, refusef("%s: want %d vertices, as the mesh has, got %d", f.file, n, len(f.ply))
		}
		for v, x := range f.ply {
			if x-x != 0 && !s.NoValue[v] {
				return nil, refusef("%s: want a finite %s of vertex %d, got %g", f.file, f.column, v, x)
			}
		}
		return f.ply, nil
	}
	rows, err := f.table.FieldValues(f.column)
	if err != nil {
		return nil, refuse(err)
	}
	values, lines, err := byVertex(f.table, f.column, rows, n)
	if err != nil {
		return nil, refuse(err)
	}
	for v, x := range values {
		if !math.IsNaN(x) || s.NoValue[v] {
			continue
		}
		wrong := &fieldfile.TableError{File: f.file, Line: lines[v], Column: f.column, Want: "a finite number", Got: "nan"}
		if lines[v] == 0 {
			wrong.Line = f.table.Line[len(rows)-1] + 1
			wrong.Column, wrong.Want, wrong.Got = "vertex", fmt.Sprintf("a row for each vertex from 0 to %d", n-1), fmt.Sprintf("none for vertex %d", v)
		}
		return nil, refuse(wrong)
	}
	return values, nil
}

// byVertex sorts the rows of a column, in any order and one for a vertex at most: values
// by vertex, NaN where there is none, and the lines that they stand in, 0 for none.
func byVertex(t *fieldfile.Table, column string, rows []float64, n int) (values []float64, lines []int, err error) {
	vertices, err := t.Int32s("vertex", 0, int32(n-1))
	if err != nil {
		return nil, nil, err
	}
	values, lines = make([]float64, n), make([]int, n)
	for v := range values {
		values[v] = math.NaN()
	}
	for row, v := range vertices {
		if lines[v] > 0 {
			return nil, nil, t.Refuse(row, "vertex", fmt.Sprintf("each vertex once (it stands in line %d)", lines[v]))
		}
		if math.IsInf(rows[row], 0) {
			return nil, nil, t.Refuse(row, column, "a finite number")
		}
		values[v], lines[v] = rows[row], t.Line[row]
	}
	return values, lines, nil
}

// carry gives every vertex computed on its value of the field that is linear on the
// faces of the original mesh, values being those of its vertices: what has been added
// lies in a face or on an edge there. NaN where a corner that counts has no value.
func (g *ground) carry(values []float64) []float64 {
	s := g.surface
	field := make([]float64, s.NumVertices)
	from := copy(field, values)
	if from == len(field) {
		return field
	}
	face := make([]int, len(field)) // one of each vertex, plus 1
	for h, v := range s.Vert {
		face[v] = h/3 + 1
	}
	locator := mesh.NewLocator(g.original)
	for v := from; v < len(field); v++ {
		if face[v] == 0 {
			field[v] = math.NaN()
			continue
		}
		// Sheets may touch where they are not joined, as at a slit. A hair inwards there is
		// but one.
		corners := s.Vert[3*(face[v]-1) : 3*face[v]]
		at := [3]float64(s.Positions[3*v : 3*v+3])
		inside := at
		for axis := range inside {
			for _, c := range corners {
				inside[axis] += 1e-6 / 3 * (s.Positions[3*int(c)+axis] - at[axis])
			}
		}
		point, _ := locator.Nearest(inside)
		field[v] = linear(g.original, point.Triangle, at, values)
	}
	return field
}

// linear is the linear function of triangle f with these values at its corners, at x in
// its plane. A weight of less than a millionth is rounding, on an edge.
func linear(m *mesh.Mesh, f int32, x [3]float64, values []float64) float64 {
	corners := m.Triangles[3*f : 3*f+3]
	var side [3][3]float64 // to the corners, from x
	for k, v := range corners {
		for axis := range x {
			side[k][axis] = m.Positions[3*v+int32(axis)] - x[axis]
		}
	}
	var part [3][3]float64 // of the triangle's area vector, opposite to each corner
	var whole [3]float64
	for k := range part {
		a, b := side[(k+1)%3], side[(k+2)%3]
		part[k] = [3]float64{a[1]*b[2] - a[2]*b[1], a[2]*b[0] - a[0]*b[2], a[0]*b[1] - a[1]*b[0]}
		for axis := range whole {
			whole[axis] += part[k][axis]
		}
	}
	size := whole[0]*whole[0] + whole[1]*whole[1] + whole[2]*whole[2]
	sum, total := 0.0, 0.0
	for k, v := range corners {
		w := (part[k][0]*whole[0] + part[k][1]*whole[1] + part[k][2]*whole[2]) / size
		if math.Abs(w) > 1e-6 {
			sum += w * values[v]
			total += w
		}
	}
	return sum / total
}
