package kernel

import (
	"fmt"
	"math"
	"slices"

	"heatskin/internal/sparse"
)

// A Problem is a linear heat problem on a Solver's surface,
//
//	du/dt = div(D grad u) - c (u - ambient) + rate,
//
// with edges insulated unless they are held or exchange heat. Slices have one entry
// for each surface vertex; nil means none. Heat is the area integral of u.
type Problem struct {
	Diffusivity float64    // D in length² per unit of time; 0 means 1
	Initial     []float64  // u at time 0
	Load        []float64  // heat put in at time 0, on top of Initial
	Rate        []float64  // heat put in per unit of time
	Hold        []float64  // u where it is held from time 0 on; NaN where it is free
	Exchanges   []Exchange // with surroundings of given temperature
}

// An Exchange lets a vertex with the value u lose Weight·(u - Ambient) of heat per
// unit of time.
type Exchange struct {
	Name    string    // for balances and messages
	Weight  []float64 // by vertex, 0 or more
	Ambient float64
}

// FaceExchange is the loss c·(u - ambient) per unit of time and area over the whole
// surface, c in 1/time.
func (s *Solver) FaceExchange(c, ambient float64) Exchange {
	w := s.Areas()
	for i := range w {
		w[i] *= c
	}
	return Exchange{Name: "faces", Weight: w, Ambient: ambient}
}

// EdgeExchange is the loss c·(u - ambient) per unit of time and length along the edges
// of datum i of mesh.Surface.Place: -D du/dn = c (u - ambient), c in length/time.
func (s *Solver) EdgeExchange(i int, c, ambient float64) Exchange {
	w := s.Along(i)
	for v := range w {
		w[v] *= c
	}
	return Exchange{Name: fmt.Sprintf("edge %d", i), Weight: w, Ambient: ambient}
}

// Along gives each vertex half the length of every edge of datum i at it; it is above
// 0 on just the vertices of those edges, the ones that splits have added included.
func (s *Solver) Along(i int) []float64 {
	w := make([]float64, len(s.lumped))
	f := s.surface
	for h := range int32(len(f.Vert)) {
		if !f.OnDatum(h, i) {
			continue
		}
		first := true // one halfedge speaks for its edge
		for g := f.Glue[h]; g != h; g = f.Glue[g] {
			first = first && h < g
		}
		if first {
			head := f.Vert[h-h%3+(h+1)%3]
			length := f.LengthInSpace(h)
			w[f.Vert[h]] += length / 2
			w[head] += length / 2
		}
	}
	return s.outward(w)
}

// A FieldError is an entry of a Problem that no flow can start from.
type FieldError struct {
	Field  string // "initial", "hold", ...
	Vertex int
	Value  float64
	Want   string
}

func (e *FieldError) Error() string {
	return fmt.Sprintf("%s at vertex %d: want %s, got %g", e.Field, e.Vertex, e.Want, e.Value)
}

// A system is a Problem in matrices: with u = lift + w, lift being the held values
// (and 0 elsewhere) and w free,
//
//	M dw/dt = -K w + b,  M w(0) = p,  K = D L + diag(Σ weights),
//
// all of it on the free rows.
type system struct {
	solver   *Solver
	problem  *Problem
	k        *sparse.Matrix
	d        float64   // diffusivity
	loss     []float64 // Σ weights
	held     []bool    // also vertices in no triangle
	lift     []float64
	p, b     []float64
	put      []float64 // heat given per unit of time at each vertex, by Rate and ambients; on held rows too
	begin    float64   // heat at time 0, held values in place
	floating []bool    // by component: nothing is held and nothing lost, so its heat is kept
	size     float64   // the largest value among the data
}

func (s *Solver) newSystem(pr *Problem) (*system, error) {
	d := pr.Diffusivity
	if d == 0 {
		d = 1
	}
	if !(d > 0) || math.IsInf(d, 0) {
		return nil, &OptionError{"diffusivity", "a finite number above 0", fmt.Sprint(d)}
	}
	n := len(s.lumped)
	pr = s.inwardProblem(pr)
	y := &system{solver: s, problem: pr, d: d, loss: make([]float64, n), held: make([]bool, n), lift: make([]float64, n),
		p: make([]float64, n), b: make([]float64, n), put: make([]float64, n), floating: make([]bool, len(s.area))}
	if err := y.check(); err != nil {
		return nil, err
	}
	for c := range y.floating {
		y.floating[c] = true
	}
	l := s.stiffness
	y.k = &sparse.Matrix{Pattern: l.Pattern, Diag: make([]float64, n), Off: make([]float64, len(l.Off))}
	for k, w := range l.Off {
		y.k.Off[k] = d * w
	}
	for i, c := range s.component {
		y.k.Diag[i] = d * l.Diag[i]
		switch {
		case c < 0:
			y.held[i] = true
			continue
		case pr.Hold != nil && !math.IsNaN(pr.Hold[i]):
			y.held[i], y.lift[i], y.floating[c] = true, pr.Hold[i], false
			y.size = max(y.size, math.Abs(pr.Hold[i]))
		}
		if pr.Rate != nil {
			y.put[i] = pr.Rate[i]
		}
		for _, e := range pr.Exchanges {
			if w := e.Weight[i]; w > 0 {
				y.k.Diag[i] += w
				y.loss[i] += w
				y.put[i] += w * e.Ambient
				y.floating[c] = false
				y.size = max(y.size, math.Abs(e.Ambient))
			}
		}
	}
	y.start()
	return y, nil
}

