package meshfile

import (
	"encoding/binary"
	"fmt"
	"math"
)

// Both readers are our own, though github.com/hschendel/stl v1.0.4 streams binary
// STL through its Writer interface and serves our tests as a second opinion. Its
// CopyAll needs a Seeker, because it tells binary from ASCII by the file's size, so
// it reads neither a pipe nor a gzip stream, and it takes a binary file with one
// stray byte behind it for ASCII. Its Writer cannot refuse a triangle, so a
// coordinate that is not finite would come out without its place. It allocates 50
// bytes for each triangle read, and takes about five times as long as the reader
// below (BenchmarkBinarySTL and BenchmarkBinarySTLByLibrary). Of an ASCII file it
// reads the first solid only, and it wants lower case.

var little = binary.LittleEndian

const (
	stlHeader   = 84 // 80 bytes of anything and the count
	stlTriangle = 50 // normal, three corners as float32, and a uint16
)

// readBinarySTL reads a binary STL file. size, if not 0, is how many bytes it has.
func readBinarySTL(s *source, soup *Soup, size int64) error {
	if !s.ensure(stlHeader) {
		n := s.end - s.pos
		s.pos = s.end
		s.got = fmt.Sprintf("end of file after %d bytes", n)
		return s.want(fmt.Sprintf("the %d bytes that begin a binary STL file", stlHeader))
	}
	count := int64(little.Uint32(s.buf[s.pos+80:]))
	s.pos += 80
	if count > maxTriangles {
		s.got = fmt.Sprint(count)
		return s.want(fmt.Sprintf("a count of at most %d triangles in a binary STL file", maxTriangles))
	}
	s.pos += 4
	if fits := (size - stlHeader) / stlTriangle; fits > 0 {
		soup.Positions = make([]float64, 0, 9*min(count, fits))
	}
	for done := int64(0); done < count; {
		if !s.ensure(stlTriangle) {
			n := s.end - s.pos
			s.pos = s.end
			s.got = fmt.Sprintf("end of file %d bytes into it", n)
			return s.want(fmt.Sprintf("triangle %d of the %d that the header declares", done+1, count))
		}
		n := min(int64(s.end-s.pos)/stlTriangle, count-done)
		soup.Positions = room(soup.Positions, 9*int(n), 9*count)
		for ; n > 0; n-- {
			record := s.buf[s.pos : s.pos+stlTriangle]
			at := len(soup.Positions)
			soup.Positions = soup.Positions[:at+9]
			corners := soup.Positions[at : at+9 : at+9]
			for i := range corners {
				bits := little.Uint32(record[12+4*i:])
				if bits&0x7f800000 == 0x7f800000 {
					s.pos += 12 + 4*i
					s.got = fmt.Sprint(math.Float32frombits(bits))
					return s.want(fmt.Sprintf("a finite %c of corner %d of triangle %d", 'x'+rune(i%3), i/3+1, done+1))
				}
				corners[i] = float64(math.Float32frombits(bits)) + 0 // +0 makes -0 a 0
			}
			s.pos += stlTriangle
			done++
		}
	}
	soup.Triangles = ownCorners(int(count))
	if extra := s.skip(math.MaxUint64); extra > 0 {
		soup.warn(fmt.Sprintf("%d bytes after the last of %d triangles are ignored", extra, count))
	}
	return nil
}

// ownCorners numbers the corners of n triangles from 0.
func ownCorners(n int) []int32 {
	corners := make([]int32, 3*n)
	for i := range corners {
		corners[i] = int32(i)
	}
	return corners
}

// readASCIISTL reads solids one after another. The format is one of words: where
// lines break is up to the writer, except behind a solid's name.
func readASCIISTL(s *source, soup *Soup) error {
	f := face{soup: soup}
	w := stlWord(s)
	for {
		if !foldsTo(w, "solid") {
			return s.wantWord(w, `"solid"`)
		}
		s.nextLine() // its name may hold anything
		for w = stlWord(s); foldsTo(w, "facet"); w = stlWord(s) {
			if err := readFacet(s, soup, &f); err != nil {
				return err
			}
		}
		if !foldsTo(w, "endsolid") {
			return s.wantWord(w, `"facet" or "endsolid"`)
		}
		s.nextLine()
		if w = stlWord(s); len(w) == 0 {
			break
		}
		if w[0] == 0 || w[0] == 0x1a { // padding, or the file's end as of old
			soup.warn(fmt.Sprintf("what follows the last solid from line %d on is ignored", s.line))
			s.skip(math.MaxUint64)
			break
		}
	}
	if quads := len(soup.polygons); quads > 0 {
		soup.warn(fmt.Sprintf("facets of more than three corners (%d) are split", quads))
	}
	f.done()
	return nil
}

// readFacet reads what follows "facet". Its normal is passed over, numbers or not:
// the corners' order says it better, and writers put "nan" on flat facets.
func readFacet(s *source, soup *Soup, f *face) error {
	w := stlWord(s)
	if !foldsTo(w, "normal") {
		return s.wantWord(w, `"normal"`)
	}
	for i := 0; ; i++ {
		w = stlWord(s)
		if foldsTo(w, "outer") {
			break
		}
		if i == 3 || len(w) == 0 {
			return s.wantWord(w, `"outer loop"`)
		}
	}
	if w = stlWord(s); !foldsTo(w, "loop") {
		return s.wantWord(w, `"loop"`)
	}
	f.begin()
	start := len(soup.Positions)
	for w = stlWord(s); foldsTo(w, "vertex"); w = stlWord(s) {
		n := len(soup.Positions) / 3
		if n >= maxVertices {
			return s.tooManyVertices()
		}
		soup.Positions = room(soup.Positions, 3, 0)[:3*n+3]
		for i := range 3 {
			x := &soup.Positions[3*n+i]
			if !s.number32(x) {
				return s.want(fmt.Sprintf("the vertex's %c", 'x'+rune(i)))
			}
			*x += 0
		}
		if !f.corner(int32(n)) {
			return s.tooMany()
		}
	}
	if !foldsTo(w, "endloop") {
		return s.wantWord(w, `"vertex" or "endloop"`)
	}
	if w = stlWord(s); !foldsTo(w, "endfacet") {
		return s.wantWord(w, `"endfacet"`)
	}
	f.end(s)
	if f.corners < 3 {
		soup.Positions = soup.Positions[:start]
	}
	return nil
}

// stlWord is the file's next word. "//" and ";" begin comments, as "#" does.
func stlWord(s *source) []byte {
	for {
		w := s.nextWord()
		if len(w) > 0 && (w[0] == ';' || w[0] == '/' && len(w) > 1 && w[1] == '/') {
			s.nextLine()
			continue
		}
		return w
	}
}
