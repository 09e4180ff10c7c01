package fieldfile

import (
	"io"
	"math"
	"runtime"
	"strconv"
	"strings"
	"sync"

	"heatskin/mesh"
)

// A Column is one field: a value for each vertex.
type Column struct {
	Name   string
	Values []float64
}

// A Series is one column of a table that WriteTable writes.
type Series struct {
	name   string
	rows   int
	append func(b []byte, row int) []byte
}

// Text is a column of texts, quoted where CSV asks for it.
func Text(name string, values []string) Series {
	return Series{name, len(values), func(b []byte, row int) []byte { return appendText(b, values[row]) }}
}

// Ints is a column of whole numbers.
func Ints[T int | int32 | int64](name string, values []T) Series {
	return Series{name, len(values), func(b []byte, row int) []byte { return strconv.AppendInt(b, int64(values[row]), 10) }}
}

// Floats is a column of numbers.
func Floats(name string, values []float64) Series {
	return Series{name, len(values), func(b []byte, row int) []byte { return appendFloat(b, values[row]) }}
}

// WriteCSV writes a field file: vertex, x, y, z and the columns, for the first rows
// vertices of m. It panics if m or a column has fewer.
func WriteCSV(w io.Writer, m *mesh.Mesh, rows int, columns []Column) error {
	series := []Series{{"vertex", m.NumVertices(), func(b []byte, row int) []byte { return strconv.AppendInt(b, int64(row), 10) }}}
	for axis, name := range []string{"x", "y", "z"} {
		series = append(series, Series{name, m.NumVertices(), func(b []byte, row int) []byte {
			return appendFloat(b, m.Positions[3*row+axis])
		}})
	}
	for _, c := range columns {
		series = append(series, Floats(c.Name, c.Values))
	}
	return WriteTable(w, rows, series...)
}

// blockRows is how many rows are formatted at a time: enough that a block's hand-over
// is lost in its work (BenchmarkWriteCSV), few enough that blocks stay in cache.
const blockRows = 2048

// WriteTable writes a CSV table of the first rows values of each series. It panics
// if one has fewer. Blocks of rows are formatted on all processors and written in
// order, so that the bytes are the same on any number of them; memory is some
// blocks'. The error is w's.
func WriteTable(w io.Writer, rows int, series ...Series) error {
	var head []byte
	for i, s := range series {
		if s.rows < rows {
			panic("fieldfile: a column is shorter than its table")
		}
		if i > 0 {
			head = append(head, ',')
		}
		head = appendText(head, s.name)
	}
	if _, err := w.Write(append(head, '\n')); err != nil {
		return err
	}
	blocks := (rows + blockRows - 1) / blockRows
	format := func(b []byte, block int) []byte {
		for row := block * blockRows; row < min(rows, (block+1)*blockRows); row++ {
			for i := range series {
				if i > 0 {
					b = append(b, ',')
				}
				b = series[i].append(b, row)
			}
			if len(series) == 1 && (len(b) == 0 || b[len(b)-1] == '\n') {
				b = append(b, `""`...) // an empty line would be no row
			}
			b = append(b, '\n')
		}
		return b
	}
	return writeBlocks(w, blocks, format)
}

// writeBlocks writes what format appends for block 0, 1, 2..., formatting as many at
// a time as there are processors, and writing one batch while the next is formatted.
func writeBlocks(w io.Writer, blocks int, format func(b []byte, block int) []byte) error {
	workers := min(runtime.GOMAXPROCS(0), blocks)
	var batches [2][][]byte
	for i := range batches {
		batches[i] = make([][]byte, workers)
	}
	start := func(first int, batch [][]byte) *sync.WaitGroup {
		var group sync.WaitGroup
		for i := range batch {
			if first+i >= blocks {
				batch[i] = batch[i][:0]
				continue
			}
			group.Go(func() { batch[i] = format(batch[i][:0], first+i) })
		}
		return &group
	}
	under := start(0, batches[0])
	for first, turn := 0, 0; first < blocks; first, turn = first+workers, 1-turn {
		under.Wait()
		under = start(first+workers, batches[1-turn])
		for _, b := range batches[turn] {
			if _, err := w.Write(b); err != nil {
				under.Wait()
				return err
			}
		}
	}
	under.Wait()
	return nil
}

// appendFloat appends the shortest number that reads back to v, without an exponent
// where that is no longer than people like to read.
func appendFloat(b []byte, v float64) []byte {
	switch a := math.Abs(v); {
	case v != v:
		return append(b, "nan"...)
	case a > math.MaxFloat64:
		if v < 0 {
			return append(b, "-inf"...)
		}
		return append(b, "inf"...)
	case a == 0 || a >= 1e-5 && a < 1e15:
		return strconv.AppendFloat(b, v, 'f', -1, 64)
	}
	return strconv.AppendFloat(b, v, 'e', -1, 64)
}

// appendText appends a text, quoted if it would be read as anything else (RFC 4180,
// section 2, rules 5 to 7; blanks at its ends are, too, since readers differ on them).
func appendText(b []byte, text string) []byte {
	if !strings.ContainsAny(text, ",\"\n\r") && strings.TrimSpace(text) == text {
		return append(b, text...)
	}
	b = append(b, '"')
	b = append(b, strings.ReplaceAll(text, `"`, `""`)...)
	return append(b, '"')
}
