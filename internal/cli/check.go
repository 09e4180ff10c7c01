package cli

import (
	"encoding/json"
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"heatskin/mesh"
)

// newCheck is `heatskin check`.
func newCheck(j *job) *cobra.Command {
	var (
		input  meshFlags
		output outputFlags
		asJSON bool
	)
	cmd := &cobra.Command{
		Use:   "check MESH",
		Short: "Is this mesh fit to compute on, and what is wrong with it?",
		Long: `Is this mesh fit to compute on, and what is wrong with it?

Counts, boundary loops under the numbers that --at-boundary takes, statistics of edges and
angles, everything that is odd, and a verdict. Ends with status 0 whenever the file could
be read.`,
		Example: `  heatskin check cap.stl
  heatskin check scan.ply --weld 1e-4 --unit mm
  heatskin check cap.stl --json > cap-report.json`,
		Args: oneMesh,
	}
	flags := cmd.Flags()
	flags.BoolVar(&asJSON, "json", false, "the report as JSON")
	input.register(flags)
	output.registerSummary(flags)

	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		ctx := cmd.Context()
		if err := output.prepare(args[0]); err != nil {
			return err
		}
		part, err := input.load(ctx, j, args[0])
		if err != nil {
			return err
		}
		j.clock.enter("check")
		report := mesh.Check(part)
		j.summary.Check = report
		j.summary.Mesh.Components, j.summary.Mesh.Area = report.Components, number(report.Area)
		write := func(w io.Writer) error {
			if input.unit != "" {
				if _, err := fmt.Fprintf(w, "lengths in %s, areas in %[1]s^2\n", input.unit); err != nil {
					return err
				}
			}
			return report.WriteText(w)
		}
		if asJSON {
			write = func(w io.Writer) error {
				e := json.NewEncoder(w)
				e.SetIndent("", "  ")
				return e.Encode(report)
			}
		}
		if err := j.print(write); err != nil {
			return err
		}
		return output.saveSummary(ctx, j)
	}
	return cmd
}
