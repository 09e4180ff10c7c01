package cli

import (
	"fmt"
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

// mostSmoothing is the longest time of the heat solve, in squares of the mean edge:
// longer ones reach across a thousand edges, and u no longer tells near from far.
const mostSmoothing = 1e6

const (
	methodHeat  = "heat"
	methodExact = "exact"
)

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
  heatskin distance cap.stl --at-vertex 12 --method exact > exact.csv
  heatskin distance cap.stl --at-file pins.csv --matrix between-pins.csv --each --out pins.ply
  zcat part.ply.gz | heatskin distance - --format ply --at-crease 60 > to-edges.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	source.register(flags, "at")
	oneOfVar(flags, &method, "method", methodHeat, []string{methodHeat, methodExact},
		"`heat|exact`: fast, or shortest paths over the flat triangles without any discretisation error")
	flags.BoolVar(&opts.Smooth, "smooth", false, "heat: a field without kinks where fronts meet; less accurate")
	opts.Smoothing = 1
	varFunc(flags, "smoothing", "1", "heat: scale the time of the heat solve by `F`", func(text string) error {
		x, err := positive(text)
		if err == nil && x > mostSmoothing {
			err = fmt.Errorf("want a number above 0, and at most %d", int(mostSmoothing))
		}
		if err == nil {
			opts.Smoothing = x
		}
		return err
	})
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
		if method == methodExact && (flags.Changed("smooth") || flags.Changed("smoothing")) {
			return usagef("--smooth and --smoothing belong to --method heat")
		}
		if matrix != "" {
			output.tables = append(output.tables, matrix)
		}
		if err := output.prepare(append(source.files, args[0])...); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		content := resolution(evenly)
		if method == methodExact {
			content = nil // its results do not depend on how flat faces are cut
		}
		g, err := prepare(ctx, j, part, &input, &refine, &source, content)
		if err != nil {
			return err
		}
		var measure ruler
		if method == methodExact {
			measure = newExactRuler(j, g)
		} else if measure, err = newHeatRuler(ctx, j, g, opts); err != nil {
			return err
		}

		columns := []string{"distance"}
		sources := [][]int{nil}
		if each {
			columns, sources = nil, nil
			for i := range g.data {
				columns = append(columns, "distance_"+strconv.Itoa(i))
				sources = append(sources, []int{i})
			}
		}
		found := g.result(refine.keep)
		for i, name := range columns {
			values, err := measure.field(ctx, sources[i])
			if err != nil {
				return err
			}
			found.fields = append(found.fields, fieldfile.Column{Name: name, Values: values})
		}
		if output.points != nil {
			places := output.points.on(g.part)
			for i, name := range columns {
				values, err := measure.at(ctx, sources[i], places)
				if err != nil {
					return err
				}
				if values != nil {
					found.probed = append(found.probed, fieldfile.Column{Name: name, Values: values})
				}
			}
		}
		if matrix != "" {
			between, err := measureMatrix(ctx, measure, len(g.data))
			if err != nil {
				return err
			}
			found.tables = append(found.tables, table{matrix, between.write})
		}

		j.summary.distanceSummary = summarizeDistance(method, found)
		if heat, ok := measure.(*heatRuler); ok {
			j.summary.Solves = heat.solves
		}
		if far := float64(j.summary.LargestDistance); !math.IsNaN(far) {
			j.note("largest distance %s, %d of %d vertices reached", input.length(far), j.summary.Reached, found.shown.NumVertices())
		}
		return output.save(ctx, j, found)
	}
	return cmd
}

// summarizeDistance looks at the rows that are shown.
func summarizeDistance(method string, found *result) *distanceSummary {
	nan := number(math.NaN())
	s := &distanceSummary{
		Method:             method,
		EstimatedMeanError: nan, EstimatedMaxError: nan, ChordError: nan, LargestDistance: nan,
	}
	if method == methodExact {
		s.EstimatedMeanError, s.EstimatedMaxError = 0, 0
	}
	rows := found.shown.NumVertices()
	reached := make([]bool, rows)
	for _, f := range found.fields {
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
