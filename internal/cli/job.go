package cli

import (
	"fmt"
	"io"
	"os"

	"github.com/spf13/cobra"
	"golang.org/x/term"
)

// A job is one run of the program: where it reads and writes, what it has told the
// user, and what its summary will say.
type job struct {
	std     Streams
	args    []string
	quiet   bool
	started bool // a command has begun: errors from here on are not cobra's
	profile profile
	clock   *clock
	summary summary
}

func newJob(std Streams, args []string) *job {
	return &job{
		std:     std,
		args:    args,
		clock:   newClock(std.Err, isTerminal(std.Err)),
		summary: summary{Arguments: args, Warnings: []string{}},
	}
}

func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

// begin starts a command.
func (j *job) begin(cmd *cobra.Command) error {
	j.started = true
	j.clock.visible = j.clock.visible && !j.quiet
	j.summary.Version = buildVersion()
	j.summary.Command = cmd.Name()
	j.summary.Options = options(cmd.Flags())
	return j.profile.start()
}

// note tells the user something, unless asked to be quiet.
func (j *job) note(format string, args ...any) {
	if !j.quiet {
		j.clock.above(func() { fmt.Fprintf(j.std.Err, "heatskin: "+format+"\n", args...) })
	}
}

// warn tells the user something that must not be missed; the summary repeats it.
func (j *job) warn(text string) {
	j.summary.Warnings = append(j.summary.Warnings, text)
	j.clock.above(func() { fmt.Fprintf(j.std.Err, "heatskin: warning: %s\n", text) })
}
