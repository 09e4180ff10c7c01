package meshfile

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
)

// A scalar is a PLY number type; its size in bytes is scalarSize.
type scalar uint8

const (
	int8Type scalar = iota
	uint8Type
	int16Type
	uint16Type
	int32Type
	uint32Type
	float32Type
	float64Type
)

var scalarSize = [...]int{1, 1, 2, 2, 4, 4, 4, 8}

// scalarNames are Turk's names and the later ones that tell their width.
var scalarNames = map[string]scalar{
	"char": int8Type, "uchar": uint8Type, "short": int16Type, "ushort": uint16Type,
	"int": int32Type, "uint": uint32Type, "float": float32Type, "double": float64Type,
	"int8": int8Type, "uint8": uint8Type, "int16": int16Type, "uint16": uint16Type,
	"int32": int32Type, "uint32": uint32Type, "float32": float32Type, "float64": float64Type,
}

func (t scalar) isFloat() bool { return t >= float32Type }

// at reads the number that begins b.
func (t scalar) at(b []byte, order binary.ByteOrder) float64 {
	switch t {
	case float32Type:
		return float64(math.Float32frombits(order.Uint32(b)))
	case float64Type:
		return math.Float64frombits(order.Uint64(b))
	default:
		return float64(t.whole(b, order))
	}
}

// whole is at for the integer types.
func (t scalar) whole(b []byte, order binary.ByteOrder) int64 {
	switch t {
	case int8Type:
		return int64(int8(b[0]))
	case uint8Type:
		return int64(b[0])
	case int16Type:
		return int64(int16(order.Uint16(b)))
	case uint16Type:
		return int64(order.Uint16(b))
	case int32Type:
		return int64(int32(order.Uint32(b)))
	case uint32Type:
		return int64(order.Uint32(b))
	}
	panic("meshfile: whole of a float type")
}

// A property is one scalar of an element, or a list of them with its length before.
type property struct {
	name   string
	list   bool
	count  scalar // of a list's length
	scalar scalar
}

// An element is a table of a PLY file: count rows of the same properties.
type element struct {
	name       string
	count      int64
	line       int // of the header
	properties []property
}

// A plyHeader is what stands before the data. order is nil for ASCII.
type plyHeader struct {
	order    binary.ByteOrder
	elements []element
}

// find is the element of that name, or nil.
func (h *plyHeader) find(name string) *element {
	for i := range h.elements {
		if h.elements[i].name == name {
			return &h.elements[i]
		}
	}
	return nil
}

// find is the place of the property of that name, or -1.
func (e *element) find(name string) int {
	for i := range e.properties {
		if e.properties[i].name == name {
			return i
		}
	}
	return -1
}

// readPLYHeader reads up to and with the line "end_header", and leaves s at the
// first byte of the data.
func readPLYHeader(s *source) (*plyHeader, error) {
	h := &plyHeader{}
	if w := s.nextWord(); !bytes.Equal(w, []byte("ply")) {
		return nil, s.wantWord(w, `"ply"`)
	}
	// Where lines end in a lone CR, a data byte 10 after the last one is data, though
	// it looks like the rest of a CR LF. So the first line's end decides for the last.
	loneCR := s.ensure(2) && s.buf[s.pos] == '\r' && s.buf[s.pos+1] != '\n'
	formatSeen := false
	for {
		if !s.nextLine() {
			s.sawWord(nil)
			return nil, s.want(`"end_header"`)
		}
		w := s.word()
		switch string(w) {
		case "", "comment", "obj_info":
		case "format":
			formatSeen = true
			switch w = s.word(); string(w) {
			case "ascii":
			case "binary_little_endian":
				h.order = binary.LittleEndian
			case "binary_big_endian":
				h.order = binary.BigEndian
			default:
				return nil, s.wantWord(w, "the format ascii, binary_little_endian or binary_big_endian")
			}
			if w = s.word(); !bytes.Equal(w, []byte("1.0")) {
				return nil, s.wantWord(w, "version 1.0")
			}
		case "element":
			name := s.word()
			if len(name) == 0 {
				return nil, s.wantWord(name, "an element's name")
			}
			e := element{name: string(name), line: s.line}
			if h.find(e.name) != nil {
				return nil, s.wantWord([]byte(e.name), "another element (it is declared already)")
			}
			limit := int64(math.MaxInt64)
			if e.name == "vertex" || e.name == "face" {
				limit = maxVertices
			}
			if !s.whole(&e.count, 0, limit) {
				return nil, s.want(fmt.Sprintf("the number of %q elements, 0 to %d", e.name, limit))
			}
			h.elements = append(h.elements, e)
		case "property":
			if len(h.elements) == 0 {
				return nil, s.wantWord(w, `"element" before "property"`)
			}
			e := &h.elements[len(h.elements)-1]
			p, err := readProperty(s)
			if err != nil {
				return nil, err
			}
			if (e.name == "vertex" || e.name == "face") && e.find(p.name) >= 0 {
				return nil, s.wantWord([]byte(p.name), "another property (it is declared already)")
			}
			e.properties = append(e.properties, p)
		case "end_header":
			if !formatSeen {
				return nil, s.wantWord(w, `"format"`)
			}
			if h.order == nil {
				s.nextLine()
				return h, nil
			}
			for s.blanks() {
				s.word()
			}
			if s.ensure(1) {
				s.pos++
				if !loneCR && s.buf[s.pos-1] == '\r' && s.ensure(1) && s.buf[s.pos] == '\n' {
					s.pos++
				}
			}
			s.line = 0 // what follows is binary
			return h, nil
		default:
			return nil, s.wantWord(w, `"element", "property", "comment" or "end_header"`)
		}
	}
}

// readProperty reads what follows "property".
func readProperty(s *source) (p property, err error) {
	const types = "a type (char, uchar, short, ushort, int, uint, float or double)"
	var ok bool
	w := s.word()
	if bytes.Equal(w, []byte("list")) {
		p.list = true
		w = s.word()
		if p.count, ok = scalarNames[string(w)]; !ok || p.count.isFloat() {
			return p, s.wantWord(w, "an integer type for the list's length")
		}
		w = s.word()
	}
	if p.scalar, ok = scalarNames[string(w)]; !ok {
		return p, s.wantWord(w, types)
	}
	if w = s.word(); len(w) == 0 {
		return p, s.wantWord(w, "a property's name")
	}
	p.name = string(w)
	return p, nil
}
