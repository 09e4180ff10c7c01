package cli

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"text/tabwriter"

	"heatskin/internal/fieldfile"
	"heatskin/mesh"
)

// probes are the places that --probe names, and once a field has been read there,
// its values.
type probes struct {
	table  *fieldfile.Table
	ids    []string
	points [][3]float64
	part   *mesh.Mesh   // the last mesh that they were sought on
	places []mesh.Datum // the surface points nearest to them there
	fields []fieldfile.Column
}

var probeColumns = []string{"id", "x", "y", "z"}

// readProbes reads a CSV file with the columns id,x,y,z and any others.
func readProbes(name string) (*probes, error) {
	t, err := readTable(name, probeColumns...)
	if err != nil {
		return nil, err
	}
	p := &probes{table: t, ids: t.Texts("id")}
	p.points, err = pointsOf(t)
	return p, err
}

// readPoints reads the columns x,y,z of a CSV file.
func readPoints(name string) ([][3]float64, error) {
	t, err := readTable(name, "x", "y", "z")
	if err != nil {
		return nil, err
	}
	return pointsOf(t)
}

// readTable reads a CSV file that must have at least one row.
func readTable(name string, columns ...string) (*fieldfile.Table, error) {
	f, err := openInput(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	t, err := fieldfile.ReadTable(f, name, columns...)
	if err != nil {
		return nil, err
	}
	if t.Rows() == 0 {
		return nil, &fieldfile.TableError{File: name, Line: 2, Want: "at least one row", Got: "end of file"}
	}
	return t, nil
}

func pointsOf(t *fieldfile.Table) ([][3]float64, error) {
	points := make([][3]float64, t.Rows())
	for axis, column := range []string{"x", "y", "z"} {
		values, err := t.Floats(column)
		if err != nil {
			return nil, err
		}
		for row, x := range values {
			points[row][axis] = x
		}
	}
	return points, nil
}

// on finds the surface points nearest to the probes.
func (p *probes) on(part *mesh.Mesh) []mesh.Datum {
	if p.part != part {
		find := &placer{part: part}
		p.part, p.places = part, nil
		for i, x := range p.points {
			p.places = append(p.places, find.nearest(x, "probe "+p.ids[i]))
		}
	}
	return p.places
}

// read takes the fields of r at the probes: linear inside a triangle, unless the
// command knows better. Where a corner has no value there is none.
func (p *probes) read(r *result) {
	places := p.on(r.part)
	if p.fields = r.probed; p.fields != nil {
		return
	}
	for _, f := range r.fields {
		values := make([]float64, len(places))
		for i, place := range places {
			corners := r.part.Triangles[3*place.Point.Triangle:]
			for k, weight := range place.Point.Weights {
				if weight != 0 { // an infinite corner opposite to an edge does not count on it
					values[i] += weight * f.Values[corners[k]]
				}
			}
		}
		p.fields = append(p.fields, fieldfile.Column{Name: f.Name, Values: values})
	}
}

// write writes id,x,y,z,gap, the fields, and the columns that are carried over.
func (p *probes) write(w io.Writer) error {
	columns := []fieldfile.Series{fieldfile.Text("id", p.ids)}
	for axis, name := range []string{"x", "y", "z"} {
		values := make([]float64, len(p.points))
		for i, x := range p.points {
			values[i] = x[axis]
		}
		columns = append(columns, fieldfile.Floats(name, values))
	}
	gaps := make([]float64, len(p.places))
	for i, place := range p.places {
		gaps[i] = place.Gap
	}
	columns = append(columns, fieldfile.Floats("gap", gaps))
	for _, f := range p.fields {
		columns = append(columns, fieldfile.Floats(f.Name, f.Values))
	}
	return fieldfile.WriteTable(w, len(p.ids), append(columns, p.table.Others(probeColumns...)...)...)
}

// shownProbes is how many probes are also shown at the terminal.
const shownProbes = 20

// noteProbes shows the user a short table of the probes, rounded.
func (j *job) noteProbes(p *probes) {
	if j.quiet || len(p.ids) > shownProbes {
		return
	}
	var b bytes.Buffer
	rows := tabwriter.NewWriter(&b, 0, 0, 2, ' ', tabwriter.AlignRight)
	line := func(cells []string) { fmt.Fprintf(rows, "  %s\t\n", strings.Join(cells, "\t")) }
	header := []string{"probe", "gap"}
	for _, f := range p.fields {
		header = append(header, f.Name)
	}
	var others []int // numbers of the columns that are carried over
	for column, name := range p.table.Names {
		if !slices.Contains(probeColumns, name) {
			others = append(others, column)
			header = append(header, name)
		}
	}
	line(header)
	size := 0.0 // of the coordinates, whose rounding a gap may be
	for _, x := range p.points {
		size = max(size, math.Abs(x[0]), math.Abs(x[1]), math.Abs(x[2]))
	}
	largest := make([]float64, len(p.fields))
	for k, f := range p.fields {
		for _, x := range f.Values {
			if !math.IsInf(x, 0) && !math.IsNaN(x) {
				largest[k] = max(largest[k], math.Abs(x))
			}
		}
	}
	for i, id := range p.ids {
		row := []string{id, rounded(p.places[i].Gap, size)}
		for k, f := range p.fields {
			row = append(row, rounded(f.Values[i], largest[k]))
		}
		for _, column := range others {
			row = append(row, p.table.Cell(i, column))
		}
		line(row)
	}
	rows.Flush() // into memory: it cannot fail
	j.clock.above(func() { _, _ = b.WriteTo(j.std.Err) })
}

// rounded is a number for reading: six digits, and 0 where it is rounding beside a
// number of the given size.
func rounded(x, size float64) string {
	switch {
	case math.IsInf(x, 0):
		return "inf"
	case math.IsNaN(x):
		return "nan"
	case math.Abs(x) <= 1e-11*size:
		return "0"
	}
	return strconv.FormatFloat(x, 'g', 6, 64)
}
