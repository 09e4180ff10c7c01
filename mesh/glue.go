package mesh

import (
	"runtime"
	"slices"

	"heatskin/internal/parallel"
)

// glueTogether is how many halfedges are glued by one goroutine: below it, starting a
// second costs more than it saves.
const glueTogether = 1 << 15

// glue links the halfedges of a triangle list edge by edge. Halfedge h = 3f+k runs
// from corner k of triangle f to the next corner; next[h] is the halfedge that
// follows h around its edge: h itself on a boundary, the opposite halfedge where two
// triangles meet, a cycle in order of number where more do. Triangles with a
// repeated corner are left out: their halfedges stay alone. O(n+m), and O(k log k) for
// a vertex of k faces.
func glue(triangles []int32, numVertices int) (next []int32) {
	next = make([]int32, len(triangles))
	parts := 1
	if len(triangles) > glueTogether {
		parts = runtime.GOMAXPROCS(0)
	}
	parallel.EachPart(parts, func(part int) {
		lo, hi := numVertices*part/parts, numVertices*(part+1)/parts
		glueRange(next, triangles, int32(lo), int32(hi))
	})
	return next
}

// glueRange links the edges whose smaller end is from lo to hi-1. It looks at all
// triangles, which is little beside sorting those that are its own.
func glueRange(next, triangles []int32, lo, hi int32) {
	// Halfedges by their smaller end (a counting sort), then by the larger one.
	start := make([]int32, hi-lo+2)
	mine := func(a int32) bool { return a >= lo && a < hi }
	for f := 0; f < len(triangles); f += 3 {
		a, b, c := triangles[f], triangles[f+1], triangles[f+2]
		if a == b || b == c || c == a {
			continue
		}
		for _, low := range [3]int32{min(a, b), min(b, c), min(c, a)} {
			if mine(low) {
				start[low-lo+2]++
			}
		}
	}
	for i := 2; i < len(start); i++ {
		start[i] += start[i-1]
	}
	bucket := make([]uint64, start[len(start)-1]) // larger end << 32 | halfedge
	for f := 0; f < len(triangles); f += 3 {
		a, b, c := triangles[f], triangles[f+1], triangles[f+2]
		repeated := a == b || b == c || c == a
		for k, e := range [3][2]int32{{a, b}, {b, c}, {c, a}} {
			low := min(e[0], e[1])
			switch {
			case !mine(low):
			case repeated:
				next[f+k] = int32(f + k)
			default:
				at := &start[low-lo+1] // afterwards the end of low's bucket
				bucket[*at] = uint64(max(e[0], e[1]))<<32 | uint64(f+k)
				*at++
			}
		}
	}
	for v := range hi - lo {
		edges := bucket[start[v]:start[v+1]]
		sortShort(edges)
		for i := 0; i < len(edges); {
			j := i + 1
			for j < len(edges) && edges[j]>>32 == edges[i]>>32 {
				next[uint32(edges[j-1])] = int32(uint32(edges[j]))
				j++
			}
			next[uint32(edges[j-1])] = int32(uint32(edges[i]))
			i = j
		}
	}
}

// sortShort sorts what is short as a rule: a dozen keys.
func sortShort(keys []uint64) {
	if len(keys) > 32 {
		slices.Sort(keys)
		return
	}
	for i := 1; i < len(keys); i++ {
		key := keys[i]
		j := i
		for ; j > 0 && keys[j-1] > key; j-- {
			keys[j] = keys[j-1]
		}
		keys[j] = key
	}
}
