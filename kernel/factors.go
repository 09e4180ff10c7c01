package kernel

import (
	"context"
	"math"
	"slices"
	"sync"

	"heatskin/internal/sparse"
)

// A shelf keeps factors for the next use: one that is asked for again is handed out
// as it is, and the memory of one that nobody uses is filled anew.
type shelf struct {
	mu     sync.Mutex
	items  []*shelved
	pinned *sparse.Factor
	pins   []int32
}

type shelved struct {
	factor *sparse.Factor
	tau    []float64
	users  int
}

// factorShifted returns the factor of M + diag(τ) L, with τ given for each component:
// it is constant there, so that the matrix stays symmetric. Components whose τ is
// NaN, and vertices in no triangle, are held: a solve hands their right side through.
// The caller gives the factor back by release, and must not refill it. One
// factorisation, or none if the last one was the same.
func (s *Solver) factorShifted(ctx context.Context, tau []float64) (*sparse.Factor, error) {
	f, _, err := s.shifted(ctx, tau)
	return f, err
}

func (s *Solver) shifted(ctx context.Context, tau []float64) (f *sparse.Factor, fresh bool, err error) {
	same := func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }
	s.shelf.mu.Lock()
	for _, it := range s.shelf.items {
		if slices.EqualFunc(it.tau, tau, same) {
			it.users++
			s.shelf.mu.Unlock()
			return it.factor, false, nil
		}
	}
	at := slices.IndexFunc(s.shelf.items, func(it *shelved) bool { return it.users == 0 })
	if at >= 0 {
		f = s.shelf.items[at].factor
		s.shelf.items = slices.Delete(s.shelf.items, at, at+1)
	}
	s.shelf.mu.Unlock()
	if f == nil {
		f = s.analysis.NewFactor()
	}
	matrix, held := s.assemble(tau)
	s.options.Progress("factor", 0)
	if err := f.Factorize(ctx, matrix, held); err != nil {
		return nil, false, err
	}
	s.options.Progress("factor", 1)
	s.shelf.mu.Lock()
	s.shelf.items = append(s.shelf.items, &shelved{factor: f, tau: slices.Clone(tau), users: 1})
	s.shelf.mu.Unlock()
	return f, true, nil
}

// release gives a factor of factorShifted back.
func (s *Solver) release(f *sparse.Factor) {
	s.shelf.mu.Lock()
	defer s.shelf.mu.Unlock()
	idle := 0
	for _, it := range s.shelf.items {
		if it.factor == f {
			it.users--
		}
		if it.users == 0 {
			idle++
		}
	}
	s.shelf.items = slices.DeleteFunc(s.shelf.items, func(it *shelved) bool { // one idle factor is kept
		drop := it.users == 0 && idle > 1
		if drop {
			idle--
		}
		return drop
	})
}

// letGo drops the factors that nobody uses.
func (s *Solver) letGo() {
	s.shelf.mu.Lock()
	defer s.shelf.mu.Unlock()
	s.shelf.items = slices.DeleteFunc(s.shelf.items, func(it *shelved) bool { return it.users == 0 })
}

// assemble builds M + diag(τ) L and the mask of held rows.
func (s *Solver) assemble(tau []float64) (a *sparse.Matrix, held []bool) {
	l := s.stiffness
	a = &sparse.Matrix{Pattern: l.Pattern, Diag: make([]float64, len(l.Diag)), Off: make([]float64, len(l.Off))}
	held = make([]bool, len(l.Diag))
	for i, c := range s.component {
		if c < 0 || math.IsNaN(tau[c]) {
			held[i] = true
			continue
		}
		t := tau[c]
		a.Diag[i] = t * l.Diag[i]
		for k := l.Ptr[i]; k < l.Ptr[i+1]; k++ {
			a.Off[k] = t * l.Off[k]
		}
		if s.consistent == nil {
			a.Diag[i] += s.lumped[i]
			continue
		}
		a.Diag[i] += s.consistent.Diag[i]
		for k := l.Ptr[i]; k < l.Ptr[i+1]; k++ {
			a.Off[k] += s.consistent.Off[k]
		}
	}
	return a, held
}

// factorPinned returns the factor of L with one vertex of each component held, and
// those vertices, by component. A solve with b = 0 there solves L x = b exactly (no
// small shift) for any b that sums to 0 on each component, x being 0 at the pins. It
// is made once; it must not be refilled.
func (s *Solver) factorPinned(ctx context.Context) (*sparse.Factor, []int32, error) {
	s.shelf.mu.Lock()
	defer s.shelf.mu.Unlock()
	if s.shelf.pinned != nil {
		return s.shelf.pinned, s.shelf.pins, nil
	}
	pins := make([]int32, len(s.area))
	for c := range pins {
		pins[c] = -1
	}
	held := make([]bool, len(s.component))
	for i, c := range s.component {
		switch {
		case c < 0:
			held[i] = true
		case pins[c] < 0:
			pins[c], held[i] = int32(i), true
		}
	}
	f := s.analysis.NewFactor()
	if err := f.Factorize(ctx, s.stiffness, held); err != nil {
		return nil, nil, err
	}
	s.shelf.pinned, s.shelf.pins = f, pins
	return f, pins, nil
}
