package meshfile

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"context"
	"io"
	"math"
	"path"
	"slices"
	"strings"
)

// Formats are the formats that Read knows.
var Formats = []string{"stl", "ply", "obj", "off"}

// Limits of int32 numbering. A triangle's halfedges 3f, 3f+1, 3f+2 must fit, too.
const (
	maxVertices  = math.MaxInt32
	maxTriangles = math.MaxInt32 / 3
)

// A Soup is what a file says: points and triangles, before any welding.
type Soup struct {
	Positions  []float64 // 3 per point; finite, and never -0, so that equal points have equal bits
	Triangles  []int32   // 3 per triangle, points counted from 0
	Indexed    bool      // false for STL, where every corner is a point of its own
	Format     string    // which of Formats it was
	Warnings   []string  // what was odd, each a sentence without a full stop
	Properties map[string][]float64

	polygons []polygon // faces of more than 3 corners, still cut as fans
}

// Read reads a mesh from r to its end. name is for messages, and its extension
// helps where the content leaves the format open; format ("" or one of Formats)
// does so first. STL corners and the numbers of ASCII STL come rounded to single
// precision. Faces of more than three corners are cut into triangles, in the face's
// place; those of fewer are left out with a warning. want names PLY vertex
// properties to be kept in Properties, one value a point; those that the file lacks
// are missing from the map.
//
// Time is linear in the file, as is memory in the data that it really holds. If r
// has a method Size() int64 (bytes yet to come), a header's count is believed
// so far as it fits, which saves growing the slices; otherwise they double.
//
// The error is a *SyntaxError, a *NoTrianglesError, a *FormatError, ctx.Err(), or
// r's own error with file and place around it.
func Read(ctx context.Context, r io.Reader, name, format string, want ...string) (*Soup, error) {
	if format != "" && !slices.Contains(Formats, format) {
		return nil, &FormatError{Format: format}
	}
	size := int64(0)
	if sized, ok := r.(interface{ Size() int64 }); ok {
		size = sized.Size()
	}
	buffer := buffers.Get().(*[bufferSize]byte)
	defer buffers.Put(buffer)
	s := newSource(ctx, name, r, buffer[:])
	if s.ensure(2) && s.buf[0] == 0x1f && s.buf[1] == 0x8b { // RFC 1952, section 2.3.1
		size = 0
		content := buffers.Get().(*[bufferSize]byte)
		defer buffers.Put(content)
		s = newSource(ctx, name, &unzipper{in: s}, content[:])
	}
	found, err := sniff(s, format)
	if err != nil {
		return nil, err
	}
	soup := &Soup{Format: found, Indexed: found != "stl"}
	if format != "" && format != found {
		soup.warn("read as " + strings.ToUpper(found) + ", which its content is, not as " + strings.ToUpper(format))
	}
	switch {
	case found == "stl" && s.line == 0:
		err = readBinarySTL(s, soup, size)
	case found == "stl":
		err = readASCIISTL(s, soup)
	case found == "ply":
		err = readPLY(s, soup, want)
	case found == "obj":
		err = readOBJ(s, soup)
	default:
		err = readOFF(s, soup)
	}
	if err == nil {
		err = s.err
	}
	if err == nil {
		err = soup.split(ctx)
	}
	if err != nil {
		return nil, err
	}
	if len(soup.Triangles) == 0 {
		return nil, &NoTrianglesError{File: name, Format: found, Vertices: len(soup.Positions) / 3}
	}
	return soup, nil
}

func (soup *Soup) warn(warning string) { soup.Warnings = append(soup.Warnings, warning) }

