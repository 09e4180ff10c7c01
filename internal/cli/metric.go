package cli

import (
	"errors"
	"fmt"
	"strconv"

	"github.com/spf13/pflag"

	"heatskin/internal/fieldfile"
	"heatskin/mesh"
)

// registerMetric is for commands that work on a metric other than that of space:
// --metric --tensor.
func (m *meshFlags) registerMetric(flags *pflag.FlagSet, kind tensorKind) {
	m.kind = kind
	flags.StringVar(&m.metric, "metric", "", "the surface's own metric over a flat mesh in x,y: `FILE.csv`, columns vertex,g11,g12,g22; lengths are then its lengths")
	flags.StringVar(&m.tensor, "tensor", "", "principal diffusivities of each triangle along a direction and across it: `FILE.csv`, columns triangle,dx,dy,dz,along,across; distances are then times of arrival")
}

// tables are the files beside the mesh.
func (m *meshFlags) tables() []string { return []string{m.metric, m.tensor} }

// measure gives the mesh the metric asked for, if any. The error is a refusal.
func (m *meshFlags) measure(part *mesh.Mesh) (err error) {
	switch {
	case m.metric != "":
		part.Metric, err = chartMetric(m.metric, part)
	case m.tensor != "":
		part.Metric, err = tensorMetric(m.tensor, part, m.kind)
	}
	return refuse(err)
}

// chartMetric reads vertex,g11,g12,g22, in any order of rows. Vertices in no triangle
// need none.
func chartMetric(name string, part *mesh.Mesh) (*mesh.Metric, error) {
	t, err := readTable(name, "vertex", "g11", "g12", "g22")
	if err != nil {
		return nil, err
	}
	n := part.NumVertices()
	needed := make([]bool, n)
	for _, v := range part.Triangles {
		needed[v] = true
	}
	values, lines, err := byNumber(t, "vertex", needed, "g11", "g12", "g22")
	if err != nil {
		return nil, err
	}
	g := make([]float64, 3*n)
	for v := range n {
		for k := range values {
			g[3*v+k] = values[k][v]
		}
	}
	metric, err := mesh.NewChartMetric(part, g)
	var wrong *mesh.NotFlatError
	if errors.As(err, &wrong) {
		return nil, fmt.Errorf("%s: %w", part.File.Name, err)
	}
	return metric, inTable(t, lines, err)
}

// tensorKind is what a tensor is wanted for: mesh.NewTensorMetric or NewArrivalMetric.
type tensorKind func(m *mesh.Mesh, direction, along, across []float64) (*mesh.Metric, error)

// tensorMetric reads triangle,dx,dy,dz,along,across, in any order of rows.
func tensorMetric(name string, part *mesh.Mesh, newMetric tensorKind) (*mesh.Metric, error) {
	t, err := readTable(name, "triangle", "dx", "dy", "dz", "along", "across")
	if err != nil {
		return nil, err
	}
	needed := make([]bool, part.NumTriangles())
	for f := range needed {
		needed[f] = true
	}
	values, lines, err := byNumber(t, "triangle", needed, "dx", "dy", "dz", "along", "across")
	if err != nil {
		return nil, err
	}
	direction := make([]float64, 3*len(needed))
	for f := range needed {
		for axis := range 3 {
			direction[3*f+axis] = values[axis][f]
		}
	}
	metric, err := newMetric(part, direction, values[3], values[4])
	return metric, inTable(t, lines, err)
}

// byNumber sorts the rows of columns by the number in the column key: each number once,
// and every one that is needed. lines says where each stands.
func byNumber(t *fieldfile.Table, key string, needed []bool, columns ...string) (values [][]float64, lines []int, err error) {
	numbers, err := t.Int32s(key, 0, int32(len(needed)-1))
	if err != nil {
		return nil, nil, err
	}
	lines = make([]int, len(needed))
	for row, i := range numbers {
		if lines[i] > 0 {
			return nil, nil, t.Refuse(row, key, fmt.Sprintf("each %s once (it stands in line %d)", key, lines[i]))
		}
		lines[i] = t.Line[row]
	}
	for i, is := range needed {
		if is && lines[i] == 0 {
			return nil, nil, &fieldfile.TableError{File: t.File, Line: t.Line[len(numbers)-1] + 1, Column: key,
				Want: fmt.Sprintf("a row for each %s from 0 to %d", key, len(needed)-1), Got: "none for " + key + " " + strconv.Itoa(i)}
		}
	}
	for _, column := range columns {
		rows, err := t.Floats(column)
		if err != nil {
			return nil, nil, err
		}
		sorted := make([]float64, len(needed))
		for row, i := range numbers {
			sorted[i] = rows[row]
		}
		values = append(values, sorted)
	}
	return values, lines, nil
}

// inTable says in which line of the table a metric is none.
func inTable(t *fieldfile.Table, lines []int, err error) error {
	var wrong *mesh.MetricError
	if !errors.As(err, &wrong) {
		return err
	}
	line := lines[max(wrong.Vertex, wrong.Triangle)]
	return fmt.Errorf("%s:%d: %w", t.File, line, err)
}

// warnOfMetric tells where the triangles of g are too large for its metric.
func (g *ground) warnOfMetric(j *job) {
	const visible = 1e-6
	if g.part.Metric == nil {
		return
	}
	if off := g.surface.Guard.Relative; off > visible {
		j.warn(fmt.Sprintf("the metric changes so much within triangles that their sides make none: %d edges were lengthened, by up to %s of the longest beside them; a smaller --max-edge helps",
			g.surface.Guard.Edges, percent(off)))
	}
	if off := g.surface.Mismatch; off > 0.1 {
		j.warn(fmt.Sprintf("neighbouring triangles differ in their tensors: the edge between two has a length %s off that in one of them, and the tensors are blended there; the error falls with --max-edge",
			percent(off)))
	}
}
