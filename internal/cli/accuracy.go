package cli

import (
	"errors"
	"fmt"
	"strconv"
	"strings"

	"github.com/spf13/pflag"
)

// targetBudget is how many vertices --target-error may cut a part into. So many take 1.6 GB
// and 20 seconds of one processor (the demo part, measured).
const targetBudget = 1_000_000

// An errorTarget is the mean relative error that --target-error asks for; 0: none.
type errorTarget struct {
	mean float64
	text string // as it was written
}

func (t *errorTarget) register(flags *pflag.FlagSet) {
	varFunc(flags, "target-error", "", fmt.Sprintf("refine until the estimated mean relative error is below `SHARE`, 0.2%% or 0.002, with up to %d vertices; status 4 if that does not do", targetBudget),
		func(text string) error {
			x, err := share(text)
			if err == nil {
				*t = errorTarget{x, text}
			}
			return err
		})
}

// share reads a part of the whole, as a number or in per cent.
func share(text string) (float64, error) {
	digits, percent := strings.CutSuffix(strings.TrimSpace(text), "%")
	x, err := finite(digits)
	if percent {
		x /= 100
	}
	if err != nil || !(x > 0 && x < 1) {
		return 0, errors.New("want a share above 0 and below 1, such as 0.2% or 0.002")
	}
	return x, nil
}

// finer is the longest edge to try next where edges of at most edge gave an estimate
// above the target. Errors fall at least like h, and mostly faster.
func (t *errorTarget) finer(edge, estimate float64) float64 {
	return edge * min(max(t.mean/estimate, 0.5), 0.7)
}

// missed is the error of results that are there but not as good as was asked.
func (t *errorTarget) missed(estimate float64, vertices int, why string) error {
	return &accuracyError{fmt.Errorf("--target-error %s is not met: the estimated mean error is %s on %d vertices; %s",
		t.text, percent(estimate), vertices, why)}
}

// percent is a relative error for reading, two digits of it.
func percent(x float64) string { return strconv.FormatFloat(100*x, 'g', 2, 64) + " %" }

// roughly is percent without the digits of what is rounding, or as good as.
func roughly(x float64) string {
	const least, rounding = 1e-6, 1e-15
	switch {
	case x < rounding:
		return "0 %"
	case x < least:
		return "below 0.0001 %"
	}
	return percent(x)
}