// start works out p, b and the heat at time 0.
func (y *system) start() {
	s, pr, n := y.solver, y.problem, len(y.lift)
	u := make([]float64, n) // at time 0, held values in place; loads apart
	free := make([]float64, n)
	for i := range u {
		u[i] = y.lift[i]
		if !y.held[i] && pr.Initial != nil {
			u[i], free[i] = pr.Initial[i], pr.Initial[i]
			y.size = max(y.size, math.Abs(u[i]))
		}
	}
	s.massTo(y.p, free)
	y.k.MulVecTo(y.b, y.lift)
	for i := range y.p {
		if y.held[i] {
			y.p[i], y.b[i] = 0, 0
			continue
		}
		y.b[i] = y.put[i] - y.b[i]
		if pr.Load != nil {
			y.p[i] += pr.Load[i]
			y.size = max(y.size, math.Abs(pr.Load[i]/s.lumped[i]))
			y.begin += pr.Load[i]
		}
	}
	y.begin += s.heatOf(u)
}

// inwardProblem is a problem in the Solver's own numbering.
func (s *Solver) inwardProblem(pr *Problem) *Problem {
	n := len(s.lumped)
	own := *pr
	for _, field := range []*[]float64{&own.Initial, &own.Load, &own.Rate, &own.Hold} {
		if *field != nil && len(*field) != n {
			panic("kernel: Problem: a slice has not one entry for each surface vertex")
		}
		*field = s.inward(*field)
	}
	own.Exchanges = slices.Clone(pr.Exchanges)
	for k := range own.Exchanges {
		weight := &own.Exchanges[k].Weight
		if len(*weight) != n {
			panic("kernel: Problem: an exchange has not one weight for each surface vertex")
		}
		*weight = s.inward(*weight)
	}
	return &own
}

func (y *system) check() error {
	s, pr := y.solver, y.problem
	fields := []struct {
		name   string
		values []float64
	}{{"initial", pr.Initial}, {"load", pr.Load}, {"rate", pr.Rate}, {"hold", pr.Hold}}
	for _, f := range fields {
		for i, x := range f.values {
			if f.name == "hold" && math.IsNaN(x) {
				continue
			}
			if x-x != 0 && s.component[i] >= 0 {
				return &FieldError{f.name, s.vertexOut(i), x, "a finite number"}
			}
			if s.component[i] < 0 && (f.name == "load" || f.name == "rate") && x != 0 {
				return &FieldError{f.name, s.vertexOut(i), x, "0: the vertex is in no triangle of positive area"}
			}
		}
	}
	for _, e := range pr.Exchanges {
		if e.Ambient-e.Ambient != 0 {
			return &OptionError{e.Name + " exchange", "a finite ambient value", fmt.Sprint(e.Ambient)}
		}
		for i, w := range e.Weight {
			if !(w >= 0) || math.IsInf(w, 0) {
				return &FieldError{e.Name + " exchange", s.vertexOut(i), w, "a finite coefficient, 0 or more"}
			}
		}
	}
	return nil
}

// matrix is M + τK.
func (y *system) matrix(tau float64) *sparse.Matrix {
	s, k := y.solver, y.k
	a := &sparse.Matrix{Pattern: k.Pattern, Diag: make([]float64, len(k.Diag)), Off: make([]float64, len(k.Off))}
	for i, x := range k.Diag {
		a.Diag[i] = tau * x
	}
	for i, x := range k.Off {
		a.Off[i] = tau * x
	}
	if s.consistent == nil {
		for i, m := range s.lumped {
			a.Diag[i] += m
		}
		return a
	}
	for i, m := range s.consistent.Diag {
		a.Diag[i] += m
	}
	for i, m := range s.consistent.Off {
		a.Off[i] += m
	}
	return a
}

// solve returns the solve with M + τK, given its factor: refined if heat might leak
// within time t by more than the tolerance.
func (y *system) solve(factor *sparse.Factor, tau, t, tolerance float64) func(dst, b []float64) {
	if y.solver.leak(nil)*y.d*t <= 0.1*tolerance {
		return factor.SolveTo
	}
	return y.refine(factor, true, tau).SolveTo
}

// refine is the refined solve with M + τK, or with τK alone.
func (y *system) refine(factor *sparse.Factor, mass bool, tau float64) *refined {
	loss := make([]float64, len(y.loss))
	for i, w := range y.loss {
		loss[i] = tau * w
	}
	return &refined{solver: y.solver, factor: factor, mass: mass, tau: tau * y.d, loss: loss, held: y.held}
}

// massTo sets dst = M x on the free rows and 0 on held ones; x is 0 there.
func (y *system) massTo(dst, x []float64) {
	y.solver.massTo(dst, x)
	for i, h := range y.held {
		if h {
			dst[i] = 0
		}
	}
}

// drift is how the mean of each floating component goes: its start, and its growth
// per unit of time.
func (y *system) drift() (start, growth []float64) {
	start, growth = make([]float64, len(y.floating)), make([]float64, len(y.floating))
	for i, c := range y.solver.component {
		if c >= 0 && y.floating[c] {
			start[c] += y.p[i] / y.solver.area[c]
			growth[c] += y.b[i] / y.solver.area[c]
		}
	}
	return start, growth
}
