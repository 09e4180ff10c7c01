package mesh

import (
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

// ResolutionFor is the edge length that gives a surface of this area about as many
// vertices as it has, or least if it has fewer: longer edges stand out.
func (s *Surface) ResolutionFor(least int) float64 {
	area := 0.0
	for f := range int32(s.NumFaces()) {
		area += s.Area(f)
	}
	// Equal triangles with edge L: area/n = L²·√3/2. Even meshes of a scan have edges
	// of up to twice the mean.
	return 2.3 * math.Sqrt(area/float64(max(s.used(), least)))
}

// used is the number of vertices in triangles of positive area.
func (s *Surface) used() (count int) {
	for _, none := range s.NoValue {
		if !none {
			count++
		}
	}
	return count
}

// Curved tells whether most inner vertices sample a smooth curved skin: the angle defect is
// neither nothing, as on flat faces, nor so much that a geodesic would turn by more than
// mostTurn radians over the longest edge there, as at the corners of a part.
func (s *Surface) Curved() bool {
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
