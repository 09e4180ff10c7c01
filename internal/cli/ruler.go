package cli

import (
	"context"
	"errors"
	"math"

	"heatskin/kernel"
	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// A ruler measures distances from the sources of a ground by one method.
type ruler interface {
	// field is the distance of every vertex computed on from the nearest of some
	// sources, by number; nil means all.
	field(ctx context.Context, which []int) ([]float64, error)
	// between is the distance of every source from source i.
	between(ctx context.Context, i int) ([]float64, error)
	// at is the distance of some points from the nearest of some sources, or nil
	// where linear interpolation of the field says all that is known.
	at(ctx context.Context, which []int, points []mesh.Datum) ([]float64, error)
}

// heatRuler measures by the heat method.
type heatRuler struct {
	*ground
	options kernel.DistanceOptions
	single  [][]float64     // field of each source, once asked for
	account *distanceAnswer // where errors and solves are noted
}

func newHeatRuler(ctx context.Context, j *job, g *ground, opt kernel.DistanceOptions, account *distanceAnswer) (*heatRuler, error) {
	if err := g.makeSolver(ctx, j); err != nil {
		return nil, err
	}
	return &heatRuler{ground: g, options: opt, single: make([][]float64, len(g.data)), account: account}, nil
}

func (r *heatRuler) field(ctx context.Context, which []int) ([]float64, error) {
	if which == nil && len(r.data) == 1 {
		which = []int{0}
	}
	if len(which) == 1 && r.single[which[0]] != nil {
		return r.single[which[0]], nil
	}
	found, err := r.solver.Distance(ctx, which, r.options)
	if err != nil {
		return nil, sorted(err)
	}
	r.account.solves += found.Solves
	r.account.mean = max(r.account.mean, found.MeanError)
	r.account.most = max(r.account.most, found.MaxError)
	if len(which) == 1 {
		r.single[which[0]] = found.Distance
	}
	return found.Distance, nil
}

func (r *heatRuler) between(ctx context.Context, i int) ([]float64, error) {
	field, err := r.field(ctx, []int{i})
	if err != nil {
		return nil, err
	}
	row := make([]float64, len(r.data))
	for k, d := range r.data {
		row[k] = math.Inf(1)
		if v := r.surface.Site(k); v >= 0 {
			row[k] = field[v]
		}
		for _, edge := range d.Edges {
			row[k] = min(row[k], field[edge[0]], field[edge[1]])
		}
	}
	return row, nil
}

func (r *heatRuler) at(context.Context, []int, []mesh.Datum) ([]float64, error) { return nil, nil }

// exactRuler measures shortest paths over the flat triangles.
type exactRuler struct {
	*ground
	job    *job
	solver *geodesic.Solver
}

func newExactRuler(j *job, g *ground) *exactRuler {
	return &exactRuler{ground: g, job: j, solver: geodesic.NewSolver(g.part)}
}

func (r *exactRuler) spread(ctx context.Context, which []int, targets []mesh.Datum) (*geodesic.Wave, error) {
	data := r.data
	if which != nil {
		data = nil
		for _, i := range which {
			data = append(data, r.data[i])
		}
	}
	r.job.clock.enter("wave")
	wave, err := r.solver.Spread(ctx, data, geodesic.Options{Targets: targets})
	if err != nil {
		return nil, sorted(err)
	}
	return wave, nil
}

func (r *exactRuler) field(ctx context.Context, which []int) ([]float64, error) {
	wave, err := r.spread(ctx, which, nil)
	if err != nil {
		return nil, err
	}
	return wave.Distances, nil
}

func (r *exactRuler) between(ctx context.Context, i int) ([]float64, error) {
	return r.at(ctx, []int{i}, r.data)
}

// at sends out a wave of its own, which ends at the last of the points.
func (r *exactRuler) at(ctx context.Context, which []int, points []mesh.Datum) ([]float64, error) {
	wave, err := r.spread(ctx, which, points)
	if err != nil {
		return nil, err
	}
	return wave.Targets, nil
}

// sorted marks what a library met on the way as a refusal, where a mesh or a source
// that does not suit it is to blame.
func sorted(err error) error {
	var (
		datum *mesh.DatumError
		place *geodesic.DatumError
		empty *mesh.EmptyError
		size  *mesh.RangeError
		load  *kernel.LoadError
	)
	if errors.As(err, &datum) || errors.As(err, &place) || errors.As(err, &empty) || errors.As(err, &size) || errors.As(err, &load) {
		return refuse(err)
	}
	return err
}
