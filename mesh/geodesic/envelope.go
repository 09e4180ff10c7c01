package geodesic

import "math"

// An envelope is the windows on a halfedge in order along it: no two overlap, each is
// the shortest known on its piece.
type envelope []window

const (
	// Differences of distance below tie (of the distance) or blur (of the halfedge, since
	// near a source the coordinates are larger than the distance) are round-off: the
	// images of one source differ by some ulps after many unfoldings. The older window
	// then stays, so that no window is replaced by its own image, for ever.
	tie, blur = 1e-14, 2e-15
	// Windows narrower than this (of the halfedge) are dropped. What falls into the
	// cracks is caught by slack.
	narrow = 1e-14
	// Neighbours whose sources differ by less than this (relative) are one window that
	// a flat vertex had split: they are joined again, or flat parts would fill up with
	// windows. Of a real bend at the vertex not more than this is lost.
	sameSource = 2e-14
	// The crack between neighbours that are joined may be so many times narrow.
	beyond = 100
)

// join makes one window of last and w, which begins where last ends, if both see one
// source.
func (last *window) join(w *window, thin float64) bool {
	if last.flags != w.flags || w.b0-last.b1 > beyond*thin {
		return false
	}
	dx, dy, df := math.Abs(w.x-last.x), math.Abs(w.y-last.y), math.Abs(w.far-last.far)
	if w.flags&parallel != 0 {
		if dx+dy > sameSource || df > sameSource*math.Abs(w.far) {
			return false
		}
	} else if df != 0 || dx+dy > sameSource*(math.Abs(w.x)+w.y) {
		return false
	}
	if w.b1-w.b0 > last.b1-last.b0 { // keep the source of the wider one
		last.x, last.y, last.far = w.x, w.y, w.far
	}
	last.b1 = max(last.b1, w.b1)
	return true
}

// add takes w into the envelope where it is shortest. Cost is in proportion to the
// windows to the right of w's left end: O(1) if windows come in order.
func (e *envelope) add(w window, thin float64, spare *envelope) {
	n := len(*e)
	if n > 0 && w.b0 >= (*e)[n-1].b0 && (*e)[n-1].join(&w, thin) {
		return
	}
	if n == 0 || (*e)[n-1].b1 <= w.b0+thin {
		if w.b1-w.b0 > thin {
			*e = append(*e, w)
		}
		return
	}
	last := &(*e)[n-1]
	if (last.flags|w.flags)&parallel == 0 && last.far == w.far && w.b0 > last.b0+thin && w.b1 > last.b1+thin &&
		(n == 1 || (*e)[n-2].b1 <= w.b0) {
		// Two images of one source, side by side, behind a vertex: the common case, for
		// which the bisector of the two decides.
		//	|t-w|^2 - |t-last|^2 = 2 (a t + b) with the origin at w.b0
		wx, lx := w.x-w.b0, last.x-w.b0
		a := lx - wx
		b := ((wx-lx)*(wx+lx) + (w.y-last.y)*(w.y+last.y)) / 2
		if r := last.b1 - w.b0; b > 0 && a*r+b < 0 {
			t := w.b0 - b/a
			last.b1, w.b0 = t, t
			if last.b1-last.b0 <= thin {
				*e = (*e)[:n-1]
			}
			if w.b1-w.b0 > thin {
				*e = append(*e, w)
			}
			return
		}
	}
	e.weave(w, thin, spare)
}

// weave is add for windows that overlap in any way.
func (e *envelope) weave(w window, thin float64, spare *envelope) {
	out := *e
	i := len(out)
	for i > 0 && out[i-1].b1 > w.b0+thin {
		i--
	}
	rest := append((*spare)[:0], out[i:]...)
	*spare = rest
	out = out[:i]
	put := func(piece *window, from, to float64) {
		if to-from > thin {
			out = append(out, *piece)
			p := &out[len(out)-1]
			p.b0, p.b1 = from, to
		}
	}
	open := w.b0 // what of w is still to be placed: from here to w.b1
	for k := range rest {
		old := &rest[k]
		l, r := max(open, old.b0), min(w.b1, old.b1)
		if r-l <= thin { // apart, or as good as
			if old.b0 >= w.b1-thin && open < w.b1 {
				put(&w, open, w.b1)
				open = w.b1
			}
			put(old, old.b0, old.b1)
			open = max(open, old.b1)
			continue
		}
		cut, ours, parts := duel(&w, old, l, r, thin*blur/narrow)
		// Alternate pieces of the two, from the left end of the first.
		begin, isOurs := old.b0, false
		if open <= old.b0 {
			begin, isOurs = open, true
		} else if ours[0] {
			put(old, old.b0, l)
			begin, isOurs = l, true
		}
		for p := range parts {
			if ours[p] != isOurs {
				if isOurs {
					put(&w, begin, cut[p])
				} else {
					put(old, begin, cut[p])
				}
				begin, isOurs = cut[p], ours[p]
			}
		}
		switch {
		case old.b1 > w.b1: // w ends first
			if isOurs {
				put(&w, begin, w.b1)
				begin = w.b1
			}
			put(old, begin, old.b1)
			open = w.b1
		case isOurs:
			open = begin
		default:
			put(old, begin, old.b1)
			open = old.b1
		}
	}
	if open < w.b1 {
		put(&w, open, w.b1)
	}
	*e = out
}

// duel tells where on [l, r] w is shorter than old: between cut[p] and cut[p+1] if
// ours[p], for p below parts. Differences of less than noise do not count.
func duel(w, old *window, l, r, noise float64) (cut [4]float64, ours [3]bool, parts int) {
	ol, or := old.at(l), old.at(r)
	fl, fr := w.at(l)-ol, w.at(r)-or
	epsL, epsR := max(tie*ol, noise), max(tie*or, noise)
	cut[0], cut[1], parts = l, r, 1
	switch {
	case fl < -epsL && fr > epsR:
		cut[1], cut[2], parts = meet(w, old, l, r, fl, fr), r, 2
		ours[0] = true
	case fl > epsL && fr < -epsR:
		cut[1], cut[2], parts = meet(w, old, l, r, fl, fr), r, 2
		ours[1] = true
	case fl < -epsL || fr < -epsR: // w, but for a dip of old
		ours[0] = true
		if t, ok := dip(old, w, l, r); ok && fl < 0 && fr < 0 {
			if o := old.at(t); w.at(t)-o > max(tie*o, noise) {
				f := w.at(t) - o
				cut[1], cut[2], cut[3], parts = meet(w, old, l, t, fl, f), meet(w, old, t, r, f, fr), r, 3
				ours[2] = true
			}
		}
	default: // old, but for a dip of w; a tie goes to the one that has been carried on
		if t, ok := dip(w, old, l, r); ok {
			if o := old.at(t); w.at(t)-o < -max(tie*o, noise) {
				f := w.at(t) - o
				cut[1], cut[2], cut[3], parts = l, r, r, 3
				if fl > 0 {
					cut[1] = meet(w, old, l, t, fl, f)
				}
				if fr > 0 {
					cut[2] = meet(w, old, t, r, f, fr)
				}
				ours[1] = true
				break
			}
		}
		ours[0] = fl <= epsL && fr <= epsR && w.flags&crossed != 0 && old.flags&crossed == 0
	}
	return cut, ours, parts
}
