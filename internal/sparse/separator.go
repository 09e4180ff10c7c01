package sparse

// cutter improves a cut of a piece into two sides: within a band of layers around it, it finds the fewest
// vertices that part the sides, by maximum flow (K. Menger 1927; L. R. Ford and D. R. Fulkerson
// 1956) with the phases of E. A. Dinic (1970). In a band of one layer on each side this is the least
// vertex cover of the cut edges (D. Kőnig 1931). Its memory is reused from piece to piece.
type cutter struct {
	band  []int32 // vertices of the band; the layers of one side, then of the other
	ptr   []int32 // neighbours within the band, by place in it
	adj   []int32
	first []bool // source: in the outermost layer of the left side
	last  []bool // sink: in the outermost layer of the right side
	pred  []int32
	succ  []int32
	level []int32 // of states: 2v is where flow enters v, 2v+1 where it leaves
	queue []int32
	path  []int32
	arc   []int32
	back  []bool
}

const (
	none     = -1
	terminal = -2
)

// side of a vertex, as a cut leaves it.
const (
	leftSide  = 0
	rightSide = 1
	separator = 2
)

// separate takes side[v] (left or right) for the vertices of a piece and turns some into separator, so that no
// left vertex has a right neighbour. layers bounds the band's depth on each side.
// index is scratch, -1 for the vertices of the piece before and after.
func (c *cutter) separate(g *graph, verts, part []int32, id int32, side []uint8, index []int32, layers int) {
	var count [2]int
	c.band = c.band[:0]
	for _, v := range verts {
		count[side[v]]++
	}
	c.first, c.last = c.first[:0], c.last[:0]
	for s := range uint8(2) {
		begin := len(c.band)
		for _, v := range verts {
			if side[v] != s {
				continue
			}
			for _, w := range g.neighbours(v) {
				if part[w] == id && side[w] != s {
					index[v] = int32(len(c.band))
					c.band = append(c.band, v)
					break
				}
			}
		}
		from := begin
		for range layers - 1 {
			to := len(c.band)
			if 3*(to-begin) > count[s] {
				break // leave the side most of its vertices, or the cut may run away
			}
			for _, v := range c.band[from:to] {
				for _, w := range g.neighbours(v) {
					if part[w] == id && side[w] == s && index[w] < 0 {
						index[w] = int32(len(c.band))
						c.band = append(c.band, w)
					}
				}
			}
			if len(c.band) == to {
				break
			}
			from = to
		}
		for k := begin; k < len(c.band); k++ {
			c.first = append(c.first, s == leftSide && k >= from)
			c.last = append(c.last, s == rightSide && k >= from)
		}
	}
	n := len(c.band)
	c.ptr = append(c.ptr[:0], 0)
	c.adj = c.adj[:0]
	for _, v := range c.band {
		for _, w := range g.neighbours(v) {
			if part[w] == id && index[w] >= 0 {
				c.adj = append(c.adj, index[w])
			}
		}
		c.ptr = append(c.ptr, int32(len(c.adj)))
	}
	c.pred, c.succ, c.arc = resize(c.pred, n), resize(c.succ, n), resize(c.arc, 2*n)
	c.level = resize(c.level, 2*n)
	for v := range n {
		c.pred[v], c.succ[v] = none, none
	}
	for c.search() {
		c.block()
	}

	// The last search has marked what the sources reach without a way through to the sinks. What
	// reaches the sinks gives the other extreme of the least cuts. Keep the better balanced one.
	inner := [2]int{count[0], count[1]} // vertices outside the band
	for _, v := range c.band {
		inner[side[v]]--
	}
	left := inner[0]
	cut := 0
	for v := range n {
		enters, leaves := c.level[2*v] >= 0, c.level[2*v+1] >= 0
		if enters && leaves {
			left++
		} else if enters {
			cut++
		}
	}
	c.searchBack()
	right := inner[1]
	for v := range n {
		if c.back[2*v] && c.back[2*v+1] {
			right++
		}
	}
	m := len(verts)
	fromLeft := max(left, m-left-cut) <= max(right, m-right-cut)
	for k, v := range c.band {
		index[v] = -1
		enters, leaves := c.level[2*k] >= 0, c.level[2*k+1] >= 0
		if !fromLeft {
			enters, leaves = !c.back[2*k], !c.back[2*k+1]
		}
		switch {
		case enters && leaves:
			side[v] = leftSide
		case enters != leaves:
			side[v] = separator
		default:
			side[v] = rightSide
		}
	}
}

func resize[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n+n/2)[:n]
	}
	return s[:n]
}

