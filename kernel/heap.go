package kernel

// vertexHeap is a binary heap of vertices by key, least first; equal keys by number,
// so that the order does not depend on how they came in.
type vertexHeap []keyed

type keyed struct {
	key float64
	v   int32
}

func (a keyed) before(b keyed) bool { return a.key < b.key || a.key == b.key && a.v < b.v }

// push adds v. O(log n).
func (q *vertexHeap) push(key float64, v int32) {
	*q = append(*q, keyed{key, v})
	h := *q
	i := len(h) - 1
	for i > 0 {
		up := (i - 1) / 2
		if !h[i].before(h[up]) {
			break
		}
		h[i], h[up] = h[up], h[i]
		i = up
	}
}

// pop takes the least out. O(log n).
func (q *vertexHeap) pop() int32 {
	h := *q
	v := h[0].v
	last := len(h) - 1
	h[0] = h[last]
	h = h[:last]
	for i := 0; ; {
		down := 2*i + 1
		if down >= last {
			break
		}
		if down+1 < last && h[down+1].before(h[down]) {
			down++
		}
		if !h[down].before(h[i]) {
			break
		}
		h[i], h[down] = h[down], h[i]
		i = down
	}
	*q = h
	return v
}
