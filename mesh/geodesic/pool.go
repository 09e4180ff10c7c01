package geodesic

import (
	"math/bits"
	"unsafe"
)

// A pool holds the envelopes of the halfedges on the wave's front. They lie in blocks
// of a power of two of windows, which are used again; the collector never sees them go.
type pool struct {
	lists  []envelope   // by number of the envelope
	unused []int32      // numbers free for use
	blocks [][]envelope // free blocks, by the logarithm of their size
	fresh  envelope     // what is left of the newest slab
	size   int64        // bytes of all slabs
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

// add makes a copy of e an envelope of its own and gives its number.
func (p *pool) add(e envelope) (i int32) {
	if n := len(p.unused); n > 0 {
		i = p.unused[n-1]
		p.unused = p.unused[:n-1]
	} else {
		i = int32(len(p.lists))
		p.lists = append(p.lists, nil)
	}
	p.set(i, e)
	return i
}

// set makes a copy of e envelope i.
func (p *pool) set(i int32, e envelope) {
	b := p.lists[i]
	if len(e) > cap(b) {
		p.free(b)
		b = p.block(len(e))
	}
	p.lists[i] = append(b[:0], e...)
}

// drop forgets envelope i.
func (p *pool) drop(i int32) {
	p.free(p.lists[i])
	p.lists[i] = nil
	p.unused = append(p.unused, i)
}
