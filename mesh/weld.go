package mesh

import (
	"math"
	"math/bits"
	"math/rand/v2"
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
// sets number[i] to the place that point i got there. dst may be x[:0]. It is a hash
// table with open addressing; the hash is salted, so that no file can be made to
// collide in it, and the result does not depend on the salt.
func weldExactly(number []int32, x, dst []float64) []float64 {
	// A slot holds the upper half of a hash and, below it, a place in dst plus 1.
	// The slot's number is made of the hash's first bits: a larger table is filled
	// without reading the points again.
	size := bits.Len(uint(max(len(number)/2, 512)))
	table := make([]uint64, 1<<size)
	room := len(table) / 8 * 5
	salt := [3]uint64{rand.Uint64() | 1, rand.Uint64() | 1, rand.Uint64() | 1}
	count := 0
	for i := range number {
		p := (*[3]float64)(x[3*i:])
		a, b, c := p[0]+0, p[1]+0, p[2]+0 // -0 becomes 0
		hi, lo := bits.Mul64(math.Float64bits(a)^salt[0], math.Float64bits(b)^salt[1])
		hi, lo = bits.Mul64(hi^lo^math.Float64bits(c), salt[2])
		hash := (hi ^ lo) >> 32
		for slot := hash >> (32 - size); ; slot = (slot + 1) & uint64(len(table)-1) {
			entry := table[slot]
			if entry == 0 {
				table[slot] = hash<<32 | uint64(count+1)
				dst = append(dst, a, b, c)
				number[i] = int32(count)
				count++
				break
			}
			if entry>>32 == hash {
				j := int(uint32(entry)) - 1
				if q := (*[3]float64)(dst[3*j:]); q[0] == a && q[1] == b && q[2] == c {
					number[i] = int32(j)
					break
				}
			}
		}
		if count > room {
			size++
			grown := make([]uint64, 1<<size)
			for _, entry := range table {
				if entry != 0 {
					slot := entry >> 32 >> (32 - size)
					for grown[slot] != 0 {
						slot = (slot + 1) & uint64(len(grown)-1)
					}
					grown[slot] = entry
				}
			}
			table, room = grown, len(grown)/8*5
		}
	}
	return dst
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
