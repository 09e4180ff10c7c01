package meshfile

import (
	"bytes"
	"fmt"
	"math"
	"regexp"
)

var offPattern = regexp.MustCompile(`^(ST)?(C)?(N)?(4)?(n)?OFF$`)

// offHeader takes the header keyword apart, or is nil if it is none.
func offHeader(w []byte) [][]byte {
	if len(w) < 3 || len(w) > 8 {
		return nil
	}
	return offPattern.FindSubmatch(w)
}

// readOFF reads vertices and faces one a line. A vertex line may go on with a
// normal, a colour, texture coordinates, a face line with a colour; whatever the
// header says of them, x, y and z come first. The header word may be missing.
func readOFF(s *source, soup *Soup) error {
	w := s.nextWord()
	if parts := offHeader(w); parts != nil {
		if len(parts[4])+len(parts[5]) > 0 {
			return s.wantWord(w, "an OFF file in three dimensions")
		}
		if w = s.nextWord(); bytes.Equal(w, []byte("BINARY")) {
			return s.wantWord(w, "the ASCII variant of OFF")
		}
	}
	vertices, n := decimalInteger(w)
	if n == 0 || n != len(w) || vertices < 0 || vertices > maxVertices {
		return s.wantWord(w, fmt.Sprintf("the number of vertices, 0 to %d", maxVertices))
	}
	var faces int64
	if !s.whole(&faces, 0, maxTriangles) {
		return s.want(fmt.Sprintf("the number of faces, 0 to %d, behind that of the vertices", maxTriangles))
	}
	for v := range vertices {
		if !s.nextFilledLine() {
			s.sawWord(nil)
			return s.want(fmt.Sprintf("vertex %d of the %d that the header declares", v, vertices))
		}
		soup.Positions = room(soup.Positions, 3, 3*vertices)[:3*v+3]
		for i := range int64(3) {
			x := &soup.Positions[3*v+i]
			if !s.number(x) {
				return s.want(fmt.Sprintf("the %c of vertex %d", 'x'+rune(i), v))
			}
			*x += 0 // makes -0 a 0
		}
	}
	f := face{soup: soup}
	for at := range faces {
		var corners int64
		if !s.nextFilledLine() {
			s.sawWord(nil)
			return s.want(fmt.Sprintf("face %d of the %d that the header declares", at, faces))
		}
		if !s.whole(&corners, 0, math.MaxInt64) {
			return s.want(fmt.Sprintf("the number of corners of face %d", at))
		}
		f.begin()
		for range corners {
			var v int64
			if !s.whole(&v, 0, vertices-1) {
				return s.want(vertexRange(vertices))
			}
			if !f.corner(int32(v)) {
				return s.tooMany()
			}
		}
		f.end(s)
	}
	f.done()
	if s.nextFilledLine() {
		soup.warn(fmt.Sprintf("what follows the last face from line %d on is ignored", s.line))
		for s.nextLine() {
		}
	}
	return nil
}

func vertexRange(vertices int64) string {
	if vertices == 0 {
		return "no corner, as there are no vertices"
	}
	return fmt.Sprintf("a vertex number from 0 to %d", vertices-1)
}

// nextFilledLine goes on to the next line with a word on it; false at the end.
func (s *source) nextFilledLine() bool {
	for s.nextLine() {
		if s.blanks() {
			return true
		}
	}
	return false
}
