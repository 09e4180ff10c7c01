package geodesic

import (
	"context"
	"errors"
	"math"

	"heatskin/mesh"
)

// A Line is a shortest line: a polyline over the triangles from source to target.
// Point i lies at Points[3i:3i+3] and S[i] along the line; Triangles[i] holds the
// stretch from point i to the next (at the last point: the stretch before it).
type Line struct {
	Points    []float64
	S         []float64
	Triangles []int32
	Length    float64 // the exact distance; the polyline has it to 1e-9 relative
	Several   bool    // lines that run otherwise are as short, within 1e-9 relative
	From, To  int     // which of the sources and of the targets it joins
}

// Path is a shortest line on m from any of the data in from to any of those in to.
// See Solver.Path.
func Path(ctx context.Context, m *mesh.Mesh, from, to []mesh.Datum) (*Line, error) {
	return NewSolver(m).Path(ctx, from, to, Options{})
}

// Path is a shortest line from any of the data in from to any of those in to; nil if
// no path leads there (within opt.Radius). It runs the wave until the target is
// reached and follows straight lines back, unrolling triangles as it goes; where those
// go astray among triangles without area it runs the wave again and keeps its windows
// to be led by them. Of opt it heeds Radius and MaxBytes. Errors are those of Spread,
// and a *TraceError.
func (s *Solver) Path(ctx context.Context, from, to []mesh.Datum, opt Options) (*Line, error) {
	opt = Options{Targets: to, Any: true, Radius: opt.Radius, MaxBytes: opt.MaxBytes}
	line, err := s.path(ctx, from, opt)
	if astray := (*TraceError)(nil); errors.As(err, &astray) {
		opt.Keep = true
		line, err = s.path(ctx, from, opt)
	}
	return line, err
}

// path is Path, by the straight line or, with opt.Keep, by the windows.
func (s *Solver) path(ctx context.Context, from []mesh.Datum, opt Options) (*Line, error) {
	v, err := s.start(from, opt, true)
	if err != nil {
		return nil, err
	}
	defer s.giveTables(v.tables)
	if err := v.run(ctx); err != nil {
		return nil, err
	}
	best, several := v.choose()
	if math.IsInf(best.distance, 1) || best.distance > v.radius {
		return nil, nil
	}
	t := tracer{wave: v, total: best.distance, several: several}
	t.eps = beside * max(t.total, 1e-6*v.extent)
	follow := t.trace
	if opt.Keep {
		follow = t.descend
	}
	if !follow(&best) {
		return nil, &TraceError{Distance: best.distance}
	}
	line := t.line()
	line.From, line.To = t.source, best.target
	if n := len(line.S); math.Abs(line.S[n-1]-line.Length) > 1e-9*line.Length+1e-15*v.extent {
		return nil, &TraceError{Distance: line.Length, Length: line.S[n-1]}
	}
	return line, nil
}

// An arrival is one way to come to a target.
type arrival struct {
	distance  float64
	target    int
	place     [3]float64
	direction [3]float64 // back along the way

	// How the way runs from the place: to a vertex, through a window, or from a source
	// point in the same triangle.
	vertex   int32 // or -1
	hit      *hit  // or nil
	source   [3]float64
	datum    int32
	triangle int32 // that holds place and vertex or source; -1 if place is the vertex
}

// choose finds the shortest arrival at any target, and whether another is as short.
func (v *wave) choose() (best arrival, several bool) {
	best.distance = math.Inf(1)
	var all []arrival
	keep := func(a arrival) {
		if a.distance < best.distance {
			best = a
		}
		all = append(all, a)
	}
	for i := range v.targets.list {
		t := &v.targets.list[i]
		none := arrival{target: i, vertex: -1, triangle: -1}
		if t.vertex >= 0 {
			a := none
			a.vertex, a.distance, a.place = t.vertex, v.distance[t.vertex], v.position(t.vertex)
			a.direction = v.direction(t.vertex, &v.parents[t.vertex])
			keep(a)
		}
		for _, h := range t.edges {
			for _, end := range [2]int32{v.mesh.Triangles[h], v.mesh.Triangles[following(h)]} {
				a := none
				a.vertex, a.distance, a.place = end, v.distance[end], v.position(end)
				a.direction = v.direction(end, &v.parents[end])
				keep(a)
			}
		}
		for k := range t.hits {
			hit := &t.hits[k]
			a := none
			a.hit, a.distance, a.triangle = hit, hit.distance, hit.h/3
			l := v.lay(hit.h)
			if a.direction = v.backwards(&l, &hit.window, hit.x, hit.y); hit.leaves {
				a.direction = v.lift(&l, hit.window.x-hit.x, hit.window.y) // out of h's own triangle
				if hit.window.flags&parallel != 0 {
					a.direction = v.lift(&l, -hit.window.x, hit.window.y)
				}
			}
			a.place = v.inSpace(&l, hit.x, hit.y)
			keep(a)
		}
		if t.triangle >= 0 {
			p := mesh.Point{Triangle: t.triangle, Weights: t.weights}
			place := v.mesh.Position(p)
			for k := range int32(3) {
				a := none
				a.vertex = v.mesh.Triangles[3*t.triangle+k]
				a.distance = v.distance[a.vertex] + v.toCorner(t.triangle, t.weights, k)
				a.place, a.triangle = place, t.triangle
				a.direction = unit(place, v.position(a.vertex))
				keep(a)
			}
			for _, source := range v.points[t.triangle] {
				a := none
				a.distance = v.apart(t.triangle, t.weights, source.Weights)
				a.place, a.triangle, a.datum = place, t.triangle, source.datum
				a.source = v.mesh.Position(source.Point)
				a.direction = unit(place, a.source)
				keep(a)
			}
		}
	}
	for _, a := range all {
		if a.distance > best.distance*(1+equally) {
			continue
		}
		if !alike(a.direction, best.direction) {
			several = true
		}
		for k := range a.place {
			if math.Abs(a.place[k]-best.place[k]) > 1e-4*best.distance {
				several = true
			}
		}
		// Parallel rays that meet a whole edge head on.
		if a.hit != nil && a.hit.leaves && a.hit.window.flags&parallel != 0 && math.Abs(a.hit.window.x) < equally {
			several = true
		}
	}
	return best, several
}

// inSpace is the point (x, y) of layout l in space.
func (s *Solver) inSpace(l *layout, x, y float64) (p [3]float64) {
	a, b, c := s.position(l.a), s.position(l.b), s.position(l.c)
	wc := 0.0
	if l.y > 0 {
		wc = y / l.y
	}
	wb := (x - wc*l.x) / l.length
	for k := range p {
		p[k] = a[k] + wb*(b[k]-a[k]) + wc*(c[k]-a[k])
	}
	return p
}
