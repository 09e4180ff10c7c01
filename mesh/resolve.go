package mesh

import (
	"container/heap"
	"fmt"
	"math"
)

// A BudgetError is a refinement that needs more vertices than it may have.
type BudgetError struct {
	MaxEdge float64 // the edge length asked for
	Needed  int     // vertices that it would take, about
	Budget  int
}

func (e *BudgetError) Error() string {
	return fmt.Sprintf("edges of at most %g need about %d more vertices; the budget is %d (allow longer edges)", e.MaxEdge, e.Needed, e.Budget)
}

// Resolve adds vertices until no edge is longer than maxEdge, longest first, each at
// the middle of its edge, and keeps the triangulation Delaunay on the way. Call it
// after Delaunay. The surface and its metric stay what they are. Unlike a refinement
// of the mesh it works on the flipped edges, so slivers that lie in one plane (or
// round a crease) cost nothing: their vertices are joined well before any is added.
// The error is a *BudgetError. O(k log k) for k new vertices.
func (s *Surface) Resolve(maxEdge float64, budget int) error {
	if needed := s.needed(maxEdge); needed > float64(budget) {
		return &BudgetError{MaxEdge: maxEdge, Needed: int(min(needed, math.MaxInt32)), Budget: budget}
	}
	before := s.NumVertices
	var long edgeHeap
	l := s.newLegaliser(math.MaxInt)
	look := func(f int32) {
		for h := 3 * f; h < 3*f+3; h++ {
			if s.Length[h] > maxEdge {
				heap.Push(&long, overlong{s.Length[h], h})
			}
		}
	}
	l.touched = look
	for f := range int32(s.NumFaces()) {
		look(f)
	}
	for len(long) > 0 {
		e := heap.Pop(&long).(overlong)
		if s.Length[e.h] != e.length {
			continue // flipped or split since
		}
		l.split(e.h, e.length/2)
		l.run()
		if s.NumVertices-before > 2*budget {
			return &BudgetError{MaxEdge: maxEdge, Needed: s.NumVertices - before, Budget: budget}
		}
	}
	return nil
}

// needed is about how many vertices Resolve will add: as many as a mesh of equal
// triangles has in the faces that are too large, and those on long edges of slivers.
func (s *Surface) needed(maxEdge float64) float64 {
	sum := 0.0
	for f := range int32(s.NumFaces()) {
		longest := s.Length[s.longest(f)]
		if longest > maxEdge {
			sum += max(s.Area(f)/(maxEdge*maxEdge), (longest/maxEdge-1)/4)
		}
	}
	return sum
}

// ResolutionFor is the edge length that gives a surface of this area about as many
// vertices as it has, or least if it has fewer: longer edges stand out. A curved skin
// of enough vertices is not asked for more than it has: new ones would lie on its flat
// triangles and not on the skin, and distances on it are better as it is.
func (s *Surface) ResolutionFor(least int) float64 {
	area, used := 0.0, 0
	for f := range int32(s.NumFaces()) {
		area += s.Area(f)
	}
	for _, none := range s.NoValue {
		if !none {
			used++
		}
	}
	const enough = 2000 // below, the front is coarser than the chords
	if used >= enough && s.curved() {
		least = 0
	}
	// Equal triangles with edge L: area/n = L²·√3/2. Even meshes of a scan have edges
	// of up to twice the mean.
	return 2.3 * math.Sqrt(area/float64(max(used, least)))
}

// curved tells whether most vertices sample a smooth curved skin: the angle defect is
// neither nothing, as on flat faces, nor so much that a geodesic would turn by more than
// mostTurn radians over the longest edge there, as at the corners of a part.
func (s *Surface) curved() bool {
	const leastDefect, mostTurn = 1e-6, 0.3
	angle, longest := make([]float64, s.NumVertices), make([]float64, s.NumVertices)
	rim := make([]bool, s.NumVertices)
	for h, v := range s.Vert {
		angle[v] += s.Angle(int32(h))
		l := s.Length[h]
		longest[v], longest[s.head(int32(h))] = max(longest[v], l), max(longest[s.head(int32(h))], l)
		if s.Boundary(int32(h)) {
			rim[v], rim[s.head(int32(h))] = true, true
		}
	}
	inner, skin := 0, 0
	for v, area := range s.LumpedMass() {
		if area == 0 || rim[v] {
			continue
		}
		inner++
		defect := math.Abs(2*math.Pi - angle[v])
		if defect > leastDefect && defect*longest[v]*longest[v] < mostTurn*area {
			skin++
		}
	}
	return 2*skin > inner
}

type overlong struct {
	length float64
	h      int32
}

// edgeHeap is a heap, longest first, equal ones by number.
type edgeHeap []overlong

func (q edgeHeap) Len() int { return len(q) }
func (q edgeHeap) Less(i, j int) bool {
	return q[i].length > q[j].length || q[i].length == q[j].length && q[i].h < q[j].h
}
func (q edgeHeap) Swap(i, j int) { q[i], q[j] = q[j], q[i] }
func (q *edgeHeap) Push(x any)   { *q = append(*q, x.(overlong)) }
func (q *edgeHeap) Pop() any {
	last := len(*q) - 1
	e := (*q)[last]
	*q = (*q)[:last]
	return e
}
