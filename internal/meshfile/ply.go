package meshfile

import (
	"fmt"
	"math"
	"math/bits"
	"slices"
	"strconv"
)

// plyReader holds what the elements' readers share.
type plyReader struct {
	*source
	header   *plyHeader
	soup     *Soup
	vertices int64 // as the header declares
	extra    int   // lines that hold more than the header declares
	extraAt  int
}

// readPLY reads the element vertex (x, y, z and the wanted properties, of any type)
// and the lists vertex_indices or vertex_index of the element face. Elements come in
// the header's order, properties in theirs; all others are passed over.
func readPLY(s *source, soup *Soup, want []string) error {
	header, err := readPLYHeader(s)
	if err != nil {
		return err
	}
	r := &plyReader{source: s, header: header, soup: soup}
	vertex := header.find("vertex")
	if vertex == nil {
		return &SyntaxError{File: s.file, Line: 1, Want: `an "element vertex" in the header`, Got: "none"}
	}
	r.vertices = vertex.count
	if len(want) > 0 {
		soup.Properties = make(map[string][]float64)
	}
	for i := range header.elements {
		e := &header.elements[i]
		switch {
		case e.name == "vertex":
			err = r.readVertices(e, want)
		case e.name == "face" && e.count > 0:
			err = r.readFaces(e)
		default:
			err = r.passOver(e)
		}
		if err != nil {
			return err
		}
	}
	if r.extra > 0 {
		soup.warn(fmt.Sprintf("values beyond those that the header declares are ignored in lines of text (%d of them, from line %d on)", r.extra, r.extraAt))
	}
	if header.order != nil {
		if n := s.skip(math.MaxUint64); n > 0 {
			soup.warn(fmt.Sprintf("%d bytes after the last element are ignored", n))
		}
		return nil
	}
	for more := s.ensure(1); more; more = s.nextLine() {
		if s.blanks() {
			soup.warn(fmt.Sprintf("what follows the last element from line %d on is ignored", s.line))
			s.skip(math.MaxUint64)
		}
	}
	return nil
}

// row goes to the text line of the element's row i.
func (r *plyReader) row(e *element, i int64) error {
	for !r.blanks() {
		if !r.nextLine() {
			r.sawWord(nil)
			return r.want(fmt.Sprintf("%s %d of the %d that the header declares", e.name, i, e.count))
		}
	}
	return nil
}

// endRow leaves a text line, all of whose declared values are read.
func (r *plyReader) endRow() {
	if r.blanks() {
		if r.extra == 0 {
			r.extraAt = r.line
		}
		r.extra++
	}
	r.nextLine()
}

// bytes returns the next n bytes, or nil with got set at the file's end.
func (r *plyReader) bytes(n int) []byte {
	if !r.ensure(n) {
		r.pos = r.end
		r.got = "end of file"
		return nil
	}
	b := r.buf[r.pos : r.pos+n]
	r.pos += n
	return b
}

// A target is a vertex property that is kept.
type target struct {
	at     int // which property
	offset int // of its bytes in a binary row without lists
	scalar scalar
	axis   int    // 0 to 2 for x, y, z; else -1
	name   string // for the messages
}

// readVertices reads the element vertex.
func (r *plyReader) readVertices(e *element, want []string) error {
	var targets []target
	for i, p := range e.properties {
		axis := slices.Index([]string{"x", "y", "z"}, p.name)
		if !p.list && (axis >= 0 || slices.Contains(want, p.name)) {
			targets = append(targets, target{at: i, offset: e.width(i), scalar: p.scalar, axis: axis, name: p.name})
		}
	}
	for _, name := range []string{"x", "y", "z"} {
		if at := e.find(name); at < 0 || e.properties[at].list {
			return &SyntaxError{File: r.file, Line: e.line,
				Want: fmt.Sprintf("a scalar property %q in the element vertex", name), Got: "none"}
		}
	}
	kept := make([][]float64, len(targets)) // values of those that are no coordinates
	row := make([]float64, len(targets))
	read := r.textVertex
	if r.header.order != nil {
		read = r.binaryVertex
	}
	for i := range e.count {
		if err := read(e, i, targets, row); err != nil {
			return err
		}
		r.soup.Positions = room(r.soup.Positions, 3, 3*e.count)[:3*i+3]
		for k := range targets {
			if axis := targets[k].axis; axis >= 0 {
				r.soup.Positions[3*i+int64(axis)] = row[k] + 0 // makes -0 a 0
			} else {
				kept[k] = append(room(kept[k], 1, e.count), row[k])
			}
		}
	}
	for k, t := range targets {
		switch {
		case !slices.Contains(want, t.name):
		case t.axis < 0:
			r.soup.Properties[t.name] = kept[k]
		default:
			column := make([]float64, e.count)
			for i := range column {
				column[i] = r.soup.Positions[3*i+t.axis]
			}
			r.soup.Properties[t.name] = column
		}
	}
	return nil
}

