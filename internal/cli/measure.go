package cli

import (
	"context"
	"errors"
	"strconv"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
	"heatskin/mesh"
)

// A distanceQuestion is what a run asks of whatever ground it comes to.
type distanceQuestion struct {
	method  string
	each    bool   // a column for each source
	matrix  string // file of the distances between sources; "" if not wanted
	options kernel.DistanceOptions
	probes  *probes // nil if there are none
	keep    bool    // show the vertices that refinement added
}

// A distanceAnswer is what was measured, and how well.
type distanceAnswer struct {
	result
	mean, most float64 // estimated relative errors, the worst over all that was measured
	solves     int
	settled    bool // by exact propagation, see settle
}

// answer measures on g.
func (q *distanceQuestion) answer(ctx context.Context, j *job, g *ground) (*distanceAnswer, error) {
	got := &distanceAnswer{}
	var measure ruler
	if q.method == methodExact {
		measure = newExactRuler(j, g)
	} else {
		options := q.options
		options.Once = !q.each && q.matrix == ""
		if !q.keep {
			options.Shown = g.original.NumVertices()
		}
		heat, err := newHeatRuler(ctx, j, g, options, got)
		if err != nil {
			return nil, err
		}
		measure = heat
	}
	got.result = *g.result(q.keep)
	columns := []string{"distance"}
	sources := [][]int{nil}
	if q.each {
		columns, sources = nil, nil
		for i := range g.data {
			columns = append(columns, "distance_"+strconv.Itoa(i))
			sources = append(sources, []int{i})
		}
	}
	for i, name := range columns {
		values, err := measure.field(ctx, sources[i])
		if err != nil {
			return nil, err
		}
		got.fields = append(got.fields, fieldfile.Column{Name: name, Values: values})
	}
	if q.probes != nil {
		places := q.probes.on(g.part)
		for i, name := range columns {
			values, err := measure.at(ctx, sources[i], places)
			if err != nil {
				return nil, err
			}
			if values != nil {
				got.probed = append(got.probed, fieldfile.Column{Name: name, Values: values})
			}
		}
	}
	if q.matrix != "" {
		between, err := measureMatrix(ctx, measure, len(g.data))
		if err != nil {
			return nil, err
		}
		got.tables = append(got.tables, table{q.matrix, between.write})
	}
	return got, nil
}

// pursue asks again on finer and finer ground until the estimated mean error is below
// the target. The answer is the finest; missed says how near it came if it is not near
// enough. It ends where the budget does, and where two rounds have brought nothing.
func (t *errorTarget) pursue(ctx context.Context, j *job, g *ground, got *distanceAnswer, input *meshFlags, source *sourceFlags, ask *distanceQuestion) (_ *distanceAnswer, missed, err error) {
	best, idle := got.mean, 0
	for !(got.mean < t.mean) {
		if idle == 2 {
			return got, t.missed(got.mean, g.part.NumVertices(), "cutting faces further does not lower it"), nil
		}
		j.note("estimated mean error %s, to be below %s", percent(got.mean), t.text)
		finer, err := g.finer(ctx, j, input, source, t.finer(g.edge, got.mean), targetBudget)
		var tooMuch *mesh.BudgetError
		if errors.As(err, &tooMuch) {
			return got, t.missed(got.mean, g.part.NumVertices(), "a finer mesh needs more than the "+strconv.Itoa(targetBudget)+" that are allowed"), nil
		}
		if err != nil {
			return nil, nil, refuse(err)
		}
		solves := got.solves
		g, got = finer, nil // what was there may go before more is made
		if got, err = ask.answer(ctx, j, g); err != nil {
			return nil, nil, err
		}
		got.solves += solves
		if idle++; got.mean < 0.9*best {
			best, idle = got.mean, 0
		}
	}
	return got, nil, nil
}
