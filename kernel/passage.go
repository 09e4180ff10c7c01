package kernel

import (
	"context"
	"fmt"
	"math"
)

// A PassageResult tells when a Brownian particle first comes to the targets, and to
// which one.
type PassageResult struct {
	MeanTime  []float64   // by start vertex; 0 on targets, +Inf where no target can be reached
	Reach     [][]float64 // by target, then start vertex: probability of reaching it first
	Unreached int         // components without a target
	Residual  float64     // largest relative error that a solve may have been left with
	Solves    int
	Warnings  []string
}

// A TargetError is a target that is not there, or lies on another.
type TargetError struct {
	Target int
	Vertex int // -1: the target as a whole
	Reason string
}

func (e *TargetError) Error() string {
	if e.Vertex < 0 {
		return fmt.Sprintf("target %d: %s", e.Target, e.Reason)
	}
	return fmt.Sprintf("target %d, vertex %d: %s", e.Target, e.Vertex, e.Reason)
}

// Passage returns, for a Brownian particle of diffusivity D (its density obeys
// du/dt = D Δu; D = ½ in texts on probability) that starts at each vertex, the mean
// time until it first comes to any of the targets, and the probability that it comes
// to each of them first. Each target is a set of surface vertices. Edges reflect.
//
//	D Δ T = -1,  T = 0 on all targets;    Δ p = 0,  p = 1 on its target, 0 on the others.
//
// A vertex counts as a target of zero size only on a mesh: in the plane a particle
// never hits a point, and the mean time grows like the logarithm of 1/h. One
// factorisation, and some two solves for the time and for each target but one. Reach is nil
// with a single target. NaN at vertices in no triangle. O(n log n) per solve.
//
// The error is a *TargetError, an *OptionError or ctx.Err().
func (s *Solver) Passage(ctx context.Context, targets [][]int32, diffusivity float64) (*PassageResult, error) {
	if diffusivity == 0 {
		diffusivity = 1
	}
	if !(diffusivity > 0) || math.IsInf(diffusivity, 0) {
		return nil, &OptionError{"diffusivity", "a finite number above 0", fmt.Sprint(diffusivity)}
	}
	n := len(s.lumped)
	owner := make([]int32, n) // target at each vertex, or -1
	for v := range owner {
		owner[v] = -1
	}
	reached := make([]bool, len(s.area))
	if len(targets) == 0 {
		return nil, &TargetError{0, -1, "want at least one"}
	}
	for k, set := range targets {
		if len(set) == 0 {
			return nil, &TargetError{k, -1, "it has no vertex"}
		}
		for _, v := range set {
			if v < 0 || int(v) >= n {
				return nil, &TargetError{k, int(v), fmt.Sprintf("want a vertex from 0 to %d", n-1)}
			}
			i := s.vertexIn(v)
			switch {
			case s.component[i] < 0:
				return nil, &TargetError{k, int(v), "it is in no triangle of positive area; choose another"}
			case owner[i] >= 0 && owner[i] != int32(k):
				return nil, &TargetError{k, int(v), fmt.Sprintf("it belongs to target %d too", owner[i])}
			}
			owner[i] = int32(k)
			reached[s.component[i]] = true
		}
	}
	held := make([]bool, n)
	for v, c := range s.component {
		held[v] = c < 0 || !reached[c] || owner[v] >= 0
	}
	s.options.Progress("factor", 0)
	factor := s.analysis.NewFactor()
	if err := factor.Factorize(ctx, s.stiffness, held); err != nil {
		return nil, err
	}
	s.options.Progress("factor", 1)

	r := &PassageResult{MeanTime: make([]float64, n)}
	b := make([]float64, n)
	for v, m := range s.lumped {
		if !held[v] {
			b[v] = m
		}
	}
	solve := &refined{solver: s, factor: factor, tau: 1, held: held}
	solve.SolveTo(r.MeanTime, b)
	for v, c := range s.component {
		switch {
		case c < 0:
			r.MeanTime[v] = math.NaN()
		case !reached[c]:
			r.MeanTime[v] = math.Inf(1)
		default:
			r.MeanTime[v] /= diffusivity
		}
	}
	for _, ok := range reached {
		if !ok {
			r.Unreached++
		}
	}
	if r.Unreached > 0 {
		r.Warnings = append(r.Warnings, fmt.Sprintf("%d of %d components have no target: the mean time there is infinite", r.Unreached, len(reached)))
	}
	if len(targets) > 1 {
		if err := s.reach(ctx, r, len(targets), owner, held, reached, solve); err != nil {
			return nil, err
		}
	}
	r.MeanTime = s.outward(r.MeanTime)
	for k, p := range r.Reach {
		r.Reach[k] = s.outward(p)
	}
	r.Residual, r.Solves = solve.worst, solve.solves
	return r, nil
}

// reach fills in the probabilities. The last target's is what the others leave, so
// that they add up to 1.
func (s *Solver) reach(ctx context.Context, r *PassageResult, count int, owner []int32, held, reached []bool, solve *refined) error {
	n := len(owner)
	b := make([]float64, n)
	left := make([]float64, n)
	for v := range left {
		left[v] = 1
	}
	for k := range count {
		if err := ctx.Err(); err != nil {
			return err
		}
		p := left
		if k < count-1 {
			p = make([]float64, n)
			l := s.stiffness
			for i := range b {
				b[i] = 0
				switch {
				case owner[i] == int32(k):
					b[i] = 1
				case !held[i]:
					for q := l.Ptr[i]; q < l.Ptr[i+1]; q++ {
						if owner[l.Adj[q]] == int32(k) {
							b[i] -= l.Off[q]
						}
					}
				}
			}
			solve.SolveTo(p, b)
			for v := range left {
				left[v] -= p[v]
			}
		}
		for v, c := range s.component {
			switch {
			case c < 0:
				p[v] = math.NaN()
			case !reached[c]:
				p[v] = 0
			}
		}
		r.Reach = append(r.Reach, p)
		s.options.Progress("reach", float64(k+1)/float64(count))
	}
	return nil
}
