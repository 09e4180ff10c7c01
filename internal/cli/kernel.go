package cli

import (
	"slices"
	"strconv"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
	"heatskin/mesh"
)

// kernelSummary is what the summary says of heat.
type kernelSummary struct {
	Heat           []heatSummary `json:"heat"`
	Factorizations int           `json:"factorizations"`
}

// heatSummary is the balance at one time: how much heat there is, and how far that
// is from what was put in, relative to it.
type heatSummary struct {
	Time         number `json:"time"`
	Total        number `json:"total"`
	BalanceError number `json:"balance_error"`
	TimeError    number `json:"estimated_time_error"` // of the stepper, over the largest value
	MeshError    number `json:"estimated_mesh_error"` // of the edges near the source, relative
	LowestValue  number `json:"lowest_value"`
	LargestValue number `json:"largest_value"`

	*balanceSummary // diffuse: where the heat came from and went
}

// stepperFlags choose how time is crossed: --stepper --tolerance --steps.
type stepperFlags struct {
	stepper   string
	tolerance float64
	steps     int
	doubling  bool // implicit-euler may double its steps up to a tolerance
}

const (
	krylov        = string(kernel.Krylov)
	implicitEuler = string(kernel.ImplicitEuler)
)

func (s *stepperFlags) register(cmd *cobra.Command) {
	flags := cmd.Flags()
	oneOfVar(flags, &s.stepper, "stepper", krylov, []string{krylov, implicitEuler},
		"`krylov|implicit-euler`: to a tolerance, or in equal steps that never overshoot")
	usage := "krylov: `ERROR` in time, relative to the largest value"
	if s.doubling {
		usage += "; implicit-euler: its steps are doubled until two runs differ by less"
	}
	positiveVar(flags, &s.tolerance, "tolerance", kernel.DefaultTolerance, usage)
	s.steps = kernel.DefaultSteps
	varFunc(flags, "steps", strconv.Itoa(s.steps), "implicit-euler: `N` steps up to each time from the one before", func(text string) error {
		n, err := whole(text, 1)
		if err == nil {
			s.steps = n
		}
		return err
	})
}

// check refuses a flag that the chosen stepper would not look at.
func (s *stepperFlags) check(cmd *cobra.Command) error {
	tolerance, steps := cmd.Flags().Changed("tolerance"), cmd.Flags().Changed("steps")
	switch {
	case s.stepper == implicitEuler && tolerance && !s.doubling:
		return usagef("--tolerance belongs to --stepper krylov; implicit-euler takes --steps N")
	case s.stepper == implicitEuler && tolerance && steps:
		return usagef("--steps and --tolerance: implicit-euler takes as many steps as it is told, or as it needs; choose one")
	case s.stepper == krylov && steps:
		return usagef("--steps belongs to --stepper implicit-euler; krylov takes --tolerance")
	case s.tolerance >= 1:
		return usagef("--tolerance %g: want an error below 1", s.tolerance)
	}
	return nil
}

// newKernel is `heatskin kernel`.
func newKernel(j *job) *cobra.Command {
	var (
		input       meshFlags
		refine      refineFlags
		source      sourceFlags
		output      outputFlags
		step        stepperFlags
		times       timesFlag
		diffusivity float64
	)
	cmd := &cobra.Command{
		Use:   "kernel MESH SOURCE --time T[,T...]",
		Short: "Where is a unit of heat (or a wandering particle) after time t?",
		Long: `Where is a unit of heat (or a wandering particle) after time t?

Solves du/dt = D * Laplace-Beltrami u from one unit of heat at the source, shared equally
where there are several. Values are per unit area: on a closed or insulated surface their
area integral is 1. A column u_t0.5 is the field at --time 0.5, under the time as you wrote it.
(A Brownian particle as probabilists define it has D = 1/2.)`,
		Example: `  heatskin kernel cap.stl --at-point 0,0,42 --time 0.5,2,10 --diffusivity 0.7 --out warm.ply
  heatskin kernel cap.stl --at-boundary 1 --time 5 --probe sensors.csv --probe-out readings.csv --out warm.csv
  heatskin kernel cap.stl --at-vertex 12 --time 1 --stepper implicit-euler --steps 200 > warm.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	times.register(flags)
	positiveVar(flags, &diffusivity, "diffusivity", 1, "`D` in length^2 per second, in the file's length unit")
	source.register(flags, "at")
	step.register(cmd)
	output.register(flags)
	input.register(flags)
	input.registerMetric(flags, mesh.NewTensorMetric)
	refine.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if len(times.seconds) == 0 {
			return usagef("kernel: want --time T[,T...], in seconds after the release")
		}
		if err := source.want("kernel"); err != nil {
			return err
		}
		if err := step.check(cmd); err != nil {
			return err
		}
		if err := output.prepare(slices.Concat(source.files, input.tables(), []string{args[0]})...); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		g, err := prepare(ctx, j, part, &input, &refine, &source, forHeat(diffusivity, times.seconds))
		if err != nil {
			return err
		}
		if err := g.makeSolver(ctx, j); err != nil {
			return err
		}
		load := g.surface.Load(g.data)
		heat, err := g.solver.HeatKernels(ctx, load, times.seconds, kernel.HeatOptions{
			Diffusivity: diffusivity,
			Tolerance:   step.tolerance,
			Stepper:     kernel.Stepper(step.stepper),
			Steps:       step.steps,
		})
		if err != nil {
			return sorted(err)
		}
		for _, text := range heat.Warnings {
			j.warn(text)
		}
		j.summary.Solves = heat.Solves
		j.summary.kernelSummary = summarizeHeat(times.seconds, heat)
		found := g.result(refine.keep)
		for i, name := range times.names("u_t") {
			found.fields = append(found.fields, fieldfile.Column{Name: name, Values: heat.Fields[i]})
		}
		return output.save(ctx, j, found)
	}
	return cmd
}

func summarizeHeat(times []float64, heat *kernel.HeatResult) *kernelSummary {
	s := &kernelSummary{Factorizations: heat.Factorizations}
	for i, t := range times {
		s.Heat = append(s.Heat, heatSummary{
			Time:         number(t),
			Total:        number(heat.Totals[i]),
			BalanceError: number(heat.BalanceErrors[i]),
			TimeError:    number(heat.ErrorEstimates[i]),
			MeshError:    number(heat.MeshErrors[i]),
			LowestValue:  number(heat.Lowest[i]),
			LargestValue: number(heat.Largest[i]),
		})
	}
	return s
}
