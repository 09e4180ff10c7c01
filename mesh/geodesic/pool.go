package geodesic

import "math/bits"

// A pool holds the envelopes of the halfedges on the wave's front: runs of windows in
// one slab, each in a block of a power of two, so that blocks can be used again.
type pool struct {
	slab  []window
	free  [40][]int // offsets of free blocks by the logarithm of their size
	lists []list
	spare []int32 // unused numbers of lists
}

// A list is an envelope in the pool.
type list struct {
	offset int
	count  int
	log    int // the block holds 1<<log windows
}

// block finds room for n >= 1 windows.
func (p *pool) block(n int) (offset, log int) {
	log = bits.Len(uint(n - 1))
	if f := p.free[log]; len(f) > 0 {
		offset = f[len(f)-1]
		p.free[log] = f[:len(f)-1]
		return offset, log
	}
	offset = len(p.slab)
	size := 1 << log
	if len(p.slab)+size > cap(p.slab) {
		grown := make([]window, len(p.slab), len(p.slab)+len(p.slab)/2+size+1024)
		copy(grown, p.slab)
		p.slab = grown
	}
	p.slab = p.slab[:len(p.slab)+size]
	return offset, log
}

// windows is the envelope of list i, to be read or changed in place.
func (p *pool) windows(i int32) envelope {
	l := &p.lists[i]
	return envelope(p.slab[l.offset : l.offset+l.count])
}

// store makes e the envelope of list i; i below 0 asks for a new list. It returns i.
func (p *pool) store(i int32, e envelope) int32 {
	if i < 0 {
		if n := len(p.spare); n > 0 {
			i = p.spare[n-1]
			p.spare = p.spare[:n-1]
		} else {
			i = int32(len(p.lists))
			p.lists = append(p.lists, list{})
		}
		p.lists[i] = list{log: -1}
	}
	l := &p.lists[i]
	if n := len(e); n > 0 && (l.log < 0 || n > 1<<l.log) {
		if l.log >= 0 {
			p.free[l.log] = append(p.free[l.log], l.offset)
		}
		l.offset, l.log = p.block(n)
	}
	copy(p.slab[l.offset:], e)
	l.count = len(e)
	return i
}

// drop frees list i.
func (p *pool) drop(i int32) {
	l := &p.lists[i]
	if l.log >= 0 {
		p.free[l.log] = append(p.free[l.log], l.offset)
	}
	p.spare = append(p.spare, i)
}
