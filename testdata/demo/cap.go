//go:build ignore

// Cap draws the part of `make demo`: the skin of a ribbed insulator cap for a cable
// bushing, with three sheds and a flange with six bolt holes, in millimetres. It is
// ours, drawn for this purpose. The faces are cut as a CAD export would cut them:
// coarse arcs, long thin strips on cones, and a flange face without a single inner
// point. Run it here, in testdata/demo:
//
//	go run cap.go
//
// It writes cap.stl, and probes.csv with places on the skin whose distance from the
// conductor's rim is known without any mesh: the length of the drawn profile.
package main

import (
	"bufio"
	"encoding/binary"
	"fmt"
	"log"
	"math"
	"os"
)

const (
	around      = 40 // faces around the axis
	aroundBolt  = 16
	bolts       = 6
	boltRadius  = 3.5
	boltCircle  = 46.0
	flangeInner = 24.0 // where the flange's flat face begins
	flangeOuter = 55.0
	flangeTop   = 6.0
)

// A place is a point of the profile: distance from the axis, height, and how far
// along the profile it lies from the conductor's rim.
type place struct{ r, z, s float64 }

// A profile is drawn from the conductor's rim downwards.
type profile []place

func (p *profile) line(r, z float64) {
	s := 0.0
	if n := len(*p); n > 0 {
		last := (*p)[n-1]
		step := math.Hypot(r-last.r, z-last.z)
		if step < 1e-9 {
			return
		}
		s = last.s + step
	}
	*p = append(*p, place{r, z, s})
}

// arc goes around (r, z) from one angle to another, in degrees from the outward
// direction, in chords.
func (p *profile) arc(r, z, radius, from, to float64, chords int) {
	for i := range chords + 1 {
		a := (from + (to-from)*float64(i)/float64(chords)) * math.Pi / 180
		p.line(r+radius*math.Cos(a), z+radius*math.Sin(a))
	}
}

// shed goes out along a sloping cone, round a lip, and back to the neck.
func (p *profile) shed(neck, reach, top float64) {
	const slope, under, lip = 22, 2.5, 1.8 // degrees, degrees, millimetres
	drop := (reach - neck) * math.Tan(slope*math.Pi/180)
	p.arc(neck+3, top, 3, 180, 270-slope, 3) // a hollow fillet off the neck
	p.arc(reach-lip, top-drop-lip-2, lip, 90-slope, -90-under, 6)
	p.line(neck, top-drop-2*lip-2-(reach-neck)*math.Tan(under*math.Pi/180))
}

type vector [3]float64

func ring(p place, i int) vector {
	a := 2 * math.Pi * float64(i%around) / around
	return vector{p.r * math.Cos(a), p.r * math.Sin(a), p.z}
}

func main() {
	var p profile
	p.line(9, 76)
	p.line(15, 76)
	p.arc(15, 73, 3, 90, 0, 4)
	var probes []string
	probe := func(id string, x vector, s float64) {
		probes = append(probes, fmt.Sprintf("%s,%.4f,%.4f,%.4f,%.3f", id, x[0], x[1], x[2], s))
	}
	for i, reach := range []float64{40, 33, 40} {
		start := len(p)
		p.shed(18, reach, 66-19*float64(i))
		tip := p[start]
		for _, q := range p[start:] {
			if q.r > tip.r {
				tip = q
			}
		}
		probe(fmt.Sprintf("shed-%d-tip", i+1), ring(tip, 5*i), tip.s)
		probe(fmt.Sprintf("shed-%d-foot", i+1), ring(p[len(p)-1], 5*i), p[len(p)-1].s)
	}
	p.arc(flangeInner, flangeTop+6, 6, 180, 270, 4)

	var triangles [][3]vector
	for k := range len(p) - 1 {
		for i := range around {
			a, b, c, d := ring(p[k], i), ring(p[k+1], i), ring(p[k+1], i+1), ring(p[k], i+1)
			triangles = append(triangles, [3]vector{a, b, c}, [3]vector{a, c, d})
		}
	}

	inner := p[len(p)-1]
	outer := place{flangeOuter, flangeTop, inner.s + flangeOuter - inner.r}
	foot := place{flangeOuter, 0, outer.s + flangeTop}
	triangles = append(triangles, flange(inner, outer)...)
	for i := range around {
		a, b, c, d := ring(outer, i), ring(foot, i), ring(foot, i+1), ring(outer, i+1)
		triangles = append(triangles, [3]vector{a, b, c}, [3]vector{a, c, d})
	}
	near := boltCircle - boltRadius
	probe("bolt-1-near-side", vector{near, 0, flangeTop}, inner.s+near-inner.r)
	probe("flange-edge", ring(outer, 10), outer.s) // a quarter turn on: midway between two bolts
	probe("flange-foot", ring(foot, 10), foot.s)

	save("cap.stl", func(w *bufio.Writer) { writeSTL(w, triangles) })
	save("probes.csv", func(w *bufio.Writer) {
		fmt.Fprintln(w, "id,x,y,z,profile")
		for _, row := range probes {
			fmt.Fprintln(w, row)
		}
	})
}

