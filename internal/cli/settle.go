package cli

import (
	"context"
	"errors"

	"heatskin/mesh/geodesic"
)

const (
	// doubtful is the estimated mean relative error from which the front's distances are
	// not good enough to hand out unasked.
	doubtful = 2e-3
	// mostSettled is how many faces a part may have for exact propagation to take over:
	// a minute or two, and some hundred megabytes. Parts in doubt are coarse CAD parts, on
	// which it is as fast as the front on the finer faces that it needs.
	mostSettled = 1_000_000
)

// settle asks for exact distances where the front, on ground as fine as it was given
// unasked, doubts its own. The front loses its way on tessellations that bend sharply
// from each face to the next, such as the walls of many bores with a few sides each.
func (q *distanceQuestion) settle(ctx context.Context, j *job, g *ground, got *distanceAnswer, source *sourceFlags) (*distanceAnswer, error) {
	if !(got.mean > doubtful) || g.original.NumTriangles() > mostSettled {
		return got, nil
	}
	flat := &ground{original: g.original, part: g.original, data: g.data}
	switch {
	case q.keep:
		flat.part = g.part // its vertices are to be shown
	case g.part != g.original:
		var err error
		if flat.data, err = source.find(ctx, g.original, g.original); err != nil {
			return nil, err
		}
	}
	exact := *q
	exact.method = methodExact
	found, err := exact.answer(ctx, j, flat)
	var tooLarge *geodesic.MemoryError
	if errors.As(err, &tooLarge) {
		j.warn("the estimated error is large, and exact distances need more memory than they may have: try --target-error or --max-edge")
		return got, nil
	}
	if err != nil {
		return nil, err
	}
	j.note("the front doubted its distances (%s in the mean): exact propagation over the flat triangles took over", percent(got.mean))
	found.settled = true
	found.solves = got.solves
	return found, nil
}
