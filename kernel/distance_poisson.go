package kernel

import (
	"context"
	"math"
)

// nearDisc is the radius, in mean edges, within which the Poisson field is held to
// the front's values: there the direction of heat is at its worst.
const nearDisc = 4

// poissonDistance replaces the front's distances by the smooth variant: the function
// whose gradient is, in the least-squares sense, closest to the unit field that points
// away from warmth (Crane, Weischedel and Wardetzky 2013). Unlike theirs, the direction is
// that of log u, which is nearly linear (Varadhan 1967) where u is not; t is 4 h²; and
// the front's distances are held in a disc around the sources. Where the surface has a
// boundary, u is the mean of the insulated and the held solution.
func (s *Solver) poissonDistance(ctx context.Context, w *front, src sources, res *DistanceResult) error {
	tau := make([]float64, len(res.Times))
	for c, t := range res.Times {
		tau[c] = 4 * t
	}
	u, err := s.heatForDirection(ctx, src, tau, res)
	if err != nil {
		return err
	}
	n := s.surface.NumVertices
	held := make([]bool, n)
	known := make([]float64, n)
	for v := range w.at {
		d := w.at[v].d
		c := s.component[v]
		if c < 0 || math.IsNaN(tau[c]) || d <= nearDisc*math.Sqrt(res.Times[c]) {
			held[v] = true
			if !math.IsInf(d, 1) {
				known[v] = d
			}
		}
	}
	rhs := s.divergence(u)
	l := s.stiffness
	for v := range rhs {
		if held[v] {
			rhs[v] = known[v]
			continue
		}
		for k := l.Ptr[v]; k < l.Ptr[v+1]; k++ {
			if j := l.Adj[k]; held[j] {
				rhs[v] -= l.Off[k] * known[j]
			}
		}
	}
	f := s.analysis.NewFactor()
	if err := f.Factorize(ctx, l, held); err != nil {
		return err
	}
	f.SolveTo(rhs, rhs)
	res.Solves++
	for v := range rhs {
		if !held[v] {
			res.Distance[v] = max(rhs[v], 0)
		}
	}
	return nil
}

// heatForDirection is log u for the direction of the Poisson field.
func (s *Solver) heatForDirection(ctx context.Context, src sources, tau []float64, res *DistanceResult) ([]float64, error) {
	u := make([]float64, s.surface.NumVertices)
	load := func(x []float64) {
		for _, v := range src.vertices {
			x[v] = s.lumped[v]
		}
	}
	load(u)
	f, err := s.factorShifted(ctx, tau)
	if err != nil {
		return nil, err
	}
	f.SolveTo(u, u)
	s.release(f)
	res.Solves++
	rim := make([]bool, len(u))
	for h, v := range s.surface.Vert {
		if s.surface.Boundary(int32(h)) {
			rim[v], rim[s.surface.Vert[next(int32(h))]] = true, true
		}
	}
	for _, v := range src.vertices {
		rim[v] = false
	}
	matrix, held := s.assemble(tau)
	any := false
	for v, on := range rim {
		held[v] = held[v] || on
		any = any || on
	}
	if any {
		cold := make([]float64, len(u))
		load(cold)
		f := s.analysis.NewFactor()
		if err := f.Factorize(ctx, matrix, held); err != nil {
			return nil, err
		}
		f.SolveTo(cold, cold)
		res.Solves++
		for v := range u {
			u[v] = (u[v] + cold[v]) / 2
		}
	}
	for v, x := range u {
		u[v] = math.Log(x) // -Inf where heat never comes: such components are held
	}
	return u, nil
}

// divergence is the right side of L φ = b for the piecewise constant unit field along
// the descent of the given function: at vertex i, b sums over its triangles the field
// against the gradient of the hat function of i.
func (s *Solver) divergence(f []float64) []float64 {
	b := make([]float64, len(f))
	m := s.surface
	for h0 := int32(0); h0 < int32(len(m.Vert)); h0 += 3 {
		i, j, k := m.Vert[h0], m.Vert[h0+1], m.Vert[h0+2]
		// The face in the plane: i = (0, 0), j = (c, 0), k = (x, y).
		c, b2 := m.Length[h0], m.Length[h0+2]
		cos := m.Cot(h0+1) / math.Hypot(1, m.Cot(h0+1)) // of the angle at i
		sin := 1 / math.Hypot(1, m.Cot(h0+1))
		x, y := b2*cos, b2*sin
		fj, fk := f[j]-f[i], f[k]-f[i]
		gx := fj / c
		gy := (fk - gx*x) / y
		size := math.Hypot(gx, gy)
		if !(size > 0) || math.IsInf(size, 1) {
			continue // even warmth gives no direction
		}
		gx, gy = -gx/size, -gy/size
		// Twice the area times the gradients of the hats: (-y, x-c), (y, -x), (0, c).
		bj, bk := (gx*y-gy*x)/2, gy*c/2
		b[i] -= bj + bk
		b[j] += bj
		b[k] += bk
	}
	return b
}
