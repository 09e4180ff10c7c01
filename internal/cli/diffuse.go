package cli

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
	"heatskin/mesh"
)

// balanceSummary is where heat came from and went up to one time:
// total = begin + put_in - taken_at_holds - lost.
type balanceSummary struct {
	Begin number        `json:"begin"`  // at time 0, held values in place
	PutIn number        `json:"put_in"` // by --rate
	Taken number        `json:"taken_at_holds"`
	Lost  []lossSummary `json:"lost"`
}

// lossSummary is the heat that one exchange has taken; below 0 if it gave.
type lossSummary struct {
	Name string `json:"name"`
	Heat number `json:"heat"`
}

// steadySummary is what the summary says of the limit in time.
type steadySummary struct {
	Steady steadyField `json:"steady"`
}

type steadyField struct {
	Total        number `json:"total"`
	LowestValue  number `json:"lowest_value"`
	LargestValue number `json:"largest_value"`
	SolveError   number `json:"solve_error"` // relative, that the solve may have left
}

// newDiffuse is `heatskin diffuse`.
func newDiffuse(j *job) *cobra.Command {
	var (
		input       meshFlags
		refine      refineFlags
		source      sourceFlags
		given       givenFlags
		conditions  conditionFlags
		output      outputFlags
		initial     initialFlag
		times       timesFlag
		diffusivity float64
		steady      bool
	)
	step := stepperFlags{doubling: true}
	cmd := &cobra.Command{
		Use:   "diffuse MESH ... --time T[,T...] | --steady",
		Short: "How does a given field spread, with edges held, insulated or losing heat?",
		Long: `How does a given field spread, with edges held, insulated or losing heat?

Solves du/dt = div(D grad u) - c (u - ambient) + rate from a given field, heat at sources, or
both. Edges are insulated unless they are held at a value or lose heat: D du/dn = -c (u - ambient).
A column u_t0.5 is the field at --time 0.5, u_steady its limit. Heat is the area integral
of u; the summary has its balance at every time: what was there, put in, taken at held
places and lost.`,
		Example: `  heatskin diffuse cap.stl --initial warm.csv --time 1,10 --out cooler.ply
  heatskin diffuse cap.stl --hold-boundary 0=20 --hold-boundary 1=80 --steady --out u.csv
  heatskin diffuse cap.stl --at-point 40,0,53 --rate 12 --face-loss 0.05,20 --initial start.ply:u \
      --time 60,600 --steady --probe sensors.csv --history curve.csv --out hot.vtu
  heatskin diffuse cap.stl --at-boundary 1 --heat 3 --edge-loss 0=0.4,20 --time 5 > u.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	times.register(flags)
	flags.BoolVar(&steady, "steady", false, "the field that it tends to, as u_steady")
	positiveVar(flags, &diffusivity, "diffusivity", 1, "`D` in length^2 per second, in the file's length unit")
	source.register(flags, "at")
	given.register(flags)
	varFunc(flags, "initial", "", "the field at time 0: `FILE.csv|FILE.ply:PROPERTY`, columns vertex,u (or FILE.csv:COLUMN)", initial.set)
	conditions.register(flags)
	step.register(cmd)
	output.register(flags)
	flags.StringVar(&output.history, "history", "", "the field at the probes over time, as `FILE.csv` with a row for each probe and time")
	input.register(flags)
	input.registerMetric(flags, mesh.NewTensorMetric)
	refine.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		sources := -1
		if len(source.files) == 0 {
			sources = len(source.asked)
		}
		switch {
		case len(times.seconds) == 0 && !steady:
			return usagef("diffuse: want --time T[,T...], --steady, or both")
		case len(times.seconds) == 0 && output.history != "":
			return usagef("--history %s: want --time T[,T...] too", output.history)
		case sources == 0 && len(given.rate) == 0 && initial.file == "" && !conditions.any():
			return usagef("diffuse: want something that spreads: a source (--at-vertex N...), --initial, --hold-boundary, --hold-file, --rate, --edge-loss or --face-loss")
		}
		if err := given.check(sources); err != nil {
			return err
		}
		if err := step.check(cmd); err != nil {
			return err
		}
		if err := output.prepare(slices.Concat(source.files, input.tables(), []string{args[0], initial.file, conditions.file})...); err != nil {
			return err
		}
		if err := initial.open(ctx); err != nil {
			return err
		}
		if err := conditions.open(); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		content := conditions.resolution(diffusivity, times.seconds, len(source.asked) > 0)
		g, err := prepare(ctx, j, part, &input, &refine, &source, content)
		if err != nil {
			return err
		}
		sources = len(g.data)
		if err := given.check(sources); err != nil {
			return refuse(errors.Unwrap(err)) // it was the table of points that did not suit
		}
		for _, loops := range []*sourceFlags{&conditions.hold, &conditions.lose} {
			more, err := loops.place(ctx, j, part, g.part, &input)
			if err != nil {
				return err
			}
			g.data = append(g.data, more...)
		}
		if err := g.makeSolver(ctx, j); err != nil {
			return err
		}

		problem := &kernel.Problem{Diffusivity: diffusivity}
		if initial.file != "" {
			values, err := initial.values(g.surface, part.NumVertices())
			if err != nil {
				return err
			}
			problem.Initial = g.carry(values)
		}
		given.apply(problem, g, sources)
		if err := conditions.apply(problem, g, sources); err != nil {
			return err
		}
		if err := g.bounded(problem); err != nil {
			return err
		}
		found := g.result(refine.keep)
		j.summary.kernelSummary = &kernelSummary{Heat: []heatSummary{}}
		if len(times.seconds) > 0 {
			options := kernel.FlowOptions{Stepper: kernel.Stepper(step.stepper), Tolerance: step.tolerance, Steps: step.steps}
			if step.stepper == implicitEuler && flags.Changed("tolerance") {
				options.Steps = 0 // as many as it takes
			}
			if err := diffuse(ctx, j, g, problem, &times, options, found); err != nil {
				return err
			}
		}
		if steady {
			j.clock.enter("steady")
			u, off, err := g.solver.Steady(ctx, problem)
			if err != nil {
				return judged(err)
			}
			found.fields = append(found.fields, fieldfile.Column{Name: "u_steady", Values: u})
			low, high := extremes(u)
			j.summary.steadySummary = &steadySummary{steadyField{number(g.heat(u)), number(low), number(high), number(off)}}
		}
		if err := g.finiteFields(found); err != nil {
			return err
		}
		if output.history != "" {
			found.tables = append(found.tables, table{output.history, func(w io.Writer) error {
				return output.points.writeHistory(w, times.seconds)
			}})
		}
		return output.save(ctx, j, found)
	}
	return cmd
}

// diffuse advances a problem to the times asked for and adds the fields to found.
func diffuse(ctx context.Context, j *job, g *ground, problem *kernel.Problem, times *timesFlag, options kernel.FlowOptions, found *result) error {
	flow, err := g.solver.Diffuse(ctx, problem, times.seconds, options)
	if err != nil {
		return judged(err)
	}
	for _, text := range flow.Warnings {
		j.warn(text)
	}
	edge := g.longestAtJumps(problem)
	j.summary.Solves = flow.Solves
	j.summary.Factorizations = flow.Factorizations
	for i, name := range times.names("u_t") {
		found.fields = append(found.fields, fieldfile.Column{Name: name, Values: flow.Fields[i]})
		t, b := times.seconds[i], flow.Balances[i]
		low, high := extremes(flow.Fields[i])
		balance := &balanceSummary{Begin: number(b.Begin), PutIn: number(b.Put), Taken: number(b.Held), Lost: []lossSummary{}}
		for k, heat := range b.Lost {
			balance.Lost = append(balance.Lost, lossSummary{problem.Exchanges[k].Name, number(heat)})
		}
		off := math.NaN() // where nothing jumps there is no such error
		if edge > 0 {
			off = edge / t * edge / (8 * problem.Diffusivity)
		}
		j.summary.Heat = append(j.summary.Heat, heatSummary{
			Time: number(t), Total: number(b.Inside), BalanceError: number(b.Error),
			TimeError: number(flow.ErrorEstimates[i]), MeshError: number(off),
			LowestValue: number(low), LargestValue: number(high),
			balanceSummary: balance,
		})
		if off > 0.05 {
			j.warn(fmt.Sprintf("t = %g is short for this mesh: edges of %.3g at sources and held places put values near them off by about %.2g %%; --max-edge %.2g brings that to 1 %%",
				t, edge, min(100, 100*off), kernel.ResolvingEdge(problem.Diffusivity*g.surface.LeastDensity(), t)))
		}
	}
	return nil
}

// resolution is what a part is cut to unasked. Where values jump (at sources, at edges
// that are held or lose heat) the shortest time has to be resolved, and the length
// sqrt(D/c) over which a face that loses heat forgets them.
func (c *conditionFlags) resolution(diffusivity float64, seconds []float64, sources bool) resolution {
	times := slices.Clone(seconds)
	if c.faceLoss != nil && c.faceLoss.coefficient > 0 {
		times = append(times, 1/c.faceLoss.coefficient)
	}
	jumps := sources || c.file != "" || len(c.said) > 0
	switch {
	case !jumps && len(seconds) > 0:
		return evenly // a given field is no finer than the file
	case !jumps || len(times) == 0:
		return forFields
	}
	return func(s *mesh.Surface) float64 { return min(forFields(s), forHeat(diffusivity, times)(s)) }
}

// longestAtJumps is the longest edge of a triangle where heat is put in, or u is held
// at one corner and free at another, as kernel's estimate for the heat of a point takes it.
func (g *ground) longestAtJumps(pr *kernel.Problem) float64 {
	held := func(v int32) bool { return pr.Hold != nil && !math.IsNaN(pr.Hold[v]) }
	longest := 0.0
	for first := 0; first < len(g.surface.Vert); first += 3 {
		corners := g.surface.Vert[first : first+3]
		put, holds := false, 0
		for _, v := range corners {
			put = put || pr.Load != nil && pr.Load[v] != 0 && !held(v)
			if held(v) {
				holds++
			}
		}
		if put || holds > 0 && holds < 3 {
			edge := max(g.surface.Length[first], g.surface.Length[first+1], g.surface.Length[first+2])
			longest = max(longest, g.surface.Slow(int32(first/3), edge))
		}
	}
	return longest
}

// heat is the area integral of a field where it has values.
func (g *ground) heat(u []float64) float64 {
	sum := 0.0
	for v, area := range g.solver.Areas() {
		if area > 0 && !math.IsNaN(u[v]) {
			sum += area * u[v]
		}
	}
	return sum
}

// extremes are the smallest and the largest value of a field; NaN if it has none.
func extremes(u []float64) (low, high float64) {
	low, high = math.NaN(), math.NaN()
	for _, x := range u {
		if math.IsNaN(low) || x < low {
			low = x
		}
		if math.IsNaN(high) || x > high {
			high = x
		}
	}
	return low, high
}
