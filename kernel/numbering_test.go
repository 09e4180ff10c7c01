package kernel

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// A Solver's own order of vertices must not show: every public result is by the
// surface's vertices, and the same, but for rounding, as that of a solver which keeps
// the surface's order. The mesh has vertices in random order, two parts, a vertex in no
// triangle, a source inside a face and a datum of edges.
func TestOwnNumberingDoesNotShow(t *testing.T) {
	ctx := context.Background()
	sphere, plate := meshtest.ShakenSphere(2, 5), meshtest.Translate(meshtest.Plate(1, 1, 9, 9, 0.3, 6), [3]float64{5, 0, 0})
	alone := &mesh.Mesh{Positions: []float64{9, 9, 9}}
	m := shuffledVertices(meshtest.Join(sphere, alone, plate), 7)
	stray := slices.Index(m.Positions, 9) / 3
	s, err := mesh.NewSurface(m)
	if err != nil {
		t.Fatal(err)
	}
	var edges [][2]int32
	for h, v := range s.Vert {
		if s.Boundary(int32(h)) {
			edges = append(edges, [2]int32{v, s.Vert[next(int32(h))]})
		}
	}
	data := []mesh.Datum{mesh.AtPoint(mesh.Point{Triangle: 40, Weights: [3]float64{0.2, 0.3, 0.5}}), mesh.AtEdges(edges)}
	if err := s.Place(data); err != nil {
		t.Fatal(err)
	}
	s.Delaunay(1000)

	own, err := NewSolver(ctx, s, Options{})
	if err != nil {
		t.Fatal(err)
	}
	component, count := s.Components()
	plain, err := newSolver(ctx, s, operators{stiffness: s.Laplacian(), lumped: s.LumpedMass(), component: component, count: count}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	moved := 0
	for i, v := range own.outer {
		if int(v) != i {
			moved++
		}
	}
	if moved < len(own.outer)/2 {
		t.Fatalf("only %d of %d vertices have another number: the test would see nothing", moved, len(own.outer))
	}

	n := s.NumVertices
	initial, rate := make([]float64, n), make([]float64, n)
	for v := range n {
		if component[v] >= 0 {
			initial[v] = math.Sin(3 * s.Positions[3*v])
			rate[v] = 0.01 * float64(v%7)
		}
	}
	hold := held(n, 2, []int32{edges[0][0], edges[5][0]})
	pin := int32(3)
	targets := [][]int32{{pin}, {edges[0][0], edges[0][1]}}
	// What each solver says, field by field.
	ask := func(v *Solver) map[string][]float64 {
		got := map[string][]float64{"areas": v.Areas(), "along": v.Along(1), "edge exchange": v.EdgeExchange(1, 0.5, 1).Weight, "face exchange": v.FaceExchange(0.5, 1).Weight}
		for _, stepper := range []Stepper{Krylov, ImplicitEuler} {
			heat, err := v.HeatKernels(ctx, s.Load(data), []float64{0.3, 0.1}, HeatOptions{Stepper: stepper})
			if err != nil {
				t.Fatal(err)
			}
			got[string(stepper)+" late"], got[string(stepper)+" early"] = heat.Fields[0], heat.Fields[1]
			got[string(stepper)+" totals"] = heat.Totals
			pr := &Problem{Initial: initial, Rate: rate, Load: s.Load(data), Hold: hold, Exchanges: []Exchange{v.FaceExchange(0.5, 1), v.EdgeExchange(1, 0.5, -1)}}
			flow, err := v.Diffuse(ctx, pr, []float64{0.2, 0.05}, FlowOptions{Stepper: stepper})
			if err != nil {
				t.Fatal(err)
			}
			got[string(stepper)+" flow late"], got[string(stepper)+" flow early"] = flow.Fields[0], flow.Fields[1]
			b := flow.Balances[0]
			got[string(stepper)+" balance"] = append([]float64{b.Begin, b.Inside, b.Put, b.Held}, b.Lost...)
			if got["steady"], _, err = v.Steady(ctx, pr); err != nil {
				t.Fatal(err)
			}
		}
		passage, err := v.Passage(ctx, targets, 0.5)
		if err != nil {
			t.Fatal(err)
		}
		got["passage"], got["reach 0"], got["reach 1"] = passage.MeanTime, passage.Reach[0], passage.Reach[1]
		modes, err := v.Modes(ctx, 6, []int32{edges[0][0]})
		if err != nil {
			t.Fatal(err)
		}
		got["eigenvalues"] = modes.Values
		for k, x := range modes.Fields {
			got["mode "+string(rune('0'+k))] = x
		}
		for name, which := range map[string][]int{"all": nil, "point": {0}, "edges": {1}} {
			d, err := v.Distance(ctx, which, DistanceOptions{})
			if err != nil {
				t.Fatal(err)
			}
			got["distance "+name] = d.Distance
			smooth, err := v.Distance(ctx, which, DistanceOptions{Smooth: true})
			if err != nil {
				t.Fatal(err)
			}
			got["smooth distance "+name] = smooth.Distance
		}
		return got
	}
	got, again, want := ask(own), ask(own), ask(plain)
	for name, y := range want {
		x := got[name]
		if len(x) != len(y) {
			t.Errorf("%s: %d values, want %d", name, len(x), len(y))
			continue
		}
		size := 0.0
		for _, b := range y {
			if b-b == 0 { // finite
				size = max(size, math.Abs(b))
			}
		}
		for v, b := range y {
			a := x[v]
			if same := a == b || math.IsNaN(a) && math.IsNaN(b); !same && !(math.Abs(a-b) <= numberingTol*size) {
				t.Errorf("%s: %.15g at vertex %d, in the surface's order %.15g", name, a, v, b)
				break
			}
		}
		if !slices.EqualFunc(x, again[name], func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }) {
			t.Errorf("%s: a second call gives other bits", name)
		}
	}

	// Errors name the surface's vertices, too.
	var load *LoadError
	amounts := make([]float64, n)
	amounts[stray] = 1
	if _, err := own.HeatKernels(ctx, amounts, []float64{1}, HeatOptions{}); !errors.As(err, &load) || load.Vertex != stray {
		t.Errorf("heat at a vertex in no triangle: %v, want it named as %d", err, stray)
	}
	var field *FieldError
	broken := slices.Clone(initial)
	broken[pin] = math.Inf(1)
	if _, err := own.Diffuse(ctx, &Problem{Initial: broken}, []float64{1}, FlowOptions{}); !errors.As(err, &field) || field.Vertex != int(pin) {
		t.Errorf("an infinite initial value: %v, want vertex %d named", err, pin)
	}
	var target *TargetError
	if _, err := own.Passage(ctx, [][]int32{{int32(stray)}}, 1); !errors.As(err, &target) || target.Vertex != stray {
		t.Errorf("a target in no triangle: %v, want vertex %d named", err, stray)
	}
}

// numberingTol, relative to a field's largest value, is what two orders of elimination
// and of Krylov vectors may leave: the tolerance of time steps is 1e-8, but both runs
// stop at the same step; modes are good to 1e-9 over the gaps between them.
const numberingTol = 1e-8

// shuffledVertices is m with its vertices and triangles in random order.
func shuffledVertices(m *mesh.Mesh, seed uint64) *mesh.Mesh {
	rng := rand.New(rand.NewPCG(seed, 1))
	number := rng.Perm(m.NumVertices())
	s := &mesh.Mesh{Positions: make([]float64, len(m.Positions))}
	for v, to := range number {
		copy(s.Positions[3*to:3*to+3], m.Positions[3*v:])
	}
	for _, f := range rng.Perm(m.NumTriangles()) {
		for _, v := range m.Triangles[3*f : 3*f+3] {
			s.Triangles = append(s.Triangles, int32(number[v]))
		}
	}
	return s
}
