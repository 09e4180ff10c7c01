package meshfile

import (
	"fmt"
)

// objKeywords are the statements that may begin an OBJ file.
var objKeywords = map[string]bool{
	"v": true, "vt": true, "vn": true, "vp": true, "f": true, "g": true, "o": true, "s": true, "p": true, "l": true,
	"mg": true, "mtllib": true, "usemtl": true, "usemap": true, "maplib": true, "deg": true, "cstype": true,
	"lod": true, "bevel": true, "c_interp": true, "d_interp": true, "shadow_obj": true, "trace_obj": true,
}

// readOBJ reads the statements v and f; the others say nothing about the surface.
// Vertices count from 1 in the file; a negative number counts back from the last
// one read. A face may name vertices that come later.
func readOBJ(s *source, soup *Soup) error {
	s.continues = true
	f := face{soup: soup}
	highest, highestLine := int64(0), 0 // the first vertex number not yet there when named
	for more := s.ensure(1); more; more = s.nextLine() {
		w := s.word()
		n := len(soup.Positions) / 3
		switch {
		case len(w) == 1 && w[0] == 'v':
			if n >= maxVertices {
				return s.tooManyVertices()
			}
			soup.Positions = room(soup.Positions, 3, 0)[:3*n+3]
			for i := range 3 {
				x := &soup.Positions[3*n+i]
				if !s.number(x) {
					return s.want(fmt.Sprintf("the %c of vertex %d", 'x'+rune(i), n+1))
				}
				*x += 0 // makes -0 a 0
			}
		case len(w) == 1 && w[0] == 'f':
			f.begin()
			for {
				w := s.word()
				if len(w) == 0 {
					break
				}
				v, ok := objCorner(w)
				if v < 0 {
					v += int64(n) + 1
				}
				if !ok || v <= 0 || v > maxVertices {
					return s.wantWord(w, fmt.Sprintf("a vertex number, 1 or more or down to -%d", n))
				}
				if v > int64(n) && v > highest {
					highest, highestLine = v, s.line
				}
				if !f.corner(int32(v - 1)) {
					return s.tooMany()
				}
			}
			f.end(s)
		}
	}
	if n := len(soup.Positions) / 3; highest > int64(n) && s.err == nil {
		return &SyntaxError{File: s.file, Line: highestLine,
			Want: fmt.Sprintf("a vertex number from 1 to %d", n), Got: fmt.Sprintf("%q", fmt.Sprint(highest))}
	}
	f.done()
	return nil
}

// objCorner reads v, v/t, v//n or v/t/n, of which v counts.
func objCorner(w []byte) (v int64, ok bool) {
	v, n := decimalInteger(w)
	if n == 0 {
		return 0, false
	}
	slashes := 0
	for n < len(w) && w[n] == '/' && slashes < 2 {
		slashes++
		_, k := decimalInteger(w[n+1:])
		n += 1 + k
	}
	return v, n == len(w)
}
