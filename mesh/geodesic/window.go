package geodesic

import "math"

// A window is a piece [b0, b1] of a halfedge through which the wave enters the
// halfedge's triangle, in the frame of its layout (x along the halfedge from its
// tail, the triangle at y >= 0). It is one of two kinds:
//
//	rays from a point at (x, -y), y >= 0:  distance at t is far + |(t,0) - (x,-y)|
//	parallel rays of direction (x, y):     distance at t is far + x*t
type window struct {
	b0, b1 float64
	x, y   float64
	far    float64 // distance of the point from the source; of the tail, if parallel
	flags  uint32
}

const (
	parallel uint32 = 1 << iota // the rays are parallel
	crossed                     // the window has been carried across the triangle
)

// at is the distance at t through w.
func (w *window) at(t float64) float64 {
	if w.flags&parallel != 0 {
		return w.far + w.x*t
	}
	t -= w.x
	return w.far + math.Sqrt(t*t+w.y*w.y)
}

// reaches tells whether the distance at t through w is d or more; no square root.
func (w *window) reaches(t, d float64) bool {
	d -= w.far
	if w.flags&parallel != 0 {
		return w.x*t >= d
	}
	t -= w.x
	return d <= 0 || t*t+w.y*w.y >= d*d
}

// nearest is the t in [b0, b1] of least distance.
func (w *window) nearest() float64 {
	if w.flags&parallel != 0 {
		if w.x < 0 {
			return w.b1
		}
		return w.b0
	}
	return min(max(w.x, w.b0), w.b1)
}

// turned is w in the frame of the halfedge that runs the other way.
func (w window) turned(length float64) window {
	w.b0, w.b1 = length-w.b1, length-w.b0
	if w.flags&parallel != 0 {
		w.far += w.x * length
		w.x = -w.x
	} else {
		w.x = length - w.x
	}
	return w
}

// ray is the direction (p, q), q >= 0, of w's ray through t, not of unit length.
func (w *window) ray(t float64) (p, q float64) {
	if w.flags&parallel != 0 {
		return w.x, w.y
	}
	return t - w.x, w.y
}

// hit is where on AB the ray to C = (x, y) crosses; ok is false if none does. Where
// triangle and rays both lie in the line AB it is C itself.
func (w *window) hit(x, y float64) (t float64, ok bool) {
	if w.flags&parallel != 0 {
		if y == 0 {
			return x, true
		}
		return x - y*w.x/w.y, w.y > 0
	}
	if d := w.y + y; d > 0 {
		return w.x + (x-w.x)*(w.y/d), true
	}
	return x, true
}

// to is the distance through w at (x, y) of the triangle, straight.
func (w *window) to(x, y float64) float64 {
	if w.flags&parallel != 0 {
		return w.far + w.x*x + w.y*y
	}
	x -= w.x
	y += w.y
	return w.far + math.Sqrt(x*x+y*y)
}

// meet is a t in [l, r] where two windows are equally far. v and w differ in sign
// there: fl = v.at(l)-w.at(l) and fr likewise.
func meet(v, w *window, l, r, fl, fr float64) float64 {
	if (v.flags|w.flags)&parallel == 0 {
		// |t-v| = |t-w| + k, squared and squared again, with the origin at l.
		vx, wx, k := v.x-l, w.x-l, w.far-v.far
		a := wx - vx
		b := ((vx-wx)*(vx+wx) + (v.y-w.y)*(v.y+w.y) - k*k) / 2
		if k == 0 {
			if t := l - b/a; t >= l && t <= r {
				return t
			}
		} else if t, ok := solveQuadratic(a, b, k, wx, w.y, r-l); ok {
			// Cancellation may have spoilt the root: then it is a start for what follows.
			t += l
			d := w.at(t)
			f := v.at(t) - d
			if math.Abs(f) <= 1e-15*d {
				return t
			}
			if (f > 0) == (fr > 0) {
				r, fr = t, f
			} else {
				l, fl = t, f
			}
		}
	} else if v.flags&w.flags&parallel != 0 {
		return min(max(l+(r-l)*(fl/(fl-fr)), l), r)
	}
	// Regula falsi with the Illinois rule: safe for every kind.
	side := 0
	for range 60 {
		t := r - fr*(r-l)/(fr-fl)
		if !(t > l && t < r) {
			break
		}
		f := v.at(t) - w.at(t)
		switch {
		case f == 0:
			return t
		case (f > 0) == (fr > 0):
			r, fr = t, f
			if side == -1 {
				fl /= 2
			}
			side = -1
		default:
			l, fl = t, f
			if side == 1 {
				fr /= 2
			}
			side = 1
		}
	}
	if math.Abs(fl) < math.Abs(fr) {
		return l
	}
	return r
}

// solveQuadratic finds the t in [0, length] with a*t + b = k*sqrt((t-x)^2 + y^2); ok
// is false unless there is just one.
func solveQuadratic(a, b, k, x, y, length float64) (t float64, ok bool) {
	// p t^2 + 2 q t + c = 0, p without unit lest products of six lengths overflow.
	scale := 1 / (math.Abs(a) + math.Abs(k))
	a, b, k = a*scale, b*scale, k*scale
	p := (a - k) * (a + k)
	q := a*b + k*k*x
	c := b*b - k*k*(x*x+y*y)
	d := q*q - p*c
	if d < 0 {
		return 0, false
	}
	e := q + math.Copysign(math.Sqrt(d), q)
	// The two roots, without cancellation.
	t1, t2 := -c/e, -e/p
	ok1 := t1 >= 0 && t1 <= length && (a*t1+b)*k >= 0
	ok2 := t2 >= 0 && t2 <= length && (a*t2+b)*k >= 0
	if ok1 {
		return t1, !ok2
	}
	return t2, ok2
}

// dip is the t in (l, r) where v is shortest against w, if it lies inside: there the
// two rays run along one line with v's source ahead of w's. It matters when v
// loses at l and at r: a source just ahead may win in between, where the other's
// ray passes over it.
func dip(v, w *window, l, r float64) (t float64, ok bool) {
	switch {
	case v.flags&parallel != 0:
		return 0, false
	case w.flags&parallel != 0:
		t = v.x + v.y*w.x/w.y
	case w.y > v.y && v.far > w.far:
		t = v.x + (v.x-w.x)*v.y/(w.y-v.y)
	default:
		return 0, false
	}
	return t, t > l && t < r
}
