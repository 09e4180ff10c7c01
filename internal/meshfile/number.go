package meshfile

import (
	"math"
	"strconv"
)

// number reads this line's next word as a finite number, rounded once to double
// precision. If it is none, got says what it is.
func (s *source) number(x *float64) bool {
	if s.blanks() {
		if s.end-s.pos < longest {
			s.ensure(longest)
		}
		v, n := shortDecimal(s.buf[s.pos:s.end])
		if n > 0 && s.ends(n) {
			s.pos += n
			*x = v
			return true
		}
	}
	w := s.word()
	if s.err != nil { // the word may be as long as the buffer
		return false
	}
	v, err := strconv.ParseFloat(string(w), 64)
	if err == nil && v-v == 0 {
		*x = v
		return true
	}
	s.sawWord(w)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		s.got += ", which is not finite"
	}
	return false
}

// number32 is number rounded once to single precision, as a binary STL holds it.
func (s *source) number32(x *float64) bool {
	if s.blanks() {
		if s.end-s.pos < longest {
			s.ensure(longest)
		}
		v, n := shortDecimal(s.buf[s.pos:s.end])
		if n > 0 && s.ends(n) {
			// Rounding twice differs from rounding once only where the first result lies
			// half-way between two singles and the number did not. shortDecimal's numbers
			// are 0 or from 1e-22 to 1e38, well within the normal singles.
			const tail = 1<<29 - 1 // the bits of a double's mantissa below a single's
			if math.Float64bits(v)&tail != 1<<28 {
				s.pos += n
				*x = float64(float32(v))
				return true
			}
		}
	}
	w := s.word()
	if s.err != nil { // the word may be as long as the buffer
		return false
	}
	v, err := strconv.ParseFloat(string(w), 32)
	if err == nil && v-v == 0 {
		*x = v
		return true
	}
	s.sawWord(w)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		s.got += ", which is not finite in single precision"
	}
	return false
}

// ends tells whether the word at hand ends after n bytes.
func (s *source) ends(n int) bool {
	if s.pos+n == s.end {
		return s.eof
	}
	return class[s.buf[s.pos+n]] != inWord
}

// longest is how much of a number shortDecimal wants to see at once; a longer
// one that the buffer's end cuts off takes the slow way.
const longest = 64

// shortDecimal reads the decimal number at b's start exactly rounded, and returns
// its length; 0 if there is none, or one for which the quick way is not exact.
// Quick and exact (Clinger, PLDI 1990, section 4): digits below 2^53 and a power of
// ten up to 22 are both doubles without error, so one operation rounds once.
func shortDecimal(b []byte) (v float64, n int) {
	i := 0
	negative := false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		negative = b[0] == '-'
		i = 1
	}
	var mantissa uint64
	start := i
	for i < len(b) && b[i]-'0' <= 9 {
		mantissa = mantissa*10 + uint64(b[i]-'0')
		i++
	}
	digits, exponent := i-start, 0
	if i < len(b) && b[i] == '.' {
		i++
		start = i
		for i < len(b) && b[i]-'0' <= 9 {
			mantissa = mantissa*10 + uint64(b[i]-'0')
			i++
		}
		digits += i - start
		exponent = start - i
	}
	if digits == 0 || digits > 19 { // 20 digits may not fit into a uint64
		return 0, 0
	}
	if i < len(b) && b[i]|0x20 == 'e' {
		i++
		down := false
		if i < len(b) && (b[i] == '-' || b[i] == '+') {
			down = b[i] == '-'
			i++
		}
		power := 0
		start = i
		for i < len(b) && b[i]-'0' <= 9 && power < 1000 {
			power = power*10 + int(b[i]-'0')
			i++
		}
		if i == start {
			return 0, 0
		}
		if down {
			power = -power
		}
		exponent += power
	}
	v = float64(mantissa)
	switch {
	case mantissa == 0:
	case mantissa > 1<<53 || exponent < -22 || exponent > 22:
		return 0, 0
	case exponent < 0:
		v /= powersOfTen[-exponent]
	default:
		v *= powersOfTen[exponent]
	}
	if negative {
		v = -v
	}
	return v, i
}

var powersOfTen = [23]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// whole reads this line's next word as a whole number from lo to hi.
func (s *source) whole(x *int64, lo, hi int64) bool {
	w := s.word()
	v, n := decimalInteger(w)
	if n == 0 || n != len(w) || v < lo || v > hi {
		s.sawWord(w)
		return false
	}
	*x = v
	return true
}

// decimalInteger reads the whole number at b's start and returns its length, 0 if
// there is none or it has more than 18 digits.
func decimalInteger(b []byte) (v int64, n int) {
	i := 0
	negative := false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		negative = b[0] == '-'
		i = 1
	}
	start := i
	for i < len(b) && b[i]-'0' <= 9 && i-start < 19 {
		v = v*10 + int64(b[i]-'0')
		i++
	}
	if i == start || i-start > 18 {
		return 0, 0
	}
	if negative {
		v = -v
	}
	return v, i
}
