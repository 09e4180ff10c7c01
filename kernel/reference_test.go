package kernel

import (
	"context"
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"

	"heatskin/internal/sparse"
	"heatskin/mesh"
)

// A table is a reference table of testdata/reference, row by row under its header.
type table struct {
	t    *testing.T
	rows []map[string]string
}

func readTable(t *testing.T, name string) table {
	t.Helper()
	file, err := os.Open("../testdata/reference/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	records, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	tab := table{t: t}
	for _, record := range records[1:] {
		row := map[string]string{}
		for i, name := range records[0] {
			row[name] = record[i]
		}
		tab.rows = append(tab.rows, row)
	}
	if len(tab.rows) == 0 {
		t.Fatalf("%s is empty", name)
	}
	return tab
}

func number(t *testing.T, row map[string]string, column string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(row[column], 64)
	if err != nil {
		t.Fatalf("column %s: %v", column, err)
	}
	return x
}

func integer(t *testing.T, row map[string]string, column string) int {
	return int(number(t, row, column))
}

// solverFor prepares m as a user would, Delaunay flips included.
func solverFor(t testing.TB, m *mesh.Mesh, opt Options) *Solver {
	t.Helper()
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	s.Delaunay(s.NumVertices)
	v, err := NewSolver(context.Background(), s, opt)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// torusGrid is the flat a × b torus on n × m cells cut by one diagonal, as operators
// only: it has no place in space. Its lumped matrix is the five-point scheme (the
// diagonal lies opposite right angles and has weight 0); vertex (i, j) is i·m+j.
func torusGrid(a, b float64, n, m int) operators {
	hx, hy := a/float64(n), b/float64(m)
	op := operators{lumped: make([]float64, n*m), component: make([]int32, n*m), count: 1}
	p := &sparse.Pattern{Ptr: make([]int64, 1, n*m+1)}
	l := &sparse.Matrix{Pattern: p, Diag: make([]float64, n*m)}
	for i := range n {
		for j := range m {
			row := map[int32]float64{}
			row[int32((i+1)%n*m+j)] -= hy / hx
			row[int32((i+n-1)%n*m+j)] -= hy / hx
			row[int32(i*m+(j+1)%m)] -= hx / hy
			row[int32(i*m+(j+m-1)%m)] -= hx / hy
			for k := range int32(n * m) {
				if w, ok := row[k]; ok {
					p.Adj = append(p.Adj, k)
					l.Off = append(l.Off, w)
					l.Diag[i*m+j] -= w
				}
			}
			p.Ptr = append(p.Ptr, int64(len(p.Adj)))
			op.lumped[i*m+j] = hx * hy
		}
	}
	op.stiffness = l
	return op
}

// at is a unit of heat at one vertex.
func at(n, v int) []float64 {
	load := make([]float64, n)
	load[v] = 1
	return load
}

func maxAbs(x []float64) float64 {
	top := 0.0
	for _, v := range x {
		top = max(top, math.Abs(v))
	}
	return top
}

func maxDiff(a, b []float64) float64 {
	top := 0.0
	for i := range a {
		top = max(top, math.Abs(a[i]-b[i]))
	}
	return top
}
