package cli

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
	"heatskin/mesh"
)

// passageSummary is what the summary says of first passage.
type passageSummary struct {
	LargestMeanTime     number `json:"largest_mean_time"` // of those that are finite
	UnreachedComponents int    `json:"unreached_components"`
	Residual            number `json:"residual"` // largest relative error that a solve may have left
}

// newPassage is `heatskin passage`.
func newPassage(j *job) *cobra.Command {
	var (
		input       meshFlags
		refine      refineFlags
		target      sourceFlags
		output      outputFlags
		diffusivity float64
	)
	cmd := &cobra.Command{
		Use:   "passage MESH TO",
		Short: "When does a wandering particle first reach the target, and which one first?",
		Long: `When does a wandering particle first reach the target, and which one first?

For a Brownian particle that starts at each vertex: the column mean_time is the mean time
until it first comes to any of the targets, and with several targets reach_0, reach_1... are
the probabilities of coming to each of them first, in the order of the command line. Edges
that are no target reflect. Where no target can be reached mean_time is inf. The density of
the particle obeys du/dt = D * Laplacian(u); as probabilists define it, D = 1/2.`,
		Example: `  heatskin passage cap.stl --to-boundary 0 --diffusivity 0.7 --out exit.ply
  heatskin passage cap.stl --to-boundary 0 --to-boundary 1 > which-first.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	target.register(flags, "to")
	positiveVar(flags, &diffusivity, "diffusivity", 1, "`D` in length^2 per second, in the file's length unit")
	output.register(flags)
	input.register(flags)
	input.registerMetric(flags, mesh.NewTensorMetric)
	refine.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if err := target.want("passage"); err != nil {
			return err
		}
		if err := output.prepare(slices.Concat(target.files, input.tables(), []string{args[0]})...); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		g, err := prepare(ctx, j, part, &input, &refine, &target, forFields)
		if err != nil {
			return err
		}
		if err := g.makeSolver(ctx, j); err != nil {
			return err
		}
		targets := make([][]int32, len(g.data))
		points := 0
		for i := range g.data {
			targets[i] = g.verticesOf(i)
			if g.surface.Site(i) >= 0 {
				points++
			}
		}
		passage, err := g.solver.Passage(ctx, targets, diffusivity)
		if err != nil {
			var wrong *kernel.TargetError
			if errors.As(err, &wrong) && wrong.Target < len(g.data) {
				err = fmt.Errorf("%s: %w", g.data[wrong.Target].Name, err)
			}
			return judged(err)
		}
		for _, text := range passage.Warnings {
			j.warn(text)
		}
		if points > 0 {
			j.warn(fmt.Sprintf("%d of %d targets are single points: a wandering particle never hits a point, so mean_time grows without end (like a logarithm) as edges there get shorter; a small hole is a sounder target", points, len(targets)))
		}
		found := g.result(refine.keep)
		found.fields = append(found.fields, fieldfile.Column{Name: "mean_time", Values: passage.MeanTime})
		for k, p := range passage.Reach {
			found.fields = append(found.fields, fieldfile.Column{Name: "reach_" + strconv.Itoa(k), Values: p})
		}
		largest := 0.0
		for _, t := range passage.MeanTime {
			if !math.IsInf(t, 0) && t > largest {
				largest = t
			}
		}
		j.summary.Solves = passage.Solves
		j.summary.passageSummary = &passageSummary{number(largest), passage.Unreached, number(passage.Residual)}
		j.note("largest mean time %.6g s", largest)
		return output.save(ctx, j, found)
	}
	return cmd
}
