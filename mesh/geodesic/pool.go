package geodesic

import (
	"math/bits"
	"unsafe"
)

// A pool holds the envelopes of the halfedges on the wave's front. They lie in blocks
// of a power of two of windows, which are used again; the collector never sees them go.
type pool struct {
	lists  []list
	unused []int32      // numbers free for use
	blocks [][]envelope // free blocks, by the logarithm of their size
	fresh  envelope     // what is left of the newest slab
	size   int64        // bytes of all slabs
}

// A list is the envelope of one halfedge; windows[lo:hi] holds all that still wait to
// cross, and maybe others.
type list struct {
	windows envelope
	lo, hi  int
}

const slabWindows = 1 << 12

// block is an empty envelope with room for n windows, n >= 1.
func (p *pool) block(n int) envelope {
	log := bits.Len(uint(n - 1))
	for len(p.blocks) <= log {
		p.blocks = append(p.blocks, nil)
	}
	if free := p.blocks[log]; len(free) > 0 {
		b := free[len(free)-1]
		p.blocks[log] = free[:len(free)-1]
		return b
	}
	n = 1 << log
	if n > len(p.fresh) {
		for len(p.fresh) > 0 { // leave nothing behind
			log := bits.Len(uint(len(p.fresh))) - 1
			p.blocks[log] = append(p.blocks[log], p.fresh[:0:1<<log])
			p.fresh = p.fresh[1<<log:]
		}
		p.fresh = make(envelope, max(n, slabWindows))
		p.size += int64(len(p.fresh)) * int64(unsafe.Sizeof(window{}))
	}
	b := p.fresh[:0:n]
	p.fresh = p.fresh[n:]
	return b
}

// free takes back a block.
func (p *pool) free(b envelope) {
	if cap(b) > 0 {
		log := bits.Len(uint(cap(b))) - 1
		p.blocks[log] = append(p.blocks[log], b[:0])
	}
}

// add makes a list of a copy of e, all of which waits, and gives its number.
func (p *pool) add(e envelope) (i int32) {
	if n := len(p.unused); n > 0 {
		i = p.unused[n-1]
		p.unused = p.unused[:n-1]
	} else {
		i = int32(len(p.lists))
		p.lists = append(p.lists, list{})
	}
	p.lists[i] = list{windows: append(p.block(len(e)), e...), hi: len(e)}
	return i
}

// splice puts a copy of e in the place of windows lo to hi of list i.
func (p *pool) splice(i int32, lo, hi int, e envelope) {
	l := &p.lists[i]
	more := len(e) - (hi - lo)
	n := len(l.windows)
	if n+more <= cap(l.windows) {
		w := l.windows[:max(n, n+more)]
		copy(w[hi+more:], w[hi:n])
		copy(w[lo:], e)
		l.windows = w[:n+more]
	} else {
		w := append(p.block(n+more), l.windows[:lo]...)
		w = append(append(w, e...), l.windows[hi:]...)
		p.free(l.windows)
		l.windows = w
	}
	first, last := lo, lo+len(e)
	if l.lo < l.hi { // some waited already
		if l.lo >= hi {
			l.lo += more
		}
		if l.hi >= hi {
			l.hi += more
		}
		first, last = min(first, l.lo), max(last, l.hi)
	}
	l.lo, l.hi = first, last
}

// drop forgets list i.
func (p *pool) drop(i int32) {
	p.free(p.lists[i].windows)
	p.lists[i] = list{}
	p.unused = append(p.unused, i)
}
