package cli

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"heatskin/kernel"
	"heatskin/mesh"
)

const (
	// refineBudget is how many vertices --max-edge may add: what a workstation with
	// 16 GiB factors with room to spare.
	refineBudget = 5_000_000
	// autoVertices is how finely a part is cut, unasked, where it is coarser: as if into so
	// many vertices, of which the longest edges allowed need about half. autoBudget bounds
	// what is added unasked.
	autoVertices = 10_000
	autoBudget   = 200_000
)

// A ground is what a command computes on: the mesh as it was read, the mesh with its
// faces cut as finely as is needed, the sources placed on it, its intrinsic surface,
// and for what needs it the heat solver.
type ground struct {
	original, part *mesh.Mesh
	edge           float64 // the longest edge allowed on part
	data           []mesh.Datum
	surface        *mesh.Surface
	solver         *kernel.Solver // after makeSolver
}

// A resolution is the longest edge with which a computation is content on a surface.
type resolution func(s *mesh.Surface) float64

// evenly is content where no edge stands out, on a part of at least some vertices.
func evenly(s *mesh.Surface) float64 { return s.ResolutionFor(autoVertices) }

// forHeat also resolves heat at the shortest time, as far as the budget goes.
func forHeat(diffusivity float64, times []float64) resolution {
	return func(s *mesh.Surface) float64 {
		area := 0.0
		for f := range int32(s.NumFaces()) {
			area += s.Area(f)
		}
		affordable := math.Sqrt(area / autoBudget)
		return min(evenly(s), max(affordable, kernel.ResolvingEdge(diffusivity*s.LeastDensity(), slices.Min(times))))
	}
}

// prepare makes the ground of a command whose mesh has been read. content says which
// edges will do where the user does not; nil: any.
func prepare(ctx context.Context, j *job, original *mesh.Mesh, input *meshFlags, refine *refineFlags, source *sourceFlags, content resolution) (*ground, error) {
	g := &ground{original: original, part: original}
	j.clock.enter("measure")
	var err error
	if g.surface, err = mesh.NewSurface(original); err != nil {
		return nil, refuse(err)
	}
	size := j.summary.Mesh
	_, size.Components = g.surface.Components()
	for f := range int32(g.surface.NumFaces()) {
		size.Area += number(g.surface.Area(f))
	}
	if err := g.refine(ctx, j, input, refine, content); err != nil {
		return nil, err
	}
	g.warnOfMetric(j)
	j.clock.enter("place")
	g.data, err = source.place(ctx, j, original, g.part, input)
	return g, err
}

// refine cuts faces that are too large. What was not asked for is done as far as the
// budget goes: slivers may need more vertices than their area tells.
func (g *ground) refine(ctx context.Context, j *job, input *meshFlags, refine *refineFlags, content resolution) error {
	longest := slices.Max(g.surface.Length)
	edge, budget := refine.maxEdge, refineBudget
	switch {
	case edge == 0 && content == nil:
		edge = longest
	case edge == 0:
		edge, budget = content(g.surface), autoBudget
	}
	for g.edge = min(edge, longest); g.edge < longest; g.edge *= 2 {
		err := g.cut(ctx, j, input, budget)
		var tooMuch *mesh.BudgetError
		if refine.maxEdge == 0 && errors.As(err, &tooMuch) {
			continue
		}
		return refuse(err)
	}
	return nil
}

// cut has the faces of the original cut until no edge is longer than g.edge.
func (g *ground) cut(ctx context.Context, j *job, input *meshFlags, budget int) error {
	j.clock.enter("refine")
	part, err := mesh.Refine(ctx, g.original, g.edge, budget)
	if err != nil {
		return err
	}
	g.part = part
	j.summary.Mesh.ComputedVertices, j.summary.Mesh.ComputedFaces = part.NumVertices(), part.NumTriangles()
	j.note("computed on faces cut to edges of at most %s: %d vertices in place of %d", input.length(g.edge), part.NumVertices(), g.original.NumVertices())
	g.surface, err = mesh.NewSurface(part)
	return err
}

// finer is the ground with its faces cut to edges of at most edge. The error is a
// *mesh.BudgetError if that takes more than budget vertices.
func (g *ground) finer(ctx context.Context, j *job, input *meshFlags, source *sourceFlags, edge float64, budget int) (*ground, error) {
	f := &ground{original: g.original, part: g.original, edge: edge}
	if err := f.cut(ctx, j, input, budget-g.original.NumVertices()); err != nil {
		return nil, err
	}
	j.clock.enter("place")
	var err error
	f.data, err = source.find(ctx, f.original, f.part)
	return f, err
}

// makeSolver puts the sources into the surface's triangulation and prepares to solve
// for heat on it.
func (g *ground) makeSolver(ctx context.Context, j *job) error {
	if err := g.surface.Place(g.data); err != nil {
		return refuse(err)
	}
	j.clock.enter("flip")
	g.surface.Delaunay(g.surface.NumFaces())
	if n := g.surface.Unmended; n > 0 {
		j.warn(fmt.Sprintf("%d edges keep a negative weight: values may leave the range of their data there", n))
	}
	var err error
	if g.solver, err = kernel.NewSolver(ctx, g.surface, kernel.Options{Progress: j.clock.progress}); err != nil {
		return sorted(err)
	}
	size := g.solver.Stats()
	j.summary.Matrix = &matrixSummary{
		Rows:           size.Vertices,
		Nonzeros:       size.MatrixNonzeros,
		FactorNonzeros: size.FactorNonzeros,
		FactorFlops:    size.FactorFlops,
	}
	return nil
}

// result is for fields on this ground: shown on the mesh of the file, or with the
// vertices that the computation added as well. Those that lie inside a face of the
// refined mesh (a source, the foot of a height) are rows without a face.
func (g *ground) result(keepRefined bool) *result {
	r := &result{part: g.part, shown: g.original}
	switch {
	case keepRefined && g.solver != nil:
		r.shown = &mesh.Mesh{Positions: g.surface.Positions, Triangles: g.part.Triangles, File: g.part.File}
	case keepRefined:
		r.shown = g.part
	}
	return r
}