// sniff tells the format from the first bytes, and leaves s before them, past a
// byte order mark, with s.line set to 1 if they are text.
func sniff(s *source, format string) (found string, err error) {
	s.ensure(len(s.buf))
	head := s.buf[:s.end]
	if len(head) == 0 {
		s.got = "an empty file"
		return "", s.want("a mesh (STL, PLY, OBJ or OFF)")
	}
	hint := format
	if hint == "" {
		hint = strings.TrimPrefix(path.Ext(strings.TrimSuffix(strings.ToLower(s.file), ".gz")), ".")
	}
	if bytes.HasPrefix(head, []byte("\xef\xbb\xbf")) {
		s.pos = 3
		head = head[3:]
	}
	first := firstWord(head)
	switch {
	case bytes.Equal(first, []byte("ply")):
		found = "ply"
	case offHeader(first) != nil:
		found = "off"
	case foldsTo(first, "solid"):
		found = "stl"
		if binarySTL(head, s.eof) {
			return found, nil
		}
	case isText(head):
		switch {
		case objKeywords[string(first)]:
			found = "obj"
		case slices.Contains(Formats, hint):
			found = hint // whose reader will say what belongs where
		default:
			s.line = 1 + bytes.Count(head[:len(head)-len(bytes.TrimLeft(head, " \t\n\v\f\r"))], []byte("\n"))
			return "", s.wantWord(first, `a mesh (STL "solid", PLY "ply", OFF "OFF", or OBJ statements)`)
		}
	case format == "" && (hint == "ply" || hint == "off" || hint == "obj"):
		s.got = quote(head[:min(len(head), 8)])
		return "", s.want("the text that begins a file named ." + hint)
	default:
		return "stl", nil // binary: any bytes may begin it
	}
	s.line = 1
	return found, nil
}

// firstWord is the first word outside comments.
func firstWord(b []byte) []byte {
	for {
		b = bytes.TrimLeft(b, " \t\n\v\f\r")
		if len(b) > 0 && b[0] == '#' || bytes.HasPrefix(b, []byte("//")) || bytes.HasPrefix(b, []byte(";")) {
			end := bytes.IndexAny(b, "\n\r")
			if end < 0 {
				return nil
			}
			b = b[end:]
			continue
		}
		n := 0
		for n < len(b) && class[b[n]] == inWord {
			n++
		}
		return b[:n]
	}
}

// isText tells whether b holds no control bytes but those of text.
func isText(b []byte) bool {
	for _, c := range b {
		if c < ' ' && class[c] == inWord && c != 0x1a { // 0x1a: the file's end, of old
			return false
		}
	}
	return true
}

// binarySTL tells whether a file that begins with "solid" is binary nevertheless:
// its 80-byte header may say what it likes. It is if its size is what its count
// asks for, or if control bytes follow its first line and no facet does.
func binarySTL(head []byte, whole bool) bool {
	if whole && len(head) >= 84 {
		if count := little.Uint32(head[80:]); int64(len(head)) == 84+50*int64(count) {
			return true
		}
	}
	first, rest := head, []byte(nil)
	if end := bytes.IndexAny(head, "\n\r"); end >= 0 {
		first, rest = head[:end], head[end:]
	}
	next := firstWord(rest)
	if foldsTo(next, "facet") || foldsTo(next, "endsolid") {
		return false
	}
	return !isText(first) || !isText(rest)
}

// foldsTo tells whether w is the lower-case word in any case of letters.
func foldsTo(w []byte, word string) bool {
	if len(w) != len(word) {
		return false
	}
	for i, c := range w {
		if c|0x20 != word[i] {
			return false
		}
	}
	return true
}

// An unzipper is the content of a gzip file, whose damage it reports as such.
type unzipper struct {
	in  *source
	out *gzip.Reader
}

func (u *unzipper) Read(p []byte) (n int, err error) {
	if u.out == nil {
		u.out, err = gzip.NewReader(bufio.NewReaderSize(raw{u.in}, 1<<16))
	}
	if err == nil {
		n, err = u.out.Read(p)
	}
	switch {
	case err == nil || err == io.EOF:
		return n, err
	case u.in.err != nil:
		return n, u.in.err
	}
	at := u.in.offset()
	return n, &SyntaxError{File: u.in.file, Offset: at, Want: "gzip data (bytes counted in the compressed file)",
		Got: err.Error()}
}

// raw reads a source's bytes as they are.
type raw struct{ s *source }

func (r raw) Read(p []byte) (int, error) {
	if !r.s.ensure(1) {
		if r.s.err != nil {
			return 0, r.s.err
		}
		return 0, io.EOF
	}
	n := copy(p, r.s.buf[r.s.pos:r.s.end])
	r.s.pos += n
	return n, nil
}

// room returns s with space for n more. It doubles; towards the final length that a
// header promised it grows fourfold, as fewer copies are then made of what is never
// too large in the end. A promise alone claims no memory.
func room[T any](s []T, n int, final int64) []T {
	if cap(s)-len(s) >= n {
		return s
	}
	size := max(2*int64(cap(s)), 1<<12)
	if final >= int64(len(s)+n) {
		size = min(2*size, final)
	}
	size = max(size, int64(len(s)+n))
	grown := make([]T, len(s), size)
	copy(grown, s)
	return grown
}
