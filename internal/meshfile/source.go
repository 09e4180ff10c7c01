package meshfile

import (
	"context"
	"fmt"
	"io"
	"sync"
)

// bufferSize is one read. Larger did not read faster (BenchmarkBinarySTL: 256 KiB
// to 4 MiB alike); it also bounds how far apart two looks at the context are, how
// far ahead sniff can see, and the longest word of a text file.
const bufferSize = 1 << 20

// A source hands out a file's content from one fixed buffer: as bytes for the
// binary formats (ensure, then buf[pos:end]), as words and lines for the others.
// The first error is kept in err, and want prefers it to any complaint of its own,
// so callers need not ask after each step.
//
// Words are separated by blanks; LF, CR LF and a lone CR end a line; "#" at a
// word's start makes the rest of the line a comment. Words are slices of the
// buffer, good until the next call.
type source struct {
	ctx       context.Context
	file      string
	r         io.Reader
	buf       []byte
	pos, end  int   // what is unread
	base      int64 // offset of buf[0] in the content
	eof       bool
	err       error
	line      int    // from 1; 0 while the content is binary
	continues bool   // "\" before a line's end joins the next line (OBJ)
	got       string // what stood where number, integer or word failed
}

func newSource(ctx context.Context, file string, r io.Reader, buffer []byte) *source {
	return &source{ctx: ctx, file: file, r: r, buf: buffer}
}

// buffers keeps buffers from one file to the next, for runs over thousands of parts.
var buffers = sync.Pool{New: func() any { return new([bufferSize]byte) }}

// fill reads more behind what is unread, and tells whether there was any.
func (s *source) fill() bool {
	if s.eof || s.err != nil {
		return false
	}
	if s.pos > 0 {
		copy(s.buf, s.buf[s.pos:s.end])
		s.base += int64(s.pos)
		s.end -= s.pos
		s.pos = 0
	}
	if s.end == len(s.buf) {
		return false
	}
	if s.err = s.ctx.Err(); s.err != nil {
		return false
	}
	for range 100 { // as bufio does: a reader may return nothing, but not for ever
		n, err := s.r.Read(s.buf[s.end:])
		s.end += n
		switch {
		case err == io.EOF:
			s.eof = true
		case err != nil:
			s.err = err
			if _, placed := s.r.(*unzipper); !placed && s.ctx.Err() == nil {
				s.err = fmt.Errorf("%s: byte %d: %w", s.file, s.base+int64(s.end), err)
			}
		case n == 0:
			continue
		}
		return n > 0
	}
	s.err = fmt.Errorf("%s: byte %d: %w", s.file, s.offset(), io.ErrNoProgress)
	return false
}

// ensure tells whether n more bytes are there, n being at most the buffer's size.
func (s *source) ensure(n int) bool {
	for s.end-s.pos < n {
		if !s.fill() {
			return s.end-s.pos >= n
		}
	}
	return true
}

// offset is the place in the content of the next unread byte.
func (s *source) offset() int64 { return s.base + int64(s.pos) }

// skip drops n bytes and returns how many of them were there.
func (s *source) skip(n uint64) uint64 {
	left := n
	for left > 0 && s.ensure(1) {
		k := min(left, uint64(s.end-s.pos))
		s.pos += int(k)
		left -= k
	}
	return n - left
}

const (
	inWord = iota
	blank
	newline
)

// class sorts bytes. What is no blank belongs to a word, so that control bytes are
// seen and complained about.
var class = [256]uint8{' ': blank, '\t': blank, '\v': blank, '\f': blank, '\n': newline, '\r': newline}

// blanks goes on to the next word of this line, and is false if there is none.
func (s *source) blanks() bool {
	for {
		for s.pos < s.end {
			c := s.buf[s.pos]
			switch class[c] {
			case blank:
				s.pos++
				continue
			case newline:
				return false
			}
			if c == '#' {
				return false
			}
			if c == '\\' && s.joined(0) {
				s.pos++
				s.endLine()
				continue
			}
			return true
		}
		if !s.fill() {
			return false
		}
	}
}

// joined tells whether the backslash n bytes ahead joins this line to the next.
func (s *source) joined(n int) bool {
	return s.continues && s.ensure(n+2) && class[s.buf[s.pos+n+1]] == newline
}

// endLine takes the line's end, at which the source stands.
func (s *source) endLine() {
	cr := s.buf[s.pos] == '\r'
	s.pos++
	if cr && s.ensure(1) && s.buf[s.pos] == '\n' {
		s.pos++
	}
	s.line++
}

// word is the next word of this line, empty if there is none.
func (s *source) word() []byte {
	if !s.blanks() {
		return nil
	}
	n := 0
	for {
		for s.pos+n < s.end {
			c := s.buf[s.pos+n]
			if class[c] != inWord || c == '\\' && s.joined(n) {
				w := s.buf[s.pos : s.pos+n]
				s.pos += n
				return w
			}
			n++
		}
		if !s.fill() {
			break
		}
	}
	if s.err == nil && !s.eof {
		s.got = quote(s.buf[s.pos:s.end])
		s.err = s.want(fmt.Sprintf("a word of less than %d bytes", len(s.buf)))
	}
	w := s.buf[s.pos:s.end]
	s.pos = s.end
	return w
}

// nextLine drops the rest of this line, and is false if no line follows.
func (s *source) nextLine() bool {
	comment := false // where a backslash joins nothing
	for {
		for s.pos < s.end {
			c := s.buf[s.pos]
			if class[c] == newline {
				s.endLine()
				return s.ensure(1)
			}
			if c == '\\' && !comment && s.joined(0) {
				s.pos++
				s.endLine()
				continue
			}
			comment = comment || c == '#'
			s.pos++
		}
		if !s.fill() {
			return false
		}
	}
}

// nextWord is the next word of the file, on whatever line, empty at the file's end.
func (s *source) nextWord() []byte {
	for {
		if w := s.word(); len(w) > 0 {
			return w
		}
		if !s.nextLine() {
			return nil
		}
	}
}

// sawWord notes what was found where something else belonged, for want.
func (s *source) sawWord(w []byte) {
	switch {
	case len(w) > 0:
		s.got = quote(w)
	case s.ensure(1):
		s.got = "end of line"
	default:
		s.got = "end of file"
	}
}

// want is the error for what was last noted in got: the first trouble of the
// source itself, if there was any.
func (s *source) want(want string) error {
	if s.err != nil {
		return s.err
	}
	return &SyntaxError{File: s.file, Line: s.line, Offset: s.offset(), Want: want, Got: s.got}
}

// wantWord is want for a word in hand.
func (s *source) wantWord(w []byte, want string) error {
	s.sawWord(w)
	return s.want(want)
}
