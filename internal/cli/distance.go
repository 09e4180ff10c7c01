package cli

import (
	"fmt"
	"math"
	"slices"

	"github.com/spf13/cobra"

	"heatskin/kernel"
	"heatskin/mesh"
)

// distanceSummary is what the summary says of distances. Errors are relative.
type distanceSummary struct {
	Method             string `json:"method"`
	Settled            bool   `json:"settled_by_exact_propagation"` // see settle
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
		target errorTarget
		ask    distanceQuestion
	)
	cmd := &cobra.Command{
		Use:   "distance MESH SOURCE...",
		Short: "How far, along the surface, is every point from the datum?",
		Long: `How far, along the surface, is every point from the datum?

The datum is one source or several: the distance is that to the nearest of them. It is
measured along the triangles, whatever their shape. A vertex that no source can be reached
from has the distance inf.

Where the fast method finds that it cannot be sure of its distances on a coarse part, exact
propagation takes over and a message says so; --max-edge (none, or a length) and --target-error leave it alone.

With --metric or --tensor lengths are those of the metric: see the README.

The estimated error is that of the method against shortest paths over the flat triangles.
The chord error is another matter: how far distances on the flat triangles are from those
on the curved part that they may stand for. No refinement lowers that one.`,
		Example: `  heatskin distance cap.stl --at-boundary 1 --out creep.ply --out creep.csv
  heatskin distance cap.stl --at-point 40,0,53 --probe sensors.csv --probe-out readings.csv --out field.csv
  heatskin distance cap.stl --at-vertex 12 --method exact > exact.csv
  heatskin distance cap.stl --at-vertex 12 --target-error 0.05% --out sure.csv
  heatskin distance cap.stl --at-file pins.csv --matrix between-pins.csv --each --out pins.ply
  zcat part.ply.gz | heatskin distance - --format ply --at-crease 60 > to-edges.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	source.register(flags, "at")
	oneOfVar(flags, &ask.method, "method", methodHeat, []string{methodHeat, methodExact},
		"`heat|exact`: fast, or shortest paths over the flat triangles without any discretisation error")
	flags.BoolVar(&ask.options.Smooth, "smooth", false, "heat: a field without kinks where fronts meet; less accurate")
	ask.options.Smoothing = 1
	varFunc(flags, "smoothing", "1", "heat: scale the time of the heat solve by `F`", func(text string) error {
		x, err := positive(text)
		if err == nil && x > mostSmoothing {
			err = fmt.Errorf("want a number above 0, and at most %d", int(mostSmoothing))
		}
		if err == nil {
			ask.options.Smoothing = x
		}
		return err
	})
	target.register(flags)
	flags.BoolVar(&ask.each, "each", false, "one column for each source (distance_0, distance_1...) in place of their union")
	flags.StringVar(&ask.matrix, "matrix", "", "distances between all sources, as `FILE.csv` with the columns from,to,distance")
	output.register(flags)
	input.register(flags)
	input.registerMetric(flags, mesh.NewArrivalMetric)
	refine.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if err := source.want("distance"); err != nil {
			return err
		}
		if ask.method == methodExact && (flags.Changed("smooth") || flags.Changed("smoothing")) {
			return usagef("--smooth and --smoothing belong to --method heat")
		}
		if ask.method == methodExact && input.metric+input.tensor != "" {
			return usagef("--method exact goes by lengths in space; --metric and --tensor need --method heat")
		}
		if target.mean > 0 && math.IsInf(refine.maxEdge, 1) {
			return usagef("--target-error refines where --max-edge none forbids it; leave one of them out")
		}
		if ask.matrix != "" {
			output.tables = append(output.tables, ask.matrix)
		}
		if err := output.prepare(slices.Concat(source.files, input.tables(), []string{args[0]})...); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		content := resolution(kernel.FrontEdge)
		if ask.method == methodExact {
			content = nil // its results do not depend on how flat faces are cut
		}
		g, err := prepare(ctx, j, part, &input, &refine, &source, content)
		if err != nil {
			return err
		}
		chords := make(chan float64, 1) // beside the solve, which leaves a processor idle at times
		go func() { chords <- chordError(part) }()
		ask.probes, ask.keep = output.points, refine.keep
		got, err := ask.answer(ctx, j, g)
		if err != nil {
			return err
		}
		if ask.method == methodHeat && !ask.options.Smooth && !flags.Changed("smoothing") && refine.maxEdge == 0 && target.mean == 0 && part.Metric == nil {
			if got, err = ask.settle(ctx, j, g, got, &source); err != nil {
				return err
			}
		}
		var missed error
		if target.mean > 0 {
			if got, missed, err = target.pursue(ctx, j, g, got, &input, &source, &ask); err != nil {
				return err
			}
		}

		j.clock.enter("chords")
		j.summary.distanceSummary = summarizeDistance(ask.method, got, <-chords)
		j.summary.Solves = got.solves
		if far := float64(j.summary.LargestDistance); !math.IsNaN(far) {
			j.note("largest distance %s, %d of %d vertices reached", input.length(far), j.summary.Reached, got.shown.NumVertices())
			j.note("%s", j.summary.accuracy())
		}
		if err := output.save(ctx, j, &got.result); err != nil {
			return err
		}
		return missed
	}
	return cmd
}

// chordError is that of a part; NaN where a metric counts that knows of no chords.
func chordError(part *mesh.Mesh) float64 {
	if part.Metric != nil {
		return math.NaN()
	}
	return mesh.ChordError(part)
}

// summarizeDistance looks at the rows that are shown.
func summarizeDistance(method string, found *distanceAnswer, chords float64) *distanceSummary {
	s := &distanceSummary{
		Method:             method,
		Settled:            found.settled,
		EstimatedMeanError: number(found.mean), EstimatedMaxError: number(found.most),
		ChordError:      number(chords),
		LargestDistance: number(math.NaN()),
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

// accuracy keeps two facts apart that are easily mixed up.
func (s *distanceSummary) accuracy() string {
	method := "no error on the flat triangles but rounding"
	if s.Method != methodExact && !s.Settled {
		method = fmt.Sprintf("estimated error on the flat triangles: %s in the mean, %s at most",
			roughly(float64(s.EstimatedMeanError)), roughly(float64(s.EstimatedMaxError)))
	}
	if math.IsNaN(float64(s.ChordError)) {
		return method
	}
	return fmt.Sprintf("%s; the triangles against a curved part they may stand for (chord error): %s", method, roughly(float64(s.ChordError)))
}