// flange cuts the flat face with its holes into triangles between corners that are
// there anyway: holes are joined to the rim by bridges, then ears are cut off.
func flange(inner, outer place) [][3]vector {
	var rim []vector
	for i := range around {
		rim = append(rim, ring(outer, i))
	}
	holes := [][]vector{nil}
	for i := range around {
		holes[0] = append(holes[0], ring(inner, around-i)) // clockwise, as holes are
	}
	for b := range bolts {
		turn := 2 * math.Pi * float64(b) / bolts
		var hole []vector
		for i := range aroundBolt {
			a := turn - 2*math.Pi*float64(i)/aroundBolt
			hole = append(hole, vector{
				boltCircle*math.Cos(turn) + boltRadius*math.Cos(a),
				boltCircle*math.Sin(turn) + boltRadius*math.Sin(a), flangeTop})
		}
		holes = append(holes, hole)
	}
	for len(holes) > 0 {
		rim, holes = bridge(rim, holes)
	}
	return ears(rim)
}

func turn(a, b, c vector) float64 { return (b[0]-a[0])*(c[1]-a[1]) - (b[1]-a[1])*(c[0]-a[0]) }

// bridge joins the hole that has the shortest clear bridge to the polygon.
func bridge(polygon []vector, holes [][]vector) ([]vector, [][]vector) {
	best, at, with, from := math.Inf(1), 0, 0, 0
	for h, hole := range holes {
		for i, x := range hole {
			for k, y := range polygon {
				if d := math.Hypot(x[0]-y[0], x[1]-y[1]); d < best && clear(x, y, polygon, holes) {
					best, at, with, from = d, k, h, i
				}
			}
		}
	}
	joined := append([]vector{}, polygon[:at+1]...)
	joined = append(joined, holes[with][from:]...)
	joined = append(joined, holes[with][:from+1]...)
	joined = append(joined, polygon[at:]...)
	return joined, append(append([][]vector{}, holes[:with]...), holes[with+1:]...)
}

// clear tells whether the line from x to y crosses no edge.
func clear(x, y vector, polygon []vector, holes [][]vector) bool {
	for _, loop := range append([][]vector{polygon}, holes...) {
		for i, a := range loop {
			b := loop[(i+1)%len(loop)]
			if turn(x, y, a)*turn(x, y, b) < 0 && turn(a, b, x)*turn(a, b, y) < 0 {
				return false
			}
		}
	}
	return true
}

// ears cuts triangles off a counterclockwise polygon, the widest-cornered first.
func ears(polygon []vector) (cut [][3]vector) {
	for len(polygon) > 3 {
		best, ear := 0.0, -1
		n := len(polygon)
		for i := range polygon {
			a, b, c := polygon[(i+n-1)%n], polygon[i], polygon[(i+1)%n]
			long := math.Hypot(c[0]-a[0], c[1]-a[1])
			if t := turn(a, b, c) / (1 + long*long); t > best && empty(a, b, c, polygon) {
				best, ear = t, i
			}
		}
		if ear < 0 {
			log.Fatal("the flange's outline has no ear left")
		}
		cut = append(cut, [3]vector{polygon[(ear+n-1)%n], polygon[ear], polygon[(ear+1)%n]})
		polygon = append(append([]vector{}, polygon[:ear]...), polygon[ear+1:]...)
	}
	return append(cut, [3]vector{polygon[0], polygon[1], polygon[2]})
}

// empty tells whether no other corner lies in the triangle or on its rim.
func empty(a, b, c vector, polygon []vector) bool {
	for _, x := range polygon {
		if x != a && x != b && x != c && turn(a, b, x) >= 0 && turn(b, c, x) >= 0 && turn(c, a, x) >= 0 {
			return false
		}
	}
	return true
}

func save(name string, write func(*bufio.Writer)) {
	f, err := os.Create(name)
	if err != nil {
		log.Fatal(err)
	}
	w := bufio.NewWriter(f)
	write(w)
	if err := w.Flush(); err != nil {
		log.Fatal(err)
	}
	if err := f.Close(); err != nil {
		log.Fatal(err)
	}
}

// writeSTL writes binary STL: a header of 80 bytes, the count, and for each triangle
// its normal, its corners and two bytes of nothing.
func writeSTL(w *bufio.Writer, triangles [][3]vector) {
	header := make([]byte, 80)
	copy(header, "ribbed insulator cap, skin only, millimetres")
	w.Write(header)
	binary.Write(w, binary.LittleEndian, uint32(len(triangles)))
	for _, t := range triangles {
		var u, v, normal vector
		for k := range u {
			u[k], v[k] = t[1][k]-t[0][k], t[2][k]-t[0][k]
		}
		normal = vector{u[1]*v[2] - u[2]*v[1], u[2]*v[0] - u[0]*v[2], u[0]*v[1] - u[1]*v[0]}
		size := math.Sqrt(normal[0]*normal[0] + normal[1]*normal[1] + normal[2]*normal[2])
		for k := range normal {
			normal[k] /= size
		}
		for _, x := range append([]vector{normal}, t[:]...) {
			binary.Write(w, binary.LittleEndian, [3]float32{float32(x[0]), float32(x[1]), float32(x[2])})
		}
		binary.Write(w, binary.LittleEndian, uint16(0))
	}
}
