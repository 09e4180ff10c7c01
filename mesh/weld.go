package mesh

import (
	"math"
	"math/bits"
	"math/rand/v2"

	"heatskin/internal/parallel"
)

// Weld is m with vertices joined that lie within tolerance of each other: 0 joins
// those of exactly equal coordinates (-0 equals 0). Joining is transitive, so a row of
// near vertices becomes one. A joined vertex has the position of its first member,
// and numbers follow the order of those firsts. Triangles keep their numbers, also
// those that lose a corner to it. O(n) for tolerance 0, O(n log n) else. It panics
// if tolerance is negative or not finite.
func (m *Mesh) Weld(tolerance float64) *Mesh {
	if !(tolerance >= 0 && tolerance <= math.MaxFloat64) {
		panic("mesh: Weld: the tolerance must be finite and not negative")
	}
	number := make([]int32, m.NumVertices())
	positions := weldExactly(number, m.Positions, nil)
	if tolerance > 0 {
		positions = weldNear(number, positions, tolerance)
	}
	triangles := make([]int32, len(m.Triangles))
	for h, v := range m.Triangles {
		triangles[h] = number[v]
	}
	return &Mesh{Positions: positions, Triangles: triangles, File: m.File}
}

// weldExactly appends the distinct points of x to dst, in order of appearance, and
// sets number[i] to the place that point i got there. dst may be x[:0].
func weldExactly(number []int32, x, dst []float64) []float64 {
	firstOfEach(number, x)
	count := int32(0)
	for i, first := range number {
		if int(first) < i {
			number[i] = number[first]
			continue
		}
		p := pointAt(x, i)
		dst = append(dst, p[0], p[1], p[2])
		number[i] = count
		count++
	}
	return dst
}

// firstOfEach sets first[i] to the first point of x that is equal to point i. Points
// are dealt out by a hash, and each of the heaps has a small table of its own: many
// goroutines can work, and each finds its table in the cache. The hash is salted, so
// that no file can be made to collide in it; the result does not depend on the salt.
func firstOfEach(first []int32, x []float64) {
	salt := [3]uint64{rand.Uint64() | 1, rand.Uint64() | 1, rand.Uint64() | 1}
	items := make([]uint64, len(first)) // hash << 32 | point
	start := distribute(items, 64-digitBits, func(i int) uint64 {
		p := pointAt(x, i)
		hi, lo := bits.Mul64(math.Float64bits(p[0])^salt[0], math.Float64bits(p[1])^salt[1])
		hi, lo = bits.Mul64(hi^lo^math.Float64bits(p[2]), salt[2])
		return (hi^lo)>>32<<32 | uint64(i)
	})
	const together = 16 // heaps that one goroutine takes, so that it makes its table once
	parallel.EachPart(digits/together, func(part int) {
		var table []uint32 // by the hash's last bits: a number in points, plus 1
		var points [][3]float64
		var firsts []int32
		for heap := part * together; heap < (part+1)*together; heap++ {
			mine := items[start[heap]:start[heap+1]]
			if size := 2 << bits.Len(uint(len(mine))); size > len(table) {
				table = make([]uint32, size)
			}
			clear(table)
			points, firsts = points[:0], firsts[:0]
			for _, item := range mine {
				i := int32(uint32(item))
				p := pointAt(x, int(i))
				slot := item >> 32 & uint64(len(table)-1)
				for table[slot] != 0 && points[table[slot]-1] != p {
					slot = (slot + 1) & uint64(len(table)-1)
				}
				if table[slot] == 0 {
					points, firsts = append(points, p), append(firsts, i)
					table[slot] = uint32(len(points))
				}
				first[i] = firsts[table[slot]-1]
			}
		}
	})
}

// pointAt is point i of x, with 0 for -0.
func pointAt(x []float64, i int) [3]float64 {
	p := (*[3]float64)(x[3*i:])
	return [3]float64{p[0] + 0, p[1] + 0, p[2] + 0}
}

// weldNear joins the points of x within tolerance of each other, puts the first of
// each group at the front of x and returns them; number, which names points of x,
// is brought up to date.
func weldNear(number []int32, x []float64, tolerance float64) []float64 {
	root := joinNear(x, tolerance)
	place := root // place[i] for roots, from where all others follow
	count := int32(0)
	for i := range root {
		if r := root[i]; r == int32(i) {
			copy(x[3*count:3*count+3], x[3*i:3*i+3])
			place[i] = count
			count++
		} else {
			place[i] = place[r] // r < i: already a place
		}
	}
	for i, v := range number {
		number[i] = place[v]
	}
	return x[:3*count]
}

// joinNear gives for each point the least number in its group, the groups being what
// steps of at most tolerance reach. Two branches of a tree of boxes are joined as a
// whole where their boxes allow nothing else, and passed over where they are one
// already: points that all fall together cost no more than others. O(n log n).
func joinNear(x []float64, tolerance float64) (root []int32) {
	n := len(x) / 3
	tree := newBoxTree(n, func(i int32) (lo, hi [3]float64) {
		p := [3]float64(x[3*i : 3*i+3])
		return p, p
	})
	sets := newDisjoint(n)
	limit := tolerance * tolerance
	one := make([]bool, len(tree.boxes)/6) // by node: all its points are one group
	var join func(a, fromA, toA, b, fromB, toB int)
	whole := func(node, from, to int) {
		if !one[node] {
			one[node] = true
			for _, v := range tree.items[from:to] {
				sets.union(tree.items[from], v)
			}
		}
	}
	join = func(a, fromA, toA, b, fromB, toB int) {
		if a == b && one[a] || one[a] && one[b] && sets.find(tree.items[fromA]) == sets.find(tree.items[fromB]) {
			return
		}
		least, greatest := tree.between(a, b)
		switch {
		case least > limit:
			return
		case greatest <= limit:
			whole(a, fromA, toA)
			whole(b, fromB, toB)
			sets.union(tree.items[fromA], tree.items[fromB])
			return
		}
		leafA, leafB := toA-fromA <= leafItems, toB-fromB <= leafItems
		midA, midB := (fromA+toA)/2, (fromB+toB)/2
		switch {
		case leafA && leafB:
			for _, u := range tree.items[fromA:toA] {
				for _, v := range tree.items[fromB:toB] {
					dx, dy, dz := x[3*u]-x[3*v], x[3*u+1]-x[3*v+1], x[3*u+2]-x[3*v+2]
					if dx*dx+dy*dy+dz*dz <= limit {
						sets.union(u, v)
					}
				}
			}
		case a == b:
			join(2*a+1, fromA, midA, 2*a+1, fromA, midA)
			join(2*a+2, midA, toA, 2*a+2, midA, toA)
			join(2*a+1, fromA, midA, 2*a+2, midA, toA)
			one[a] = one[2*a+1] && one[2*a+2] && sets.find(tree.items[fromA]) == sets.find(tree.items[midA])
		case leafB || !leafA && toA-fromA >= toB-fromB:
			join(2*a+1, fromA, midA, b, fromB, toB)
			join(2*a+2, midA, toA, b, fromB, toB)
		default:
			join(a, fromA, toA, 2*b+1, fromB, midB)
			join(a, fromA, toA, 2*b+2, midB, toB)
		}
	}
	if n > 0 {
		join(0, 0, n, 0, 0, n)
	}
	for i := range sets {
		sets.find(int32(i))
	}
	return sets
}
