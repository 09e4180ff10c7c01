package cli

import (
	"context"
	"fmt"
	"io"
	"math"
	"strconv"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
)

// distanceSummary is what the summary says of distances. Errors are relative.
type distanceSummary struct {
	Method             string `json:"method"`
	EstimatedMeanError number `json:"estimated_mean_error"`
	EstimatedMaxError  number `json:"estimated_max_error"`
	ChordError         number `json:"chord_error"`
	LargestDistance    number `json:"largest_distance"`
	Reached            int    `json:"reached_vertices"`
}

// newDistance is `heatskin distance`.
func newDistance(j *job) *cobra.Command {
	var (
		input  meshFlags
		refine refineFlags
		source sourceFlags
		output outputFlags
		method string
		each   bool
		matrix string
		opts   kernel.DistanceOptions
	)
	cmd := &cobra.Command{
		Use:   "distance MESH SOURCE...",
		Short: "How far, along the surface, is every point from the datum?",
		Long: `How far, along the surface, is every point from the datum?

The datum is one source or several: the distance is that to the nearest of them. It is
measured along the triangles, whatever their shape. A vertex that no source can be reached
from has the distance inf.`,
		Example: `  heatskin distance cap.stl --at-boundary 1 --out creep.ply --out creep.csv
  heatskin distance cap.stl --at-point 40,0,53 --probe sensors.csv --probe-out readings.csv --out field.csv
  heatskin distance cap.stl --at-file pins.csv --matrix between-pins.csv --each --out pins.ply
  zcat part.ply.gz | heatskin distance - --format ply --at-crease 60 > to-edges.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	source.register(flags, "at")
	oneOfVar(flags, &method, "method", "heat", []string{"heat"}, "`heat`: fast, with a front that keeps its curvature")
	flags.BoolVar(&opts.Smooth, "smooth", false, "a field without kinks where fronts meet; less accurate")
	positiveVar(flags, &opts.Smoothing, "smoothing", 1, "scale the time of the heat solve by `F`")
	flags.BoolVar(&each, "each", false, "one column for each source (distance_0, distance_1...) in place of their union")
	flags.StringVar(&matrix, "matrix", "", "distances between all sources, as `FILE.csv` with the columns from,to,distance")
	output.register(flags)
	input.register(flags)
	refine.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if err := source.want("distance"); err != nil {
			return err
		}
		if matrix != "" {
			output.tables = append(output.tables, matrix)
		}
		if err := output.prepare(ctx, args[0]); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		g, err := prepare(ctx, j, part, &input, &refine, &source)
		if err != nil {
			return err
		}
		d := &distances{ground: g, options: opts}
		var fields []fieldfile.Column
		if each {
			for i := range g.data {
				values, err := d.from(ctx, i)
				if err != nil {
					return err
				}
				fields = append(fields, fieldfile.Column{Name: "distance_" + strconv.Itoa(i), Values: values})
			}
		} else {
			values, err := d.union(ctx)
			if err != nil {
				return err
			}
			fields = append(fields, fieldfile.Column{Name: "distance", Values: values})
		}
		found := g.result(fields, refine.keep)
		if matrix != "" {
			between, err := d.matrix(ctx)
			if err != nil {
				return err
			}
			found.tables = append(found.tables, table{matrix, between.write})
		}
		j.summary.Solves = d.solves
		j.summary.distanceSummary = summarize(method, fields, found.rows)
		if far := j.summary.LargestDistance; !math.IsNaN(float64(far)) {
			j.note("largest distance %s, %d of %d vertices reached", input.length(float64(far)), j.summary.Reached, found.rows)
		}
		return output.save(ctx, j, found)
	}
	return cmd
}

// distances answers for the sources of a ground, singly and together.
type distances struct {
	*ground
	options kernel.DistanceOptions
	single  [][]float64 // by source, once asked for
	solves  int
}

// union is the distance to the nearest source.
func (d *distances) union(ctx context.Context) ([]float64, error) {
	if len(d.data) == 1 {
		return d.from(ctx, 0)
	}
	return d.solve(ctx, nil)
}

// from is the distance to source i.
func (d *distances) from(ctx context.Context, i int) ([]float64, error) {
	if d.single == nil {
		d.single = make([][]float64, len(d.data))
	}
	if d.single[i] == nil {
		var err error
		if d.single[i], err = d.solve(ctx, []int{i}); err != nil {
			return nil, err
		}
	}
	return d.single[i], nil
}

func (d *distances) solve(ctx context.Context, which []int) ([]float64, error) {
	found, err := d.solver.Distance(ctx, which, d.options)
	if err != nil {
		return nil, solverError(err)
	}
	d.solves += found.Solves
	return found.Distance, nil
}

// A distanceMatrix holds distances between sources, row by row.
type distanceMatrix struct {
	n      int
	values []float64
}

// matrix is the distance between every two sources. Seen from either end a line's
// nearest point may fall between vertices, and the other end then sees it better:
// hence the lesser of the two, which also makes the matrix symmetric.
func (d *distances) matrix(ctx context.Context) (*distanceMatrix, error) {
	m := &distanceMatrix{n: len(d.data), values: make([]float64, len(d.data)*len(d.data))}
	for i := range d.data {
		field, err := d.from(ctx, i)
		if err != nil {
			return nil, err
		}
		for k := range d.data {
			m.values[i*m.n+k] = d.nearest(field, k)
		}
	}
	for i := range m.n {
		for k := range i {
			least := min(m.values[i*m.n+k], m.values[k*m.n+i])
			m.values[i*m.n+k], m.values[k*m.n+i] = least, least
		}
	}
	return m, nil
}

// nearest is the least value of field on source k.
func (d *distances) nearest(field []float64, k int) float64 {
	if v := d.surface.Site(k); v >= 0 {
		return field[v]
	}
	least := math.Inf(1)
	for _, edge := range d.data[k].Edges {
		least = min(least, field[edge[0]], field[edge[1]])
	}
	return least
}

func (m *distanceMatrix) write(w io.Writer) error {
	if _, err := fmt.Fprintln(w, "from,to,distance"); err != nil {
		return err
	}
	for i, x := range m.values {
		if _, err := fmt.Fprintf(w, "%d,%d,%s\n", i/m.n, i%m.n, full(x)); err != nil {
			return err
		}
	}
	return nil
}

// summarize looks at the rows that are shown.
func summarize(method string, fields []fieldfile.Column, rows int) *distanceSummary {
	nan := number(math.NaN())
	s := &distanceSummary{
		Method:             method,
		EstimatedMeanError: nan, EstimatedMaxError: nan, ChordError: nan, LargestDistance: nan,
	}
	reached := make([]bool, rows)
	for _, f := range fields {
		for v, x := range f.Values[:rows] {
			if !math.IsInf(x, 0) && !math.IsNaN(x) {
				reached[v] = true
				if !(float64(s.LargestDistance) >= x) {
					s.LargestDistance = number(x)
				}
			}
		}
	}
	for _, is := range reached {
		if is {
			s.Reached++
		}
	}
	return s
}
