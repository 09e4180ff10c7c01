package mesh_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

// Welding what was torn apart gives back the mesh, numbered by first appearance.
func TestWeldUndoesSoup(t *testing.T) {
	for name, m := range map[string]*mesh.Mesh{
		"sphere": meshtest.ShakenSphere(4, 1),
		"box":    meshtest.Box(1, 2, 3, [3]int{5, 6, 7}, 0.2, 1),
		"coil":   meshtest.Coil(3, 5, 2, 0.5, 300, 12, 0.2, 1),
	} {
		for _, tolerance := range []float64{0, 1e-9} {
			got := meshtest.Soup(m).Weld(tolerance)
			if got.NumVertices() != m.NumVertices() {
				t.Fatalf("%s: %d vertices, want %d", name, got.NumVertices(), m.NumVertices())
			}
			seen := int32(0)
			for h, v := range got.Triangles {
				if v > seen {
					t.Fatalf("%s: corner %d is vertex %d before vertex %d appeared", name, h, v, seen)
				}
				if v == seen {
					seen++
				}
				w := m.Triangles[h]
				if !slices.Equal(got.Positions[3*v:3*v+3], m.Positions[3*w:3*w+3]) {
					t.Fatalf("%s: corner %d moved", name, h)
				}
			}
		}
	}
}

func TestWeldTakesMinusZeroForZero(t *testing.T) {
	zero := math.Copysign(0, -1)
	m := &mesh.Mesh{
		Positions: []float64{0, 0, 0, 1, 0, 0, 0, 1, 0, zero, 0, zero, 1, zero, 0, 0, 0, 1},
		Triangles: []int32{0, 1, 2, 3, 4, 5},
	}
	want := []int32{0, 1, 2, 0, 1, 3}
	if got := m.Weld(0).Triangles; !slices.Equal(got, want) {
		t.Errorf("got %v, want %v", got, want)
	}
}

// Groups must be those of a search through all pairs, followed transitively; clumps,
// rows and two sheets just out of reach are in the points.
func TestWeldNearAgainstAllPairs(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for trial := range 60 {
		n := 1 + rng.IntN(200)
		tolerance := math.Pow(10, -3*rng.Float64())
		positions := make([]float64, 3*n)
		for i := range positions {
			switch trial % 4 {
			case 0:
				positions[i] = rng.Float64()
			case 1:
				positions[i] = float64(rng.IntN(4)) + tolerance*rng.Float64()
			case 2: // a lattice of exactly one tolerance, where rounding decides: both sides use the same formula
				positions[i] = tolerance * float64(rng.IntN(6))
			case 3:
				positions[i] = 1.01 * tolerance * float64(rng.IntN(2)*(i%3/2)) // two sheets
				if i%3 < 2 {
					positions[i] = tolerance * rng.Float64()
				}
			}
		}
		triangles := make([]int32, 0, 3*n)
		for v := range int32(n) {
			triangles = append(triangles, v, v, v)
		}
		group := make([]int32, n) // label by least member, by repeated sweeps
		for v := range group {
			group[v] = int32(v)
		}
		for changed := true; changed; {
			changed = false
			for u := range n {
				for v := range u {
					dx := positions[3*u] - positions[3*v]
					dy := positions[3*u+1] - positions[3*v+1]
					dz := positions[3*u+2] - positions[3*v+2]
					if least := min(group[u], group[v]); dx*dx+dy*dy+dz*dz <= tolerance*tolerance && group[u] != group[v] {
						group[u], group[v], changed = least, least, true
					}
				}
			}
		}
		place, count := map[int32]int32{}, int32(0)
		got := (&mesh.Mesh{Positions: positions, Triangles: triangles}).Weld(tolerance)
		for v := range n {
			if _, ok := place[group[v]]; !ok {
				place[group[v]] = count
				count++
			}
			if got.Triangles[3*v] != place[group[v]] {
				t.Fatalf("trial %d: point %d in group %d, want %d", trial, v, got.Triangles[3*v], place[group[v]])
			}
		}
		if int(count) != got.NumVertices() {
			t.Fatalf("trial %d: %d groups, want %d", trial, got.NumVertices(), count)
		}
	}
}

// A tolerance far above the spacing makes one point of all: that must not cost pairs.
func TestWeldAllToOne(t *testing.T) {
	m := meshtest.Icosphere(6, 0.2, 1)
	if got := m.Weld(0.5).NumVertices(); got != 1 {
		t.Errorf("%d vertices, want 1", got)
	}
}

func BenchmarkWeldExactly(b *testing.B) {
	m := meshtest.Soup(meshtest.Icosphere(8, 0.2, 1)) // 3.9 million corners
	for b.Loop() {
		m.Weld(0)
	}
}

func BenchmarkWeldNear(b *testing.B) {
	m := meshtest.Soup(meshtest.Icosphere(8, 0.2, 1))
	for b.Loop() {
		m.Weld(1e-6)
	}
}
