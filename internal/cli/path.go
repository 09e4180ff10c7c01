package cli

import (
	"fmt"
	"io"
	"maps"
	"math"
	"slices"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// pathSummary is what the summary says of shortest lines.
type pathSummary struct {
	Lines []lineSummary `json:"lines"`
}

type lineSummary struct {
	Line         int    `json:"line"`
	From         string `json:"from"`
	To           string `json:"to"`
	Length       number `json:"length"`
	Points       int    `json:"points"`
	EquallyShort bool   `json:"others_equally_short"` // lines that run elsewhere are as short to 1e-9
}

// lineFormats are the kinds of file that path writes, by extension.
var lineFormats = map[string]func(io.Writer, []fieldfile.Polyline) error{
	".csv": fieldfile.WriteLinesCSV,
	".ply": fieldfile.WriteLinesPLY,
}

// newPath is `heatskin path`.
func newPath(j *job) *cobra.Command {
	var (
		input    meshFlags
		from, to sourceFlags
		output   outputFlags
	)
	cmd := &cobra.Command{
		Use:   "path MESH SOURCE TO",
		Short: "Which way does the shortest line run, and how long is it?",
		Long: `Which way does the shortest line run, and how long is it?

One line for each target, from the source that is nearest to it, along the flat triangles and
without discretisation error. The table has the columns line,index,x,y,z,s,triangle: s is the
length run so far, triangle holds the stretch that begins there. Where lines that run
elsewhere are as short, one of them is given and a warning says so.`,
		Example: `  heatskin path cap.stl --at-vertex 0 --to-vertex 900 > line.csv
  heatskin path cap.stl --at-boundary 1 --to-point 42.5,0,6 --out creep.ply --summary creep.json
  heatskin path cap.stl --at-boundary 0 --to-file bolts.csv --out lines.csv`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	from.register(flags, "at")
	to.register(flags, "to")
	output.registerOut(flags, slices.Sorted(maps.Keys(lineFormats)), "write the lines to `FILE`, %s (repeatable); without it, CSV goes to standard output")
	output.registerSummary(flags)
	input.register(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if err := from.want("path"); err != nil {
			return err
		}
		if err := to.want("path"); err != nil {
			return err
		}
		if err := output.prepare(slices.Concat(from.files, to.files, args)...); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		// How flat faces are cut does not matter to a line, and triangles go by the file.
		g, err := prepare(ctx, j, part, &input, &refineFlags{maxEdge: math.Inf(1)}, &from, nil)
		if err != nil {
			return err
		}
		targets, err := to.place(ctx, j, part, part, &input)
		if err != nil {
			return err
		}
		j.clock.enter("wave")
		solver := geodesic.NewSolver(part)
		found := &pathSummary{}
		var lines []fieldfile.Polyline
		for i, target := range targets {
			line, err := solver.Path(ctx, g.data, targets[i:i+1], geodesic.Options{})
			if err != nil {
				return sorted(err)
			}
			if line == nil {
				j.warn(fmt.Sprintf("%s cannot be reached from any source: it lies on another body", target.Name))
				continue
			}
			if line.Triangles[0] < 0 { // no stretch: source and target are one place
				at, _ := mesh.NewLocator(part).Nearest([3]float64(line.Points))
				line.Triangles[0] = at.Triangle
			}
			k := len(lines)
			lines = append(lines, fieldfile.Polyline{Points: line.Points, S: line.S, Triangles: line.Triangles})
			about := lineSummary{
				Line: k, From: g.data[line.From].Name, To: target.Name,
				Length: number(line.Length), Points: len(line.S), EquallyShort: line.Several,
			}
			found.Lines = append(found.Lines, about)
			j.note("line %d from %s to %s: length %s", k, about.From, about.To, input.length(line.Length))
			if line.Several {
				j.warn(fmt.Sprintf("line %d is one of several that are equally short (within 1e-9)", k))
			}
		}
		if len(lines) == 0 {
			return refusef("no line: none of the targets can be reached from a source")
		}
		j.summary.pathSummary = found

		j.clock.enter("write")
		var files []table
		for _, name := range output.out {
			write := lineFormats[extension(name)]
			files = append(files, table{name, func(w io.Writer) error { return write(w, lines) }})
		}
		if err := j.saveFiles(ctx, files); err != nil {
			return err
		}
		if len(output.out) == 0 {
			if err := j.print(func(w io.Writer) error { return fieldfile.WriteLinesCSV(w, lines) }); err != nil {
				return err
			}
		}
		return output.saveSummary(ctx, j)
	}
	return cmd
}
