package kernel

import (
	"context"
	"math"
	"runtime"
	"slices"
	"sync"

	"heatskin/internal/sparse"
	"heatskin/mesh"
)

// Options are a Solver's, for all its work.
type Options struct {
	Workers        int  // goroutines; 0 means as many as there are processors
	ConsistentMass bool // mass matrix of linear elements, in place of the lumped one
	// Progress is told, from time to time, which stage runs and what fraction of it is
	// done, from 0 to 1. It may be nil. Calls come from one goroutine at a time for
	// each call of a Solver's method.
	Progress func(stage string, fraction float64)
}

// A Solver holds the heat operators of one surface and what is costly about them.
//
// Made once, by NewSolver: the matrices L and M, the components, and the symbolic
// analysis of their common pattern. Kept from call to call: the factor last used by
// time steps, and the factor of L itself. Memory: about 16 bytes per entry of L, and
// 8 per entry of each factor (see Stats). Vertices are numbered anew, as the faces come,
// which no public method shows (see numbering). A Solver may serve several goroutines at
// once.
type Solver struct {
	numbering
	surface    *mesh.Surface  // in the Solver's own numbering
	stiffness  *sparse.Matrix // L
	lumped     []float64      // area of each vertex, M·1
	consistent *sparse.Matrix // M, or nil: then it is diagonal
	component  []int32        // by vertex; -1: in no triangle
	area       []float64      // by component
	analysis   *sparse.Analysis
	options    Options
	shelf      shelf
	frameOnce  sync.Once
	frame      frames // of the vertices' angles, for fronts; made by the first Distance
}

// Stats are the sizes of a Solver's matrices.
type Stats struct {
	Vertices       int     // of the surface, those added to the mesh included
	Components     int     //
	Area           float64 // of all components
	MatrixNonzeros int64   // entries of L, both triangles and diagonal
	FactorNonzeros int64   // entries of one factor
	FactorFlops    float64 // floating-point operations for one factor
}

// NewSolver prepares the operators of a surface. Sources inside triangles must have
// been placed and the surface made Delaunay before; it must not be changed afterwards.
// The error is ctx.Err(), an *OperatorError, or that of a surface too large to index.
func NewSolver(ctx context.Context, s *mesh.Surface, opt Options) (*Solver, error) {
	own, outer := s.Renumbered()
	numbers := newNumbering(outer)
	op := operators{numbering: numbers, stiffness: own.Laplacian(), lumped: own.LumpedMass(), component: make([]int32, len(outer))}
	if opt.ConsistentMass {
		op.consistent = own.ConsistentMass()
	}
	component, count := s.Components() // numbered as the surface's vertices come
	for i, v := range outer {
		op.component[i] = component[v]
	}
	op.count = count
	solver, err := newSolver(ctx, own, op, opt)
	if own.Density == nil { // lines are measured by them otherwise
		own.Positions = nil // they have served to order the unknowns
	}
	return solver, err
}

// operators are what heat needs to know of a surface, in the numbering that they say.
type operators struct {
	numbering
	stiffness  *sparse.Matrix
	lumped     []float64
	consistent *sparse.Matrix
	component  []int32
	count      int
}

func newSolver(ctx context.Context, s *mesh.Surface, op operators, opt Options) (*Solver, error) {
	if opt.Workers <= 0 {
		opt.Workers = runtime.GOMAXPROCS(0)
	}
	if opt.Progress == nil {
		opt.Progress = func(string, float64) {}
	}
	v := &Solver{
		numbering: op.numbering, surface: s, stiffness: op.stiffness, lumped: op.lumped, consistent: op.consistent,
		component: op.component, area: make([]float64, op.count), options: opt,
	}
	for i, c := range v.component {
		if c < 0 {
			continue
		}
		if a, w := v.lumped[i], v.stiffness.Diag[i]; !(a > 0) || a-a != 0 || w-w != 0 {
			return nil, &OperatorError{v.vertexOut(i), a, w}
		}
		v.area[c] += v.lumped[i]
	}
	var coords []float64
	if s != nil {
		coords = s.Positions
	}
	opt.Progress("analyse", 0)
	var err error
	v.analysis, err = sparse.Analyze(ctx, v.stiffness.Pattern, sparse.Options{Coords: coords, Workers: opt.Workers})
	if err != nil {
		return nil, err
	}
	opt.Progress("analyse", 1)
	return v, nil
}

// Stats tells the sizes of the matrices.
func (s *Solver) Stats() Stats {
	a := s.analysis.Stats()
	total := 0.0
	for _, x := range s.area {
		total += x
	}
	return Stats{
		Vertices: len(s.lumped), Components: len(s.area), Area: total,
		MatrixNonzeros: int64(len(s.lumped) + len(s.stiffness.Adj)),
		FactorNonzeros: a.FactorNonzeros, FactorFlops: a.Flops,
	}
}

// Areas are those of the vertices: a third of each triangle's goes to each of its
// corners. Σ area·u is the area integral of a field u.
func (s *Solver) Areas() []float64 { return slices.Clone(s.outward(s.lumped)) }

// massTo sets dst = M x.
func (s *Solver) massTo(dst, x []float64) {
	if s.consistent != nil {
		s.consistent.MulVecTo(dst, x)
		return
	}
	for i, m := range s.lumped {
		dst[i] = m * x[i]
	}
}

// means sets mean[c] to the area mean of x over component c, for every component.
func (s *Solver) means(mean, x []float64) {
	clear(mean)
	for i, c := range s.component {
		if c >= 0 {
			mean[c] += s.lumped[i] * x[i]
		}
	}
	for c := range mean {
		mean[c] /= s.area[c]
	}
}

// centre takes its mean off x on each component where out is true.
func (s *Solver) centre(x []float64, out []bool) {
	mean := make([]float64, len(s.area))
	s.means(mean, x)
	for i, c := range s.component {
		if c >= 0 && out[c] {
			x[i] -= mean[c]
		}
	}
}

// heatOf is the area integral of x where it has a value.
func (s *Solver) heatOf(x []float64) float64 {
	sum := 0.0
	for i, m := range s.lumped {
		if m > 0 && !math.IsNaN(x[i]) {
			sum += m * x[i]
		}
	}
	return sum
}
