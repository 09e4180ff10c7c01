package cli

import (
	"fmt"
	"math"

	"heatskin/kernel"
)

// mostValue is the largest value, or heat, that a problem may hold: its square, which
// norms need, has room to spare in double precision, and nothing physical comes near.
const mostValue = 1e120

// bounded refuses a problem whose numbers are so large that their squares are not.
func (g *ground) bounded(pr *kernel.Problem) error {
	areas := g.solver.Areas()
	total := 0.0
	for _, a := range areas {
		total += a
	}
	check := func(what string, x float64) error {
		if x = math.Abs(x); x*max(1, total) > mostValue {
			return refusef("%s: want values, and their area integral, of at most %g in size, got %.3g over an area of %.3g", what, mostValue, x, total)
		}
		return nil
	}
	var worst struct{ initial, hold, heat, rate float64 }
	for v, a := range areas {
		if a <= 0 {
			continue
		}
		grow := func(to *float64, list []float64, by float64) {
			if list != nil && !math.IsNaN(list[v]) {
				*to = max(*to, math.Abs(list[v]/by))
			}
		}
		grow(&worst.initial, pr.Initial, 1)
		grow(&worst.hold, pr.Hold, 1)
		grow(&worst.heat, pr.Load, a)
		grow(&worst.rate, pr.Rate, a)
	}
	for _, item := range []struct {
		what string
		x    float64
	}{{"--initial", worst.initial}, {"held values", worst.hold}, {"--heat", worst.heat}, {"--rate", worst.rate}} {
		if err := check(item.what, item.x); err != nil {
			return err
		}
	}
	for _, e := range pr.Exchanges {
		strongest := 0.0
		for v, w := range e.Weight {
			if areas[v] > 0 {
				strongest = max(strongest, w/areas[v])
			}
		}
		for _, x := range []float64{strongest, e.Ambient, strongest * e.Ambient} {
			if err := check("loss at "+e.Name, x); err != nil {
				return err
			}
		}
	}
	return nil
}

// finiteFields refuses results that have left the range of double precision: a source
// that gives for 1e300 seconds, say.
func (g *ground) finiteFields(found *result) error {
	for _, f := range found.fields {
		for v, x := range f.Values {
			if x-x != 0 && !g.surface.NoValue[v] {
				return refuse(fmt.Errorf("%s: values leave the range of double precision; want less heat, or shorter times", f.Name))
			}
		}
	}
	return nil
}
