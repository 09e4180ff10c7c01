package kernel

import (
	"context"
	"fmt"
	"math"
	"slices"
	"sync"

	"heatskin/internal/krylov"
)

// A ModesResult holds eigenpairs of the Laplace-Beltrami operator, ascending.
type ModesResult struct {
	Values    []float64   // λ ≥ 0 of -Δφ = λφ, in 1/length²
	Fields    [][]float64 // φ by surface vertex, ∫φ² = 1; NaN at vertices in no triangle
	Residuals []float64   // ‖Lφ - λMφ‖ over ‖Mφ‖·(λ + the first λ above 0), in the norm of lumped M⁻¹
	Solves    int
	Warnings  []string
}

// Modes returns the count smallest eigenpairs of L φ = λ M φ. Surface vertices in held
// (nil: none) have the value 0; other edges are insulated. Modes are orthonormal in
// the M inner product. On a component without a held vertex the constant is a mode of
// eigenvalue 0; components come in order there. The sign is such that a mode's
// entry of largest absolute value is positive (of several within a millionth, the one
// at the lowest vertex). Modes of one eigenvalue are some orthonormal basis of their
// space.
//
// The method is shift-and-invert block Lanczos with full reorthogonalisation and thick
// restart; it goes on from a random start to see whether eigenvalues have been missed
// (see package internal/krylov). One factorisation, some 4·count + 100 solves, and
// 2·count + 100 vectors of memory.
//
// The error is an *OptionError, a *FieldError, a *krylov.ConvergenceError or ctx.Err().
func (s *Solver) Modes(ctx context.Context, count int, held []int32) (*ModesResult, error) {
	n := len(s.lumped)
	hold := make([]bool, n)
	floating := make([]bool, len(s.area))
	for c := range floating {
		floating[c] = true
	}
	for _, v := range held {
		if v < 0 || int(v) >= n {
			return nil, &FieldError{"held", int(v), 0, fmt.Sprintf("a vertex from 0 to %d", n-1)}
		}
		i := s.vertexIn(v)
		hold[i] = true
		if c := s.component[i]; c >= 0 {
			floating[c] = false
		}
	}
	unknowns, constants := 0, 0
	for v, c := range s.component {
		hold[v] = hold[v] || c < 0
		if !hold[v] {
			unknowns++
		}
	}
	for _, f := range floating {
		if f {
			constants++
		}
	}
	if count < 1 || count > unknowns {
		return nil, &OptionError{"count", fmt.Sprintf("1 to %d, the number of unknowns", unknowns), fmt.Sprint(count)}
	}
	r := &ModesResult{}
	s.constants(r, min(count, constants), floating)
	if rest := count - constants; rest > 0 {
		if err := s.lanczos(ctx, r, rest, hold, floating); err != nil {
			return nil, err
		}
	}
	s.residuals(r, hold)
	for k, x := range r.Fields {
		x = s.outward(x)
		fixSign(x)
		for i, c := range s.component {
			if c < 0 {
				x[s.vertexOut(i)] = math.NaN()
			}
		}
		r.Fields[k] = x
	}
	return r, nil
}

// constants adds the modes of eigenvalue 0.
func (s *Solver) constants(r *ModesResult, count int, floating []bool) {
	for c, f := range floating {
		if !f || len(r.Fields) == count {
			continue
		}
		x := make([]float64, len(s.lumped))
		for v, at := range s.component {
			if int(at) == c {
				x[v] = 1 / math.Sqrt(s.area[c])
			}
		}
		r.Values = append(r.Values, 0)
		r.Fields = append(r.Fields, x)
	}
}

