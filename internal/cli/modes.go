package cli

import (
	"io"
	"strconv"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
	"heatskin/mesh"
)

// modesSummary is what the summary says of eigenpairs.
type modesSummary struct {
	Modes []modeSummary `json:"modes"`
}

type modeSummary struct {
	Mode       int    `json:"mode"`
	Eigenvalue number `json:"eigenvalue"`
	Residual   number `json:"residual"` // of L phi = lambda M phi, relative
}

// verticesPerMode is how many vertices there are at least for each mode, about, on a
// part that is cut unasked. On equal triangles of edge h an eigenvalue is short by λh²/16
// relatively; by Weyl's law, λ = 4π·count/area, that is 0.2 % for the last one.
const verticesPerMode = 500

// modesMemory bounds the vectors that modes are made from, 2*count + 100 of them.
const modesMemory = 8 << 30

// newModes is `heatskin modes`.
func newModes(j *job) *cobra.Command {
	var (
		input       meshFlags
		refine      refineFlags
		output      outputFlags
		count       int
		eigenvalues string
	)
	hold := sourceFlags{word: "hold"}
	cmd := &cobra.Command{
		Use:   "modes MESH --count K",
		Short: "Eigenvalues and eigenfunctions of the Laplace-Beltrami operator",
		Long: `Eigenvalues and eigenfunctions of the Laplace-Beltrami operator.

The K smallest eigenvalues lambda of -Laplacian(phi) = lambda * phi, with every one of a
multiple eigenvalue, in 1/length^2, as the table mode,eigenvalue. On a closed or insulated
surface mode 0 is the constant one. Fields mode_0, mode_1... go to --out: the area integral
of their square is 1, and the value that is largest in size is positive.`,
		Example: `  heatskin modes cap.stl --count 10
  heatskin modes cap.stl --count 20 --eigenvalues spectrum.csv --out modes.vtu
  heatskin modes cap.stl --count 6 --hold-boundary 0 --hold-boundary 1 --out drum.ply`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	varFunc(flags, "count", "", "how many modes: `K`, the constant one counts", func(text string) (err error) {
		count, err = whole(text, 1)
		return err
	})
	varFunc(flags, "hold-boundary", "", "hold boundary loop `K` at 0; 0 is the longest (repeatable)", func(text string) error {
		find, err := atBoundary(text)
		hold.asked = append(hold.asked, find)
		return err
	})
	flags.StringVar(&eigenvalues, "eigenvalues", "", "mode,eigenvalue as `FILE.csv`, in place of standard output")
	output.register(flags)
	input.register(flags)
	input.registerMetric(flags, mesh.NewTensorMetric)
	refine.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if count == 0 {
			return usagef("modes: want --count K, how many")
		}
		if eigenvalues != "" {
			output.tables = append(output.tables, eigenvalues)
		}
		if err := output.prepare(append(input.tables(), args[0])...); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		enough := func(s *mesh.Surface) float64 {
			// ResolutionFor allows edges that give half as many vertices on even meshes.
			return s.ResolutionFor(max(fieldVertices, min(count, autoBudget/(2*verticesPerMode))*2*verticesPerMode))
		}
		g, err := prepare(ctx, j, part, &input, &refine, &hold, enough)
		if err != nil {
			return err
		}
		n := g.surface.NumVertices
		if most := (modesMemory/(8*n) - 100) / 2; count > most && count < n { // from n on there are not so many
			return refusef("count: %d modes on %d vertices take more than %d GiB; want at most %d, or a larger --max-edge", count, n, modesMemory>>30, most)
		}
		if err := g.makeSolver(ctx, j); err != nil {
			return err
		}
		var held []int32
		for i := range g.data {
			held = append(held, g.verticesOf(i)...)
		}
		modes, err := g.solver.Modes(ctx, count, held)
		if err != nil {
			return judged(err)
		}
		for _, text := range modes.Warnings {
			j.warn(text)
		}
		j.summary.Solves = modes.Solves
		j.summary.modesSummary = &modesSummary{}
		found := g.result(refine.keep)
		numbers := make([]int, count)
		for k, lambda := range modes.Values {
			numbers[k] = k
			j.summary.Modes = append(j.summary.Modes, modeSummary{k, number(lambda), number(modes.Residuals[k])})
			found.fields = append(found.fields, fieldfile.Column{Name: "mode_" + strconv.Itoa(k), Values: modes.Fields[k]})
		}
		write := func(w io.Writer) error {
			return fieldfile.WriteTable(w, count, fieldfile.Ints("mode", numbers), fieldfile.Floats("eigenvalue", modes.Values))
		}
		found.standard = write
		if eigenvalues != "" {
			found.tables = append(found.tables, table{eigenvalues, write})
			found.standard = func(io.Writer) error { return nil }
		}
		return output.save(ctx, j, found)
	}
	return cmd
}
