package geodesic

// An event is a halfedge whose windows wait to cross, or (numbered after all
// halfedges) a vertex that sends the wave out anew, at the distance key.
type event struct {
	key float64
	id  int32
}

// eventHeap is a heap of events by key, four children to a node. Stale events stay
// in it; who pops one must notice. Equal keys leave in order of number, so that
// results do not depend on the heap's history.
type eventHeap []event

func (e event) before(f event) bool { return e.key < f.key || e.key == f.key && e.id < f.id }

// push adds an event in O(log n).
func (h *eventHeap) push(e event) {
	*h = append(*h, e)
	a := *h
	i := len(a) - 1
	for i > 0 {
		up := (i - 1) / 4
		if !e.before(a[up]) {
			break
		}
		a[i] = a[up]
		i = up
	}
	a[i] = e
}

// pop takes out the first event in O(log n).
func (h *eventHeap) pop() event {
	a := *h
	top := a[0]
	n := len(a) - 1
	e := a[n]
	a = a[:n]
	*h = a
	if n == 0 {
		return top
	}
	i := 0
	for {
		first := 4*i + 1
		if first >= n {
			break
		}
		least := first
		for c := first + 1; c < min(first+4, n); c++ {
			if a[c].before(a[least]) {
				least = c
			}
		}
		if !a[least].before(e) {
			break
		}
		a[i] = a[least]
		i = least
	}
	a[i] = e
	return top
}