func (s *Solver) lanczos(ctx context.Context, r *ModesResult, count int, hold, floating []bool) error {
	// A shift far beyond the slowest mode sets the small eigenvalues as far apart as can
	// be; the constants, which it would drown in rounding, are deflated.
	shift := 1e3 * slices.Max(s.area)
	s.options.Progress("factor", 0)
	tau := make([]float64, len(s.area))
	for c := range tau {
		tau[c] = shift
	}
	matrix, _ := s.assemble(tau)
	factor := s.analysis.NewFactor()
	if err := factor.Factorize(ctx, matrix, hold); err != nil {
		return err
	}
	solve, solveMany := factor.SolveTo, factor.SolveManyTo
	if s.leak(nil)*slices.Max(s.area) > 1e-8 {
		solve, solveMany = (&refined{solver: s, factor: factor, mass: true, tau: shift, held: hold}).SolveTo, nil
	}
	pencil := &krylov.Pencil{Dim: len(s.lumped), Shift: shift, Workers: s.options.Workers}
	if s.consistent == nil {
		s.balanced(pencil, solve, solveMany, hold, floating)
	} else {
		s.plain(pencil, solve, solveMany, hold, floating)
	}
	// This residual leaves eigenvalues good to its square, vectors to it over the gap to
	// the next eigenvalue, both in terms of B's.
	e, err := krylov.Smallest(ctx, pencil, count, 1e-9, func(fraction float64) { s.options.Progress("modes", fraction) })
	if err != nil {
		return err
	}
	if s.consistent == nil {
		for _, x := range e.Vectors {
			for v, m := range s.lumped {
				if m > 0 {
					x[v] /= math.Sqrt(m)
				}
			}
		}
	}
	r.Values = append(r.Values, e.Values...)
	r.Fields = append(r.Fields, e.Vectors...)
	r.Solves += e.Solves
	return nil
}

// plain makes the pencil of L and M as they are, with zeros where held.
func (s *Solver) plain(p *krylov.Pencil, solve func(dst, b []float64), solveMany func(dst, b []float64, k int), hold, floating []bool) {
	free := func(x []float64) {
		for v, h := range hold {
			if h {
				x[v] = 0
			}
		}
	}
	p.Mass = func(dst, x []float64) {
		s.massTo(dst, x)
		free(dst)
	}
	p.Deflate = func(x []float64) {
		s.centre(x, floating)
		free(x)
	}
	p.Solve, p.SolveMany = solve, solveMany
}

// balanced makes the pencil in the variable √M x, whose mass matrix is the identity:
// that saves most of the work on vectors.
func (s *Solver) balanced(p *krylov.Pencil, solve func(dst, b []float64), solveMany func(dst, b []float64, k int), hold, floating []bool) {
	root := make([]float64, len(s.lumped))
	for v, m := range s.lumped {
		root[v] = math.Sqrt(m)
	}
	weigh := func(x []float64) { // a column a goroutine
		var wait sync.WaitGroup
		for column := range slices.Chunk(x, len(root)) {
			wait.Go(func() {
				for v, w := range root {
					column[v] *= w
				}
			})
		}
		wait.Wait()
	}
	p.Solve = func(dst, b []float64) {
		weigh(b)
		solve(dst, b)
		weigh(dst)
	}
	if solveMany != nil {
		p.SolveMany = func(dst, b []float64, k int) {
			weigh(b)
			solveMany(dst, b, k)
			weigh(dst)
		}
	}
	p.Deflate = func(x []float64) {
		mean := make([]float64, len(s.area))
		for v, c := range s.component {
			if c >= 0 {
				mean[c] += root[v] * x[v]
			}
		}
		for v, c := range s.component {
			switch {
			case hold[v]:
				x[v] = 0
			case floating[c]:
				x[v] -= root[v] * mean[c] / s.area[c]
			}
		}
	}
}

// residuals measures every pair on the matrices themselves.
func (s *Solver) residuals(r *ModesResult, hold []bool) {
	n := len(s.lumped)
	lx, mx := make([]float64, n), make([]float64, n)
	first := 0.0
	for _, lambda := range r.Values {
		if first == 0 {
			first = lambda
		}
	}
	for k, x := range r.Fields {
		s.stiffness.MulVecTo(lx, x)
		s.massTo(mx, x)
		off, size := 0.0, 0.0
		for v, m := range s.lumped {
			if !hold[v] {
				d := lx[v] - r.Values[k]*mx[v]
				off += d / m * d
				size += mx[v] / m * mx[v]
			}
		}
		scale := r.Values[k] + first
		if scale == 0 {
			scale = 1 / slices.Max(s.area)
		}
		r.Residuals = append(r.Residuals, math.Sqrt(off/size)/scale)
	}
}

// fixSign makes the entry of largest absolute value positive.
func fixSign(x []float64) {
	top := largestOf(x)
	for _, v := range x {
		if math.Abs(v) >= top*(1-1e-6) {
			if v < 0 {
				for i := range x {
					x[i] = -x[i]
				}
			}
			return
		}
	}
}
