package mesh

// glue links the halfedges of a triangle list edge by edge. Halfedge h = 3f+k runs
// from corner k of triangle f to the next corner; next[h] is the halfedge that
// follows h around its edge: h itself on a boundary, the opposite halfedge where two
// triangles meet, a cycle in order of number where more do. Triangles with a
// repeated corner are left out: their halfedges stay alone. O(n+m).
func glue(triangles []int32, numVertices int) (next []int32) {
	next = make([]int32, len(triangles))
	// Bucket halfedges by their smaller end (a counting sort), then match the larger
	// ends inside each bucket, which is short on any sensible mesh; a hub of many
	// edges is matched through a table of last-seen halfedges.
	start := make([]int32, numVertices+1)
	ends := func(h int) (lo, hi int32) {
		a, b := triangles[h], triangles[h-h%3+(h+1)%3]
		return min(a, b), max(a, b)
	}
	repeated := func(f int) bool {
		a, b, c := triangles[3*f], triangles[3*f+1], triangles[3*f+2]
		return a == b || b == c || c == a
	}
	for f := range len(triangles) / 3 {
		if !repeated(f) {
			for h := 3 * f; h < 3*f+3; h++ {
				lo, _ := ends(h)
				start[lo+1]++
			}
		}
	}
	for v := range numVertices {
		start[v+1] += start[v]
	}
	bucket := make([]int32, start[numVertices])
	fill := append([]int32(nil), start[:numVertices]...)
	for h := range triangles {
		next[h] = int32(h)
		if !repeated(h / 3) {
			lo, _ := ends(h)
			bucket[fill[lo]] = int32(h)
			fill[lo]++
		}
	}
	last := make([]int32, numVertices) // last halfedge seen with this larger end, plus 1
	for v := range numVertices {
		for _, h := range bucket[start[v]:start[v+1]] {
			_, hi := ends(int(h))
			if p := last[hi] - 1; p >= 0 {
				next[h], next[p] = next[p], h
			}
			last[hi] = h + 1
		}
		for _, h := range bucket[start[v]:start[v+1]] {
			_, hi := ends(int(h))
			last[hi] = 0
		}
	}
	return next
}
