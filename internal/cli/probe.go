package cli

import (
	"bytes"
	"context"
	"encoding/csv"
	"errors"
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

// A probeTable is a table of places: those that --probe names, as text, and once a
// field has been read there, its values.
type probeTable struct {
	ids    []string
	points [][3]float64
	gaps   []float64
	fields []fieldfile.Column
	header []string   // of further columns, which are carried over
	more   [][]string // by row
}

// A tableError is a place in a CSV file that makes no sense there.
type tableError struct {
	File      string
	Line      int // from 1
	Want, Got string
}

func (e *tableError) Error() string {
	return fmt.Sprintf("%s:%d: want %s, got %s", e.File, e.Line, e.Want, e.Got)
}

// readPoints reads the columns x,y,z of a CSV file.
func readPoints(ctx context.Context, name string) ([][3]float64, error) {
	t, err := readPlaces(ctx, name, []string{"x", "y", "z"})
	if err != nil {
		return nil, err
	}
	return t.points, nil
}

// readProbes reads a CSV file with the columns id,x,y,z and any others.
func readProbes(ctx context.Context, name string) (*probeTable, error) {
	return readPlaces(ctx, name, []string{"id", "x", "y", "z"})
}

// readPlaces reads a table of places with at least the wanted columns, in any order.
func readPlaces(ctx context.Context, name string, wanted []string) (*probeTable, error) {
	f, err := openInput(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	rows := csv.NewReader(fieldfile.SkipMark(f))
	rows.TrimLeadingSpace = true
	header, err := rows.Read()
	if err != nil {
		return nil, csvError(name, err, "a header row with the columns "+strings.Join(wanted, ","))
	}
	for i := range header {
		header[i] = strings.TrimSpace(header[i])
	}
	at := make(map[string]int)
	for _, column := range wanted {
		i := slices.Index(header, column)
		if i < 0 {
			return nil, &tableError{name, 1, "the columns " + strings.Join(wanted, ","), strconv.Quote(strings.Join(header, ","))}
		}
		at[column] = i
	}
	t := &probeTable{}
	var others []int
	for i, column := range header {
		if slices.Index(header, column) != i {
			return nil, &tableError{name, 1, "each column once", fmt.Sprintf("%q twice", column)}
		}
		if !slices.Contains(wanted, column) {
			others = append(others, i)
			t.header = append(t.header, column)
		}
	}
	for {
		row, err := rows.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, csvError(name, err, "")
		}
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		var x [3]float64
		for axis, column := range []string{"x", "y", "z"} {
			text := row[at[column]]
			if x[axis], err = finite(text); err != nil {
				line, _ := rows.FieldPos(at[column])
				return nil, &tableError{name, line, "a finite number as " + column, strconv.Quote(text)}
			}
		}
		if i, ok := at["id"]; ok {
			t.ids = append(t.ids, strings.TrimSpace(row[i]))
		}
		more := make([]string, len(others))
		for k, i := range others {
			more[k] = row[i]
		}
		t.points = append(t.points, x)
		t.more = append(t.more, more)
	}
	if len(t.points) == 0 {
		line, _ := rows.FieldPos(0)
		return nil, &tableError{name, line + 1, "at least one row", "end of file"}
	}
	return t, nil
}

// csvError tells what encoding/csv met in our words.
func csvError(name string, err error, wanted string) error {
	var parse *csv.ParseError
	switch {
	case err == io.EOF:
		return &tableError{name, 1, wanted, "end of file"}
	case errors.As(err, &parse) && errors.Is(parse.Err, csv.ErrFieldCount):
		return &tableError{name, parse.Line, "as many fields as the header has", "another number"}
	case errors.As(err, &parse):
		return &tableError{name, parse.Line, "a CSV row", parse.Err.Error()}
	}
	return fmt.Errorf("%s: %w", name, err)
}

// read takes the fields of r at the surface points nearest to the probes: linear
// inside a triangle. A place where a corner has no value has none either.
func (t *probeTable) read(r *result) *probeTable {
	at := *t
	at.gaps = make([]float64, len(t.points))
	for _, f := range r.fields {
		at.fields = append(at.fields, fieldfile.Column{Name: f.Name, Values: make([]float64, len(t.points))})
	}
	locator := mesh.NewLocator(r.part)
	for i, x := range t.points {
		var place mesh.Point
		place, at.gaps[i] = locator.Nearest(x)
		corners := r.part.Triangles[3*place.Triangle : 3*place.Triangle+3]
		for k, f := range r.fields {
			sum := 0.0
			for c, weight := range place.Weights {
				if weight != 0 { // an infinite corner opposite to an edge does not count on it
					sum += weight * f.Values[corners[c]]
				}
			}
			at.fields[k].Values[i] = sum
		}
	}
	if r.probed != nil {
		at.fields = r.probed
	}
	return &at
}

// write writes id,x,y,z,gap, the fields, and the columns that were carried over.
func (t *probeTable) write(w io.Writer) error {
	rows := csv.NewWriter(w)
	header := []string{"id", "x", "y", "z", "gap"}
	for _, f := range t.fields {
		header = append(header, f.Name)
	}
	if err := rows.Write(append(header, t.header...)); err != nil {
		return err
	}
	for i, x := range t.points {
		row := []string{t.ids[i], full(x[0]), full(x[1]), full(x[2]), full(t.gaps[i])}
		for _, f := range t.fields {
			row = append(row, full(f.Values[i]))
		}
		if err := rows.Write(append(row, t.more[i]...)); err != nil {
			return err
		}
	}
	rows.Flush()
	return rows.Error()
}

// full writes a number so that it reads back to the same double.
func full(x float64) string {
	switch {
	case math.IsNaN(x):
		return "nan"
	case math.IsInf(x, 0):
		return strings.TrimPrefix(strings.ToLower(strconv.FormatFloat(x, 'g', -1, 64)), "+")
	}
	return strconv.FormatFloat(x, 'g', -1, 64)
}

// shownProbes is how many rows of a probe table are also shown at the terminal.
const shownProbes = 20

// noteTable shows the user a short table of the probes, rounded.
func (j *job) noteTable(t *probeTable) {
	if j.quiet || len(t.points) > shownProbes {
		return
	}
	var b bytes.Buffer
	rows := tabwriter.NewWriter(&b, 0, 0, 2, ' ', tabwriter.AlignRight)
	line := func(first string, fields []string) {
		fmt.Fprintf(rows, "  %s\t%s\t\n", first, strings.Join(fields, "\t"))
	}
	header := []string{"gap"}
	for _, f := range t.fields {
		header = append(header, f.Name)
	}
	line("probe", append(header, t.header...))
	for i := range t.points {
		row := []string{rounded(t.gaps[i])}
		for _, f := range t.fields {
			row = append(row, rounded(f.Values[i]))
		}
		line(t.ids[i], append(row, t.more[i]...))
	}
	rows.Flush() // into memory: it cannot fail
	j.clock.above(func() { _, _ = b.WriteTo(j.std.Err) })
}

func rounded(x float64) string { return strconv.FormatFloat(x, 'g', 6, 64) }
