// Package cli is the command line: one file a command, which turns flags into
// options, makes the library call, and hands the results to the writers. The flag
// groups, the summary and the exit statuses that the commands share lie beside them.
package cli

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime/debug"
	"strings"
	"syscall"

	"github.com/spf13/cobra"

	"heatskin/internal/fieldfile"
)

// Streams are what a run reads from and writes to: a mesh named "-", a table where
// no --out is given, and everything meant for the person at the terminal.
type Streams struct {
	In       io.Reader
	Out, Err io.Writer
}

// Main runs the program with the arguments that follow its name, and returns its
// exit status. An error becomes one line on std.Err. On an interrupt it returns
// without waiting for the computation; what was half written is gone by then.
func Main(args []string, std Streams) int {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	signal.Ignore(syscall.SIGPIPE) // a reader that left is an error from Write, and a quiet one

	j := newJob(std, args)
	done := make(chan error, 1)
	go func() { done <- j.execute(ctx) }()

	var err error
	select {
	case err = <-done:
	case <-ctx.Done():
		fieldfile.RemovePending()
		select {
		case err = <-done:
		default:
			err = ctx.Err()
		}
	}
	j.clock.stop()
	if text := message(err); text != "" {
		fmt.Fprintf(std.Err, "heatskin: %s\n", text)
	}
	return exitStatus(err)
}

// execute parses the arguments and runs the command that they name.
func (j *job) execute(ctx context.Context) (err error) {
	defer func() {
		if slip := recover(); slip != nil {
			err = &internalError{slip: slip, stack: debug.Stack()}
		}
	}()
	defer j.profile.finish(&err)
	root := newRoot(j)
	root.SetArgs(j.args)
	err = root.ExecuteContext(ctx)
	if err != nil && !j.started && exitStatus(err) == statusFailed {
		err = usage(err) // cobra's own complaints have no type
	}
	return err
}

func newRoot(j *job) *cobra.Command {
	root := &cobra.Command{
		Use:   "heatskin",
		Short: "Distances and heat along the skin of a meshed part",
		Long: `heatskin answers questions about the skin of a part that is given as a triangle mesh:
how far apart places are along the surface, and how heat released there spreads.

The mesh is STL, PLY, OBJ or OFF, also gzipped; "-" reads it from standard input.
Lengths are the file's own; a diffusivity is in length^2 per second.`,
		Example: `  heatskin check    cap.stl
  heatskin distance cap.stl --at-boundary 0 --out creep.ply --out creep.csv
  heatskin kernel   cap.stl --at-point 0,0,42 --time 1,10 --diffusivity 0.7 --out warm.csv`,
		Version:       buildVersion(),
		SilenceErrors: true,
		SilenceUsage:  true,
		Args:          cobra.ArbitraryArgs,

		SuggestionsMinimumDistance: 2,
	}
	root.RunE = func(cmd *cobra.Command, args []string) error {
		if len(args) == 0 {
			return cmd.Help()
		}
		return unknownCommand(cmd, args[0])
	}
	root.SetIn(j.std.In)
	root.SetOut(j.std.Out)
	root.SetErr(j.std.Err)
	root.SetVersionTemplate("heatskin {{.Version}}\n")
	root.SetFlagErrorFunc(flagError)
	root.CompletionOptions.HiddenDefaultCmd = true

	flags := root.PersistentFlags()
	flags.SortFlags = false
	flags.BoolVarP(&j.quiet, "quiet", "q", false, "keep warnings and errors only")
	j.profile.register(flags)

	for _, cmd := range []*cobra.Command{newCheck(j), newDistance(j), newPath(j), newKernel(j), newDiffuse(j), newModes(j), newPassage(j)} {
		cmd.Flags().SortFlags = false
		cmd.DisableFlagsInUseLine = true
		run := cmd.RunE
		cmd.RunE = func(cmd *cobra.Command, args []string) error {
			if err := j.begin(cmd); err != nil {
				return err
			}
			return run(cmd, args)
		}
		root.AddCommand(cmd)
	}
	return root
}

// unknownCommand answers a mistyped command with the ones there are.
func unknownCommand(root *cobra.Command, name string) error {
	if near := root.SuggestionsFor(name); len(near) > 0 {
		return usagef("unknown command %q; did you mean %q?", name, near[0])
	}
	var names []string
	for _, cmd := range root.Commands() {
		if cmd.IsAvailableCommand() {
			names = append(names, cmd.Name())
		}
	}
	return usagef("unknown command %q; want one of %s", name, strings.Join(names, ", "))
}

// oneMesh takes exactly one argument, the mesh.
func oneMesh(cmd *cobra.Command, args []string) error {
	switch {
	case len(args) == 0:
		return usagef("%s: name a mesh file, or - for standard input; see heatskin %[1]s --help", cmd.Name())
	case len(args) > 1:
		return usagef("%s: want one mesh, got %d arguments: %s", cmd.Name(), len(args), strings.Join(args, " "))
	}
	return nil
}

var errInterrupted = errors.New("interrupted; nothing half written is left behind")