// width is how many bytes the first n properties take, or -1 if a list is among them.
func (e *element) width(n int) int {
	width := 0
	for _, p := range e.properties[:n] {
		if p.list {
			return -1
		}
		width += scalarSize[p.scalar]
	}
	return width
}

// textVertex reads row i of the element vertex from a line of text. Coordinates are
// finite; other properties may be anything that is a number.
func (r *plyReader) textVertex(e *element, i int64, targets []target, row []float64) error {
	if err := r.row(e, i); err != nil {
		return err
	}
	k := 0
	for at, p := range e.properties {
		wanted := k < len(targets) && targets[k].at == at
		switch {
		case wanted && targets[k].axis >= 0:
			if !r.number(&row[k]) {
				return r.want(fmt.Sprintf("the %s of vertex %d", p.name, i))
			}
		case wanted:
			w := r.word()
			v, err := strconv.ParseFloat(string(w), 64)
			if err != nil && !math.IsInf(v, 0) {
				return r.wantWord(w, fmt.Sprintf("the %s of vertex %d", p.name, i))
			}
			row[k] = v
		default:
			if err := r.passWords(p); err != nil {
				return err
			}
		}
		if wanted {
			k++
		}
	}
	r.endRow()
	return nil
}

// passWords passes over a property in a line of text.
func (r *plyReader) passWords(p property) error {
	n := int64(1)
	if p.list && !r.whole(&n, 0, math.MaxInt64) {
		return r.want(fmt.Sprintf("the length of the list %q", p.name))
	}
	for range n {
		if w := r.word(); len(w) == 0 {
			return r.wantWord(w, fmt.Sprintf("a value of the property %q", p.name))
		}
	}
	return nil
}

// binaryVertex reads row i of the element vertex from bytes.
func (r *plyReader) binaryVertex(e *element, i int64, targets []target, row []float64) error {
	order := r.header.order
	width := e.width(len(e.properties))
	if width >= 0 && width <= len(r.buf) {
		b := r.bytes(width)
		if b == nil {
			return r.want(fmt.Sprintf("vertex %d of the %d that the header declares", i, e.count))
		}
		for k, t := range targets {
			row[k] = t.scalar.at(b[t.offset:], order)
			if t.axis >= 0 && row[k]-row[k] != 0 {
				r.pos -= width - t.offset
				return r.notFinite(t.name, i, row[k])
			}
		}
		return nil
	}
	k := 0
	for at, p := range e.properties {
		if k == len(targets) || targets[k].at != at {
			if err := r.passBytes(p); err != nil {
				return err
			}
			continue
		}
		b := r.bytes(scalarSize[p.scalar])
		if b == nil {
			return r.want(fmt.Sprintf("the %s of vertex %d", p.name, i))
		}
		row[k] = p.scalar.at(b, order)
		if targets[k].axis >= 0 && row[k]-row[k] != 0 {
			r.pos -= len(b)
			return r.notFinite(p.name, i, row[k])
		}
		k++
	}
	return nil
}

func (r *plyReader) notFinite(name string, i int64, v float64) error {
	r.got = fmt.Sprint(v)
	return r.want(fmt.Sprintf("a finite %s of vertex %d", name, i))
}

// length reads the length of a binary list; false, with got set, if there is none.
func (r *plyReader) length(p property) (n int64, ok bool) {
	b := r.bytes(scalarSize[p.count])
	if b == nil {
		return 0, false
	}
	n = p.count.whole(b, r.header.order)
	if n < 0 {
		r.pos -= len(b)
		r.got = fmt.Sprint(n)
	}
	return n, n >= 0
}

