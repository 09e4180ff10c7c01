package cli

import (
	"fmt"
	"slices"
	"strings"

	"github.com/spf13/pflag"
)

// timesFlag is --time: moments after the release, in seconds, each with the text
// that the user wrote, which names its column.
type timesFlag struct {
	seconds []float64
	text    []string
}

func (t *timesFlag) register(flags *pflag.FlagSet) {
	flags.Var(t, "time", "`T[,T...]`, seconds after the release, each above 0 (repeatable)")
}

func (t *timesFlag) Type() string   { return "times" }
func (t *timesFlag) String() string { return strings.Join(t.text, ",") }

// Set takes in a list of times, after those that are there.
func (t *timesFlag) Set(list string) error {
	for word := range strings.SplitSeq(list, ",") {
		word = strings.TrimSpace(word)
		seconds, err := positive(word)
		if err != nil {
			return err
		}
		if slices.Contains(t.text, word) {
			return fmt.Errorf("%s is asked for twice", word)
		}
		t.seconds = append(t.seconds, seconds)
		t.text = append(t.text, word)
	}
	return nil
}

// names are the columns of a field at each time: "u_t0.5".
func (t *timesFlag) names(prefix string) []string {
	names := make([]string, len(t.text))
	for i, text := range t.text {
		names[i] = prefix + text
	}
	return names
}
