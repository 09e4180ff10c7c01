package cli

import (
	"context"
	"math"

	"heatskin/kernel"
	"heatskin/mesh"
)

// refineBudget is how many vertices a refinement may make: what a workstation
// with 16 GiB factors with room to spare.
const refineBudget = 5_000_000

// A ground is what a command computes on: the mesh as it was read, the mesh with its
// faces cut as finely as was asked, the sources placed on it, its intrinsic surface,
// and for what needs it the heat solver.
type ground struct {
	original, part *mesh.Mesh
	data           []mesh.Datum
	surface        *mesh.Surface
	solver         *kernel.Solver // after makeSolver
}

// prepare makes the ground of a command whose mesh has been read.
func prepare(ctx context.Context, j *job, original *mesh.Mesh, input *meshFlags, refine *refineFlags, source *sourceFlags) (*ground, error) {
	g := &ground{original: original, part: original}
	var err error
	if refine.maxEdge > 0 && !math.IsInf(refine.maxEdge, 1) {
		j.clock.enter("refine")
		if g.part, err = mesh.Refine(ctx, original, refine.maxEdge, refineBudget); err != nil {
			return nil, refuse(err)
		}
		j.summary.Mesh.ComputedVertices = g.part.NumVertices()
		j.summary.Mesh.ComputedFaces = g.part.NumTriangles()
		j.note("faces cut to edges of at most %s: %d vertices, %d faces",
			input.length(refine.maxEdge), g.part.NumVertices(), g.part.NumTriangles())
	}
	j.clock.enter("place")
	if g.data, err = source.place(ctx, j, original, g.part, input); err != nil {
		return nil, err
	}
	j.clock.enter("measure")
	if g.surface, err = mesh.NewSurface(g.part); err != nil {
		return nil, refuse(err)
	}
	size := j.summary.Mesh
	_, size.Components = g.surface.Components()
	for f := range int32(g.surface.NumFaces()) {
		size.Area += number(g.surface.Area(f))
	}
	return g, nil
}

// makeSolver puts the sources into the surface's triangulation and prepares to solve
// for heat on it.
func (g *ground) makeSolver(ctx context.Context, j *job) error {
	if err := g.surface.Place(g.data); err != nil {
		return refuse(err)
	}
	j.clock.enter("flip")
	g.surface.Delaunay(g.surface.NumFaces())
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
