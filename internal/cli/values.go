package cli

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"github.com/spf13/pflag"
)

// A value is a flag whose text is checked and taken in by a function, so that what
// is wrong for any mesh is answered while the command line is read.
type value struct {
	text string // as set, or the default
	kind string
	set  func(text string) error
}

func (v *value) String() string { return v.text }
func (v *value) Type() string   { return v.kind }

func (v *value) Set(text string) error {
	if err := v.set(text); err != nil {
		return err
	}
	v.text = text
	return nil
}

// varFunc adds a flag to flags whose text goes to set.
func varFunc(flags *pflag.FlagSet, name, initial, usage string, set func(text string) error) {
	flags.Var(&value{text: initial, kind: "value", set: set}, name, usage)
}

// finite reads a finite number.
func finite(text string) (float64, error) {
	x, err := strconv.ParseFloat(strings.TrimSpace(text), 64)
	if err != nil || math.IsInf(x, 0) || math.IsNaN(x) {
		return 0, errors.New("want a finite number, with a point as decimal mark")
	}
	return x, nil
}

// positive reads a finite number above 0.
func positive(text string) (float64, error) {
	x, err := finite(text)
	if err != nil {
		return 0, err
	}
	if x <= 0 {
		return 0, errors.New("want a number above 0")
	}
	return x, nil
}

// whole reads a whole number of at least least that fits in 32 bits.
func whole(text string, least int) (int, error) {
	n, err := strconv.ParseInt(strings.TrimSpace(text), 10, 32)
	if err != nil || n < int64(least) {
		return 0, fmt.Errorf("want a whole number from %d", least)
	}
	return int(n), nil
}

// positiveVar is a flag for a finite number above 0.
func positiveVar(flags *pflag.FlagSet, dst *float64, name string, initial float64, usage string) {
	*dst = initial
	varFunc(flags, name, strconv.FormatFloat(initial, 'g', -1, 64), usage, func(text string) error {
		x, err := positive(text)
		if err == nil {
			*dst = x
		}
		return err
	})
}

// oneOfVar is a flag for one of a few words; a word that is not among them is
// answered with those that are.
func oneOfVar(flags *pflag.FlagSet, dst *string, name, initial string, words []string, usage string) {
	*dst = initial
	varFunc(flags, name, initial, usage, func(text string) error {
		if !slices.Contains(words, text) {
			return fmt.Errorf("want one of %s", strings.Join(words, ", "))
		}
		*dst = text
		return nil
	})
}

// options lists the flags of a command with the values in force, for the summary.
func options(flags *pflag.FlagSet) map[string]string {
	set := make(map[string]string)
	flags.VisitAll(func(f *pflag.Flag) {
		if !f.Hidden && f.Name != "help" && f.Value.String() != "" {
			set[f.Name] = f.Value.String()
		}
	})
	return set
}
