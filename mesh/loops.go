package mesh

import (
	"cmp"
	"slices"
)

// A Loop is a closed line of boundary edges: each vertex is joined to the next and
// the last to the first. Where faces meet three or more at an edge, the boundary may
// end there: such a chain is Open, and its last vertex is not joined to its first.
type Loop struct {
	Vertices []int32
	Length   float64
	Open     bool
}

// Edges are the loop's edges by their end vertices, as AtEdges takes them.
func (l Loop) Edges() [][2]int32 {
	edges := make([][2]int32, 0, len(l.Vertices))
	for i := range len(l.Vertices) - 1 {
		edges = append(edges, [2]int32{l.Vertices[i], l.Vertices[i+1]})
	}
	if n := len(l.Vertices); !l.Open && n > 0 {
		edges = append(edges, [2]int32{l.Vertices[n-1], l.Vertices[0]})
	}
	return edges
}

// loopTie is how much, relative to the longer, two loops' lengths may differ and
// still count as equal: rounding to single precision (2^-24 for each coordinate)
// must not decide which rim of a tube is loop 0.
const loopTie = 1e-6

// BoundaryLoops finds the lines of edges that have one face only, longest first;
// lengths equal to one part in a million go by smallest vertex. A loop begins at its
// smallest vertex and runs as that vertex's face does. No loop passes a vertex
// twice: where the boundary touches itself it is cut there into simple loops. O(n).
func BoundaryLoops(m *Mesh) []Loop { return boundaryLoops(m, glue(m.Triangles, m.NumVertices())) }

func boundaryLoops(m *Mesh, glued []int32) []Loop {
	// The boundary as a graph: each edge twice, under both its ends.
	t := m.Triangles
	boundary := func(h int32) bool { // glue leaves collapsed triangles alone, too
		a, b, c := t[h], t[next(h)], t[prev(h)]
		return glued[h] == h && a != b && b != c && c != a
	}
	n := m.NumVertices()
	start := make([]int32, n+1)
	for h := range int32(len(t)) {
		if boundary(h) {
			start[t[h]+1]++
			start[t[next(h)]+1]++
		}
	}
	for v := range n {
		start[v+1] += start[v]
	}
	ends := make([]int32, start[n]) // halfedges around each vertex, outgoing and incoming
	fill := slices.Clone(start[:n])
	for h := range int32(len(t)) {
		if boundary(h) {
			for _, v := range []int32{t[h], t[next(h)]} {
				ends[fill[v]] = h
				fill[v]++
			}
		}
	}
	copy(fill, start[:n]) // from here on: the first of a vertex's edges not yet walked

	w := walker{m: m, used: make([]bool, len(t)), at: make([]int32, n)}
	pick := func(v int32) (h int32, ok bool) {
		for ; fill[v] < start[v+1]; fill[v]++ {
			if h := ends[fill[v]]; !w.used[h] {
				return h, true
			}
		}
		return 0, false
	}
	odd := func(v int32) bool { return (start[v+1]-start[v])%2 == 1 }
	for _, fromOdd := range []bool{true, false} {
		for v := range int32(n) {
			for start[v] < start[v+1] && odd(v) == fromOdd {
				h, ok := pick(v)
				if !ok {
					break
				}
				// Every vertex but odd ones has a way out for each way in.
				w.begin(v)
				for u := v; ; {
					u = w.step(u, h)
					if h, ok = pick(u); !ok || odd(u) {
						break
					}
				}
				w.finish()
			}
		}
	}
	sortLoops(w.loops)
	return w.loops
}

// walker follows boundary edges; whenever it meets a vertex of its path again it
// cuts the loop off.
type walker struct {
	m     *Mesh
	used  []bool
	at    []int32 // by vertex: its place on the path plus 1, or 0
	path  []int32 // vertices
	taken []int32 // halfedges between them
	loops []Loop
}

func (w *walker) begin(v int32) {
	w.path = append(w.path[:0], v)
	w.taken = w.taken[:0]
	w.at[v] = 1
}

// step goes from u along h and returns the other end.
func (w *walker) step(u, h int32) int32 {
	v := w.m.Triangles[h]
	if v == u {
		v = w.m.Triangles[next(h)]
	}
	w.used[h] = true
	w.taken = append(w.taken, h)
	if i := w.at[v] - 1; i >= 0 {
		w.emit(w.path[i:], w.taken[i:], false)
		for _, x := range w.path[i+1:] {
			w.at[x] = 0
		}
		w.path, w.taken = w.path[:i+1], w.taken[:i]
		return v
	}
	w.path = append(w.path, v)
	w.at[v] = int32(len(w.path))
	return v
}

// finish takes what is left on the path, a chain between odd vertices.
func (w *walker) finish() {
	if len(w.taken) > 0 {
		w.emit(w.path, w.taken, true)
	}
	for _, x := range w.path {
		w.at[x] = 0
	}
}

// emit keeps a copy of the loop, begun at its smallest vertex and turned the way the
// boundary edge before or after it runs in its face.
func (w *walker) emit(path, taken []int32, open bool) {
	vertices := slices.Clone(path)
	least := 0
	for i, v := range vertices {
		if v < vertices[least] {
			least = i
		}
	}
	t := w.m.Triangles
	switch {
	case open:
		if vertices[0] > vertices[len(vertices)-1] {
			slices.Reverse(vertices)
		}
	case t[taken[least]] == vertices[least]: // edge i leaves vertex i
		vertices = append(vertices[least:], vertices[:least]...)
	default:
		slices.Reverse(vertices)
		least = len(vertices) - 1 - least
		vertices = append(vertices[least:], vertices[:least]...)
	}
	l := Loop{Vertices: vertices, Open: open}
	for _, e := range l.Edges() {
		l.Length += dist(w.m.Positions, e[0], e[1])
	}
	w.loops = append(w.loops, l)
}

func sortLoops(loops []Loop) {
	slices.SortFunc(loops, func(a, b Loop) int {
		return cmp.Or(cmp.Compare(b.Length, a.Length), cmp.Compare(a.Vertices[0], b.Vertices[0]), slices.Compare(a.Vertices, b.Vertices))
	})
	for i := 0; i < len(loops); {
		j := i + 1
		for j < len(loops) && loops[j].Length >= loops[i].Length*(1-loopTie) {
			j++
		}
		slices.SortFunc(loops[i:j], func(a, b Loop) int {
			return cmp.Or(cmp.Compare(a.Vertices[0], b.Vertices[0]), slices.Compare(a.Vertices, b.Vertices))
		})
		i = j
	}
}
