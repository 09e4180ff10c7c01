package sparse

import (
	"math"
	"math/rand/v2"
	"testing"
)

// sheet is a grid of nu by nv points, shaken by a quarter of a cell, numbered at random, with a diagonal in
// each cell drawn by coin; it may close in either direction, and have holes.
func sheet(nu, nv int, closedU, closedV bool, hole func(i, j int) bool, at func(i, j float64) [3]float64) (coords []float64, edges [][2]int32) {
	rng := rand.New(rand.NewPCG(4, uint64(nu)))
	var points [][2]int
	for i := range nu {
		for j := range nv {
			if hole == nil || !hole(i, j) {
				points = append(points, [2]int{i, j})
			}
		}
	}
	number := make(map[[2]int]int32, len(points))
	for k, v := range rng.Perm(len(points)) {
		number[points[k]] = int32(v)
	}
	coords = make([]float64, 3*len(points))
	join := func(i, j, k, l int) {
		if i >= nu && !closedU || k >= nu && !closedU || j >= nv && !closedV || l >= nv && !closedV {
			return
		}
		a, okA := number[[2]int{i % nu, j % nv}]
		b, okB := number[[2]int{k % nu, l % nv}]
		if okA && okB {
			edges = append(edges, [2]int32{a, b})
		}
	}
	for _, p := range points {
		i, j := p[0], p[1]
		x := at(float64(i)+0.5*rng.Float64()-0.25, float64(j)+0.5*rng.Float64()-0.25)
		copy(coords[3*number[p]:], x[:])
		join(i, j, i+1, j)
		join(i, j, i, j+1)
		if rng.IntN(2) == 0 {
			join(i, j, i+1, j+1)
		} else if i+1 < nu || closedU {
			join(i+1, j, i, j+1)
		}
	}
	return coords, edges
}

// Entries of the factor against METIS 5.1.0 (METIS_NodeND with its default options, Debian 12), counted with this
// package's columnCounts. A tenth more is the most we let the order cost.
func TestFillAgainstMETIS(t *testing.T) {
	circle := func(turns float64) (c, s float64) {
		return math.Cos(2 * math.Pi * turns), math.Sin(2 * math.Pi * turns)
	}
	plane := func(i, j float64) [3]float64 { return [3]float64{i, j, 0} }
	for _, tc := range []struct {
		name  string
		metis int64
		make  func() ([]float64, [][2]int32)
	}{
		{"sphere", 1785158, func() ([]float64, [][2]int32) { return icosphere(6) }},
		{"torus", 514532, func() ([]float64, [][2]int32) {
			return sheet(210, 78, true, true, nil, func(i, j float64) [3]float64 {
				cu, su := circle(i / 210)
				cw, sw := circle(j / 78)
				return [3]float64{(1 + 0.4*cw) * cu, (1 + 0.4*cw) * su, 0.4 * sw}
			})
		}},
		{"coil", 846381, func() ([]float64, [][2]int32) {
			return sheet(800, 40, false, true, nil, func(i, j float64) [3]float64 {
				cu, su := circle(12 * i / 800)
				cw, sw := circle(j / 40)
				return [3]float64{(5 + 0.5*cw) * cu, (5 + 0.5*cw) * su, 1.2*12*i/800 + 0.5*sw}
			})
		}},
		{"plate", 691885, func() ([]float64, [][2]int32) { return sheet(160, 160, false, false, nil, plane) }},
		{"perforated plate", 453427, func() ([]float64, [][2]int32) {
			return sheet(200, 150, false, false, func(i, j int) bool {
				x, y := i%25-12, j%25-12
				return x*x+y*y <= 36
			}, plane)
		}},
		{"fins", 910553, func() ([]float64, [][2]int32) {
			return sheet(40*25, 40, false, false, nil, func(i, j float64) [3]float64 {
				fin := math.Floor(i / 25)
				z := i - 25*fin
				if math.Mod(fin, 2) == 1 {
					z = 25 - z
				}
				return [3]float64{2 * fin, j, z}
			})
		}},
		{"tube", 598387, func() ([]float64, [][2]int32) {
			return sheet(2000, 16, false, true, nil, func(i, j float64) [3]float64 {
				c, s := circle(j / 16)
				return [3]float64{i, 3 * c, 3 * s}
			})
		}},
		{"graded plate", 691885, func() ([]float64, [][2]int32) {
			return sheet(160, 160, false, false, nil, func(i, j float64) [3]float64 { return [3]float64{math.Exp(i / 16), math.Exp(j / 16), 0} })
		}},
		{"roll", 722583, func() ([]float64, [][2]int32) {
			return sheet(800, 40, false, false, nil, func(i, j float64) [3]float64 {
				c, s := circle(8 * i / 800)
				r := 10 + 0.3*8*i/800
				return [3]float64{r * c, r * s, 0.6 * j}
			})
		}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			coords, edges := tc.make()
			p := fromEdges(len(coords)/3, edges, unit, 1).Pattern
			for what, c := range map[string][]float64{"with": coords, "without": nil} {
				st := mustAnalyze(t, p, Options{Coords: c}).Stats()
				t.Logf("%s coordinates: %d entries, %.3f times METIS's %d", what, st.FactorNonzeros, float64(st.FactorNonzeros)/float64(tc.metis), tc.metis)
				if float64(st.FactorNonzeros) > 1.1*float64(tc.metis) {
					t.Errorf("%s coordinates: %d entries, METIS needs %d", what, st.FactorNonzeros, tc.metis)
				}
			}
		})
	}
}
