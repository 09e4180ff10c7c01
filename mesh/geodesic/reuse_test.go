package geodesic_test

import (
	"errors"
	"math/rand/v2"
	"slices"
	"sync"
	"testing"

	"heatskin/mesh"
	"heatskin/mesh/geodesic"
)

// Whatever a Solver was asked before, and by how many goroutines at once, it answers
// as a new one.
func TestOneSolverForManyQuestions(t *testing.T) {
	m := bumpy(3)
	s := geodesic.NewSolver(m)
	ask := func(s *geodesic.Solver, seed uint64) (answer []float64) {
		rng := rand.New(rand.NewPCG(seed, 5))
		from, to := []mesh.Datum{randomDatum(m, rng)}, []mesh.Datum{randomDatum(m, rng)}
		opt := geodesic.Options{}
		switch rng.IntN(6) {
		case 0:
			line, err := s.Path(t.Context(), from, to, opt)
			if err != nil {
				t.Error(err)
				return nil
			}
			return append(line.Points, line.Length)
		case 1:
			opt.Radius = rng.Float64()
		case 2:
			opt.Targets = to
		case 3:
			opt.Targets, opt.TargetsOnly = to, true
		case 4:
			opt.MaxBytes = 1 // breaks off
		case 5:
			from = append(from, mesh.AtVertex(-5))
		}
		w, err := s.Spread(t.Context(), from, opt)
		var limit *geodesic.MemoryError
		var datum *geodesic.DatumError
		if errors.As(err, &limit) || errors.As(err, &datum) {
			return nil
		}
		if err != nil {
			t.Error(err)
			return nil
		}
		return append(w.Distances, w.Targets...)
	}
	const questions = 60
	var want [questions][]float64
	for i := range want {
		want[i] = ask(geodesic.NewSolver(m), uint64(i))
	}
	for i := range want {
		if !slices.Equal(ask(s, uint64(i)), want[i]) {
			t.Fatalf("question %d: a used solver differs", i)
		}
	}
	var group sync.WaitGroup
	for g := range 4 {
		group.Go(func() {
			for i := g; i < questions; i++ {
				if !slices.Equal(ask(s, uint64(i)), want[i]) {
					t.Errorf("question %d: differs among goroutines", i)
				}
			}
		})
	}
	group.Wait()
}
