package cli

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"syscall"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// The exit statuses, which scripts rely on.
const (
	statusDone     = 0
	statusFailed   = 1 // on the way: disk, memory, interrupted
	statusUsage    = 2 // the command line cannot be right for any mesh
	statusRefused  = 3 // the mesh, a source or a table is unreadable or unfit
	statusAccuracy = 4 // done, but not as accurately as was demanded
)

// exitStatus is the only place that turns an error into an exit status. What the
// error was met in weighs more than what it is: a disk error while the mesh is
// read refuses the mesh, one while a result is written is a failure.
func exitStatus(err error) int {
	var (
		wrong   *usageError
		refused *refusalError
		short   *accuracyError
	)
	switch {
	case err == nil:
		return statusDone
	case errors.Is(err, context.Canceled):
		return statusFailed
	case errors.As(err, &wrong):
		return statusUsage
	case errors.As(err, &refused):
		return statusRefused
	case errors.As(err, &short):
		return statusAccuracy
	}
	return statusFailed
}

// message is the one line that an error is told in. A reader of standard output
// that went away needs no telling.
func message(err error) string {
	var slip *internalError
	switch {
	case err == nil, errors.Is(err, syscall.EPIPE):
		return ""
	case errors.Is(err, context.Canceled):
		return errInterrupted.Error()
	case errors.As(err, &slip):
		return slip.Error() + "\n" + string(slip.stack)
	}
	return strings.ReplaceAll(err.Error(), "\n", " ")
}

// A usageError is a command line that no mesh could make right.
type usageError struct{ err error }

func (e *usageError) Error() string { return e.err.Error() }
func (e *usageError) Unwrap() error { return e.err }

func usage(err error) error { return &usageError{err} }

func usagef(format string, args ...any) error { return usage(fmt.Errorf(format, args...)) }

// A refusalError is a mesh, a source or a table that cannot be used.
type refusalError struct{ err error }

func (e *refusalError) Error() string { return e.err.Error() }
func (e *refusalError) Unwrap() error { return e.err }

// refuse marks err, met while input was read or placed, as a refusal of that input.
func refuse(err error) error {
	if err == nil {
		return nil
	}
	return &refusalError{err}
}

func refusef(format string, args ...any) error { return refuse(fmt.Errorf(format, args...)) }

// An accuracyError is a result that is there but misses what was demanded of it.
type accuracyError struct{ err error }

func (e *accuracyError) Error() string { return e.err.Error() }
func (e *accuracyError) Unwrap() error { return e.err }

// An internalError is a broken invariant: our mistake, not the user's.
type internalError struct {
	slip  any
	stack []byte
}

func (e *internalError) Error() string {
	return fmt.Sprintf("internal error, please report it with the mesh: %v", e.slip)
}

// flagError puts pflag's complaints into our words, each with its cure.
func flagError(cmd *cobra.Command, err error) error {
	var (
		invalid *pflag.InvalidValueError
		missing *pflag.ValueRequiredError
		unknown *pflag.NotExistError
	)
	switch {
	case errors.As(err, &invalid):
		return usagef("--%s %s: %w", invalid.GetFlag().Name, invalid.GetValue(), errors.Unwrap(invalid))
	case errors.As(err, &missing):
		kind, _ := pflag.UnquoteUsage(missing.GetFlag())
		return usagef("--%s needs a value: %s", missing.GetFlag().Name, kind)
	case errors.As(err, &unknown):
		if unknown.GetSpecifiedShortnames() != "" {
			return usagef("unknown flag -%s; a flag starts with two dashes, see %s --help",
				unknown.GetSpecifiedShortnames(), cmd.CommandPath())
		}
		name := unknown.GetSpecifiedName()
		if near := nearestFlag(cmd, name); near != "" {
			return usagef("unknown flag --%s; did you mean --%s?", name, near)
		}
		return usagef("unknown flag --%s; see %s --help", name, cmd.CommandPath())
	}
	return usage(err)
}

// nearestFlag is the flag of cmd that differs least from name, if by no more than
// two letters.
func nearestFlag(cmd *cobra.Command, name string) (near string) {
	least := 3
	cmd.Flags().VisitAll(func(f *pflag.Flag) {
		if d := editDistance(name, f.Name); d < least && !f.Hidden {
			near, least = f.Name, d
		}
	})
	return near
}

// editDistance is the least number of letters to insert, drop or change that turns
// a into b (V. I. Levenshtein 1966), by the usual table, one row at a time.
func editDistance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			change := diagonal
			if a[i] != b[j] {
				change++
			}
			diagonal = row[j+1]
			row[j+1] = min(change, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