// passBytes passes over a property in binary data.
func (r *plyReader) passBytes(p property) error {
	n := int64(1)
	if p.list {
		var ok bool
		if n, ok = r.length(p); !ok {
			return r.want(fmt.Sprintf("the length of the list %q", p.name))
		}
	}
	bytes := uint64(n) * uint64(scalarSize[p.scalar]) // below 2^35
	if r.skip(bytes) < bytes {
		r.got = "end of file"
		return r.want(fmt.Sprintf("the values of the property %q", p.name))
	}
	return nil
}

// readFaces reads the element face.
func (r *plyReader) readFaces(e *element) error {
	at := e.find("vertex_indices")
	if at < 0 {
		at = e.find("vertex_index")
	}
	if at < 0 || !e.properties[at].list || e.properties[at].scalar.isFloat() {
		return &SyntaxError{File: r.file, Line: e.line,
			Want: `an integer list "vertex_indices" or "vertex_index" in the element face`, Got: "none"}
	}
	f := face{soup: r.soup}
	for i := range e.count {
		r.soup.Triangles = room(r.soup.Triangles, 3, 3*e.count) // larger faces take more, by doubling
		f.begin()
		var err error
		if r.header.order == nil {
			err = r.textFace(e, i, at, &f)
		} else {
			err = r.binaryFace(e, i, at, &f)
		}
		if err != nil {
			return err
		}
	}
	f.done()
	return nil
}

// textFace reads row i of the element face from a line of text.
func (r *plyReader) textFace(e *element, i int64, at int, f *face) error {
	if err := r.row(e, i); err != nil {
		return err
	}
	for k, p := range e.properties {
		if k != at {
			if err := r.passWords(p); err != nil {
				return err
			}
			continue
		}
		var n, v int64
		if !r.whole(&n, 0, math.MaxInt64) {
			return r.want(fmt.Sprintf("the number of corners of face %d", i))
		}
		for range n {
			if !r.whole(&v, 0, r.vertices-1) {
				return r.want(vertexRange(r.vertices))
			}
			if !f.corner(int32(v)) {
				return r.tooMany()
			}
		}
	}
	f.end(r.source)
	r.endRow()
	return nil
}

// binaryFace reads row i of the element face from bytes.
func (r *plyReader) binaryFace(e *element, i int64, at int, f *face) error {
	order := r.header.order
	for k, p := range e.properties {
		if k != at {
			if err := r.passBytes(p); err != nil {
				return err
			}
			continue
		}
		left, ok := r.length(p)
		if !ok {
			return r.want(fmt.Sprintf("the number of corners of face %d of the %d that the header declares", i, e.count))
		}
		size := scalarSize[p.scalar]
		for left > 0 {
			b := r.bytes(size * int(min(left, 4096)))
			if b == nil {
				return r.want(fmt.Sprintf("%d more corners of face %d", left, i))
			}
			for len(b) > 0 {
				v := p.scalar.whole(b, order)
				if v < 0 || v >= r.vertices {
					r.pos -= len(b)
					r.got = fmt.Sprint(v)
					return r.want(vertexRange(r.vertices))
				}
				if !f.corner(int32(v)) {
					return r.tooMany()
				}
				b = b[size:]
				left--
			}
		}
	}
	f.end(r.source)
	return nil
}

// passOver passes over an element.
func (r *plyReader) passOver(e *element) error {
	if len(e.properties) == 0 {
		return nil
	}
	if r.header.order == nil {
		for i := range e.count {
			if err := r.row(e, i); err != nil {
				return err
			}
			r.nextLine()
		}
		return nil
	}
	if width := e.width(len(e.properties)); width >= 0 {
		high, bytes := bits.Mul64(uint64(width), uint64(e.count))
		if high > 0 {
			bytes = math.MaxUint64
		}
		if r.skip(bytes) < bytes {
			r.got = "end of file"
			return r.want(fmt.Sprintf("the %d elements %q that the header declares", e.count, e.name))
		}
		return nil
	}
	for range e.count {
		for _, p := range e.properties {
			if err := r.passBytes(p); err != nil {
				return err
			}
		}
	}
	return nil
}