// search labels states by their distance from the sources in the residual network, and says
// whether a sink can be reached.
func (c *cutter) search() bool {
	n := len(c.band)
	for i := range c.level {
		c.level[i] = -1
	}
	queue := c.queue[:0]
	for v := range n {
		if c.first[v] { // with flow from outside already or not: what lies before it is on the left
			c.level[2*v] = 0
			queue = append(queue, int32(2*v))
		}
	}
	found := false
	for head := 0; head < len(queue); head++ {
		s := queue[head]
		v, next := s>>1, c.level[s]+1
		if s&1 == 0 {
			t := s + 1
			if p := c.pred[v]; p != none {
				if p == terminal {
					continue
				}
				t = 2*p + 1
			}
			if c.level[t] < 0 {
				c.level[t] = next
				queue = append(queue, t)
			}
			continue
		}
		if c.last[v] && c.succ[v] != terminal {
			found = true
		}
		if c.pred[v] != none && c.level[s-1] < 0 {
			c.level[s-1] = next
			queue = append(queue, s-1)
		}
		for _, w := range c.adj[c.ptr[v]:c.ptr[v+1]] {
			if c.level[2*w] < 0 && c.succ[v] != w {
				c.level[2*w] = next
				queue = append(queue, 2*w)
			}
		}
	}
	c.queue = queue
	return found
}

// block sends flow along shortest ways from sources to sinks until each is blocked. A state carries one
// unit at most, so that each is tried once: when left it is struck off by level -1.
func (c *cutter) block() {
	for v := range c.band {
		c.arc[2*v], c.arc[2*v+1] = 0, -1
	}
	for v := range c.band {
		if !c.first[v] || c.pred[v] == terminal || c.level[2*v] != 0 {
			continue
		}
		path := append(c.path[:0], int32(2*v))
		for len(path) > 0 {
			s := path[len(path)-1]
			u := s >> 1
			t, through := int32(-1), false
			if s&1 == 0 {
				if c.arc[s] == 0 {
					c.arc[s] = 1
					if p := c.pred[u]; p == none {
						t = s + 1
					} else if p != terminal {
						t = 2*p + 1
					}
					if t >= 0 && c.level[t] != c.level[s]+1 {
						t = -1
					}
				}
			} else {
				if c.last[u] && c.succ[u] != terminal {
					through = true
				} else {
					if c.arc[s] < 0 {
						c.arc[s] = 0
						if c.pred[u] != none && c.level[s-1] == c.level[s]+1 {
							t = s - 1
						}
					}
					list := c.adj[c.ptr[u]:c.ptr[u+1]]
					for t < 0 && int(c.arc[s]) < len(list) {
						w := list[c.arc[s]]
						c.arc[s]++
						if c.level[2*w] == c.level[s]+1 && c.succ[u] != w {
							t = 2 * w
						}
					}
				}
			}
			switch {
			case through:
				c.push(path)
				path = path[:0]
			case t >= 0:
				path = append(path, t)
			default:
				c.level[s] = -1
				path = path[:len(path)-1]
			}
		}
		c.path = path
	}
}

// push sends one unit along a path of states from a source to a sink.
func (c *cutter) push(path []int32) {
	c.level[path[0]] = -1
	c.pred[path[0]>>1] = terminal
	for k := 1; k < len(path); k++ {
		from, to := path[k-1], path[k]
		u, w := from>>1, to>>1
		c.level[to] = -1
		switch {
		case from&1 == 1 && to&1 == 0 && u != w: // an edge
			c.succ[u], c.pred[w] = w, u
		case from&1 == 1 && u == w: // back through u itself: it is free again
			c.succ[u] = terminal - 1 // until the next step clears it
		case from&1 == 0 && u != w: // back along the edge w to u
			if c.succ[u] == terminal-1 {
				c.succ[u], c.pred[u] = none, none
			}
		}
	}
	c.succ[path[len(path)-1]>>1] = terminal
}

// searchBack marks the states from which a sink can be reached in the residual network.
func (c *cutter) searchBack() {
	n := len(c.band)
	c.back = resize(c.back, 2*n)
	clear(c.back)
	queue := c.queue[:0]
	for v := range n {
		if c.last[v] {
			c.back[2*v+1] = true
			queue = append(queue, int32(2*v+1))
		}
	}
	visit := func(s int32) {
		if !c.back[s] {
			c.back[s] = true
			queue = append(queue, s)
		}
	}
	for head := 0; head < len(queue); head++ {
		s := queue[head]
		v := s >> 1
		if s&1 == 1 {
			if c.pred[v] == none {
				visit(s - 1)
			}
			if w := c.succ[v]; w >= 0 {
				visit(2 * w)
			}
			continue
		}
		if c.pred[v] != none {
			visit(s + 1)
		}
		for _, u := range c.adj[c.ptr[v]:c.ptr[v+1]] {
			if c.succ[u] != v {
				visit(2*u + 1)
			}
		}
	}
	c.queue = queue
}
