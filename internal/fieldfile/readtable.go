package fieldfile

import (
	"bufio"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
)

// A TableError says where a table is not what it should be.
type TableError struct {
	File      string // as the user named it
	Line      int    // from 1
	Column    string // its name, or "" for the row or the file as a whole
	Want, Got string
}

func (e *TableError) Error() string {
	column := ""
	if e.Column != "" {
		column = fmt.Sprintf(", column %s", e.Column)
	}
	return fmt.Sprintf("%s:%d%s: want %s, got %s", e.File, e.Line, column, e.Want, e.Got)
}

// A Table is a CSV file as it was read: texts in named columns.
type Table struct {
	File  string
	Names []string // of the columns, in the file's order
	Line  []int    // of each row in the file, from 1
	cells []string // row by row
}

// Rows is the number of rows, the header not counted.
func (t *Table) Rows() int { return len(t.Line) }

// Cell is the text in a row and a column counted from 0, blanks at its ends removed.
func (t *Table) Cell(row, column int) string { return t.cells[row*len(t.Names)+column] }

// Column is the number of the column of that name, or -1.
func (t *Table) Column(name string) int { return slices.Index(t.Names, name) }

// ReadTable reads a CSV table with a header row in which each of the names want must
// occur once, in any order; other columns are kept. A byte order mark and CR LF are
// tolerated, empty lines are passed over, and every row must have as many cells as
// the header. name is for messages. Memory is in proportion to the file. The error is
// a *TableError, or r's with the name around it.
func ReadTable(r io.Reader, name string, want ...string) (*Table, error) {
	in := bufio.NewReaderSize(r, 1<<16)
	if mark, err := in.Peek(3); err == nil && string(mark) == "\xef\xbb\xbf" {
		if _, err := in.Discard(3); err != nil {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
	}
	reader := csv.NewReader(in)
	reader.ReuseRecord = true
	reader.TrimLeadingSpace = true
	t := &Table{File: name}
	for {
		record, err := reader.Read()
		if err == io.EOF {
			break
		}
		line := 1
		if err == nil || errors.Is(err, csv.ErrFieldCount) {
			line, _ = reader.FieldPos(0)
		}
		if err != nil {
			return nil, t.syntax(err, line, len(record))
		}
		for i := range record {
			record[i] = strings.TrimSpace(record[i])
		}
		if t.Names == nil {
			t.Names = slices.Clone(record)
			if err := t.checkNames(line, want); err != nil {
				return nil, err
			}
			continue
		}
		t.cells = append(t.cells, record...)
		t.Line = append(t.Line, line)
	}
	if t.Names == nil {
		return nil, &TableError{File: name, Line: 1, Want: "a header row" + listed(want), Got: "an empty file"}
	}
	return t, nil
}

// syntax is the error for what encoding/csv could not read.
func (t *Table) syntax(err error, line, cells int) error {
	var parse *csv.ParseError
	switch {
	case !errors.As(err, &parse):
		return fmt.Errorf("%s: %w", t.File, err)
	case errors.Is(err, csv.ErrFieldCount):
		return &TableError{File: t.File, Line: line, Want: fmt.Sprintf("%d cells, as in the header", len(t.Names)), Got: strconv.Itoa(cells)}
	case errors.Is(err, csv.ErrBareQuote):
		return &TableError{File: t.File, Line: parse.Line, Want: "quotes around a whole cell", Got: fmt.Sprintf("one in byte %d of the line", parse.Column)}
	}
	return &TableError{File: t.File, Line: parse.StartLine, Want: "a quote at the end of each quoted cell",
		Got: fmt.Sprintf("a stray or missing one at byte %d of line %d", parse.Column, parse.Line)}
}

// checkNames holds the header against the columns that are needed.
func (t *Table) checkNames(line int, want []string) error {
	for _, name := range want {
		count := 0
		for _, have := range t.Names {
			if have == name {
				count++
			}
		}
		if count != 1 {
			got := "the header " + shorten(strings.Join(t.Names, ","))
			if count > 1 {
				got = fmt.Sprintf("%d of that name", count)
			}
			return &TableError{File: t.File, Line: line, Column: name, Want: "one column of that name" + listed(want), Got: got}
		}
	}
	return nil
}

func listed(want []string) string {
	if len(want) == 0 {
		return ""
	}
	return " (needed: " + strings.Join(want, ", ") + ")"
}

// shorten quotes a cell for a message, cut to a length that a line can hold.
func shorten(text string) string {
	if len(text) > 60 {
		return strconv.QuoteToASCII(text[:60]) + "..."
	}
	return strconv.QuoteToASCII(text)
}

// Floats is the column of that name as finite numbers, the error a *TableError. It
// panics if there is no such column.
func (t *Table) Floats(name string) ([]float64, error) {
	return t.floats(name, "a finite number", func(v float64) bool { return v-v == 0 })
}

// FieldValues is Floats for a column that may also hold inf, -inf and nan.
func (t *Table) FieldValues(name string) ([]float64, error) {
	return t.floats(name, "a number, inf or nan", func(float64) bool { return true })
}

func (t *Table) floats(name, want string, fits func(float64) bool) ([]float64, error) {
	column := t.mustColumn(name)
	values := make([]float64, t.Rows())
	for row := range values {
		cell := t.Cell(row, column)
		v, err := strconv.ParseFloat(cell, 64)
		if err != nil || !fits(v) || strings.ContainsAny(cell, "_xX") { // Go's own notations
			return nil, t.Refuse(row, name, want)
		}
		values[row] = v
	}
	return values, nil
}

// Int32s is the column of that name as whole numbers from lo to hi, the error a
// *TableError. It panics if there is no such column.
func (t *Table) Int32s(name string, lo, hi int32) ([]int32, error) {
	column := t.mustColumn(name)
	values := make([]int32, t.Rows())
	for row := range values {
		v, err := strconv.ParseInt(t.Cell(row, column), 10, 32)
		if err != nil || v < int64(lo) || v > int64(hi) {
			want := fmt.Sprintf("a whole number from %d to %d", lo, hi)
			if hi == math.MaxInt32 {
				want = fmt.Sprintf("a whole number, %d or more", lo)
			}
			return nil, t.Refuse(row, name, want)
		}
		values[row] = int32(v)
	}
	return values, nil
}

// Refuse is the error for a cell that is not what the caller wants.
func (t *Table) Refuse(row int, name, want string) error {
	got := shorten(t.Cell(row, t.mustColumn(name)))
	return &TableError{File: t.File, Line: t.Line[row], Column: name, Want: want, Got: got}
}

// Texts is the column of that name. It panics if there is none.
func (t *Table) Texts(name string) []string { return t.texts(t.mustColumn(name)) }

func (t *Table) texts(column int) []string {
	values := make([]string, t.Rows())
	for row := range values {
		values[row] = t.Cell(row, column)
	}
	return values
}

// Others are the columns that are none of the names given, in the file's order, to be
// carried over to another table.
func (t *Table) Others(names ...string) []Series {
	var series []Series
	for column, name := range t.Names {
		if !slices.Contains(names, name) {
			series = append(series, Text(name, t.texts(column)))
		}
	}
	return series
}

func (t *Table) mustColumn(name string) int {
	column := t.Column(name)
	if column < 0 {
		panic("fieldfile: the table has no such column")
	}
	return column
}
