package cli

import (
	"strings"

	"github.com/spf13/pflag"

	"heatskin/kernel"
)

// givenFlags are --heat, --rate and --over: what sources give.
type givenFlags struct {
	heat, rate []float64
	over       string
}

const (
	overSource  = "source"
	overSurface = "surface"
)

func (q *givenFlags) register(flags *pflag.FlagSet) {
	amounts := func(dst *[]float64, name, usage string) {
		varFunc(flags, name, "", usage, func(text string) error {
			for word := range strings.SplitSeq(text, ",") {
				x, err := finite(word)
				if err != nil {
					return err
				}
				*dst = append(*dst, x)
			}
			return nil
		})
	}
	amounts(&q.heat, "heat", "`Q[,Q...]`: heat put in at time 0 at each source, one for all or one for each in their order; without it and --rate sources share one unit")
	amounts(&q.rate, "rate", "`Q[,Q...]`: heat given per second at each source, from time 0 on, likewise")
	oneOfVar(flags, &q.over, "over", overSource, []string{overSource, overSurface},
		"`source|surface`: --rate is that of each source, or per area all over the surface")
}

// check refuses amounts that have no place. sources is their number, -1 if not yet known.
func (q *givenFlags) check(sources int) error {
	at := func(name string, list []float64) error {
		switch {
		case len(list) == 0:
		case sources == 0:
			return usagef("--%s: want a source to give it at: --at-vertex N, --at-point X,Y,Z, --at-file FILE.csv, --at-boundary K or --at-crease DEGREES", name)
		case sources > 0 && len(list) != 1 && len(list) != sources:
			return usagef("--%s: want one amount, or one for each of %d sources, got %d", name, sources, len(list))
		}
		return nil
	}
	if err := at("heat", q.heat); err != nil {
		return err
	}
	switch {
	case q.over == overSource:
		return at("rate", q.rate)
	case len(q.rate) != 1:
		return usagef("--over surface: want one --rate Q, heat per second and area, got %d", len(q.rate))
	}
	return nil
}

// apply adds what the first sources of the ground's data give to a problem.
func (q *givenFlags) apply(pr *kernel.Problem, g *ground, sources int) {
	heat := q.heat
	if len(heat) == 0 && (len(q.rate) == 0 || q.over == overSurface) && sources > 0 {
		heat = []float64{1 / float64(sources)}
	}
	pr.Load = g.amounts(heat, sources)
	if q.over == overSource {
		pr.Rate = g.amounts(q.rate, sources)
		return
	}
	pr.Rate = g.solver.Areas()
	for v := range pr.Rate {
		pr.Rate[v] *= q.rate[0]
	}
}

// amounts spreads amounts over the first data, one for all or one for each: all of it at
// a point, along a line in proportion to length. nil if there are none.
func (g *ground) amounts(list []float64, data int) []float64 {
	if len(list) == 0 {
		return nil
	}
	sum := make([]float64, g.surface.NumVertices)
	for i := range data {
		q := list[min(i, len(list)-1)]
		if v := g.surface.Site(i); v >= 0 {
			sum[v] += q
			continue
		}
		along := g.solver.Along(i)
		total := 0.0
		for _, length := range along {
			total += length
		}
		for v, length := range along {
			sum[v] += q * length / total
		}
	}
	return sum
}
