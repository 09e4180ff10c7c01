package cli

import (
	"context"
	"errors"
	"math"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
	"heatskin/mesh"
)

// refineBudget is how many vertices a refinement may make: what a workstation
// with 16 GiB factors with room to spare.
const refineBudget = 5_000_000

// A ground is what a command computes on: the mesh as it was read, the mesh with its
// faces cut as finely as was asked, the sources placed on it, and the solver.
type ground struct {
	original, part *mesh.Mesh
	data           []mesh.Datum
	surface        *mesh.Surface
	solver         *kernel.Solver
}

// prepare makes the ground of a command whose mesh has been read.
func prepare(ctx context.Context, j *job, original *mesh.Mesh, input *meshFlags, refine *refineFlags, source *sourceFlags) (*ground, error) {
	g := &ground{original: original, part: original}
	if refine.maxEdge > 0 && !math.IsInf(refine.maxEdge, 1) {
		j.clock.enter("refine")
		var err error
		if g.part, err = mesh.Refine(ctx, original, refine.maxEdge, refineBudget); err != nil {
			return nil, refuse(err)
		}
		j.summary.Mesh.ComputedVertices = g.part.NumVertices()
		j.summary.Mesh.ComputedFaces = g.part.NumTriangles()
		j.note("faces cut to edges of at most %s: %d vertices, %d faces",
			input.length(refine.maxEdge), g.part.NumVertices(), g.part.NumTriangles())
	}
	j.clock.enter("place")
	var err error
	if g.data, err = source.place(ctx, j, original, g.part, input); err != nil {
		return nil, err
	}
	j.clock.enter("measure")
	if g.surface, err = mesh.NewSurface(g.part); err != nil {
		return nil, refuse(err)
	}
	if err := g.surface.Place(g.data); err != nil {
		return nil, refuse(err)
	}
	j.clock.enter("flip")
	g.surface.Delaunay(g.surface.NumFaces())
	if g.solver, err = kernel.NewSolver(ctx, g.surface, kernel.Options{Progress: j.clock.progress}); err != nil {
		return nil, solverError(err)
	}
	size := g.solver.Stats()
	j.summary.Mesh.Components, j.summary.Mesh.Area = size.Components, number(size.Area)
	j.summary.Matrix = &matrixSummary{
		Rows:           size.Vertices,
		Nonzeros:       size.MatrixNonzeros,
		FactorNonzeros: size.FactorNonzeros,
		FactorFlops:    size.FactorFlops,
	}
	return g, nil
}

// solverError sorts what a solver met: a mesh or source that does not suit it is
// refused, anything else is a failure on the way.
func solverError(err error) error {
	var (
		datum *mesh.DatumError
		empty *mesh.EmptyError
		size  *mesh.RangeError
		load  *kernel.LoadError
	)
	if errors.As(err, &datum) || errors.As(err, &empty) || errors.As(err, &size) || errors.As(err, &load) {
		return refuse(err)
	}
	return err
}

// result shows fields over the surface's vertices: on the vertices of the file, or
// with those that the computation added as well.
func (g *ground) result(fields []fieldfile.Column, keepRefined bool) *result {
	r := &result{part: g.part, rows: g.original.NumVertices(), fields: fields}
	if keepRefined {
		r.rows, r.extended = g.surface.NumVertices, g.surface.Positions
	}
	return r
}
