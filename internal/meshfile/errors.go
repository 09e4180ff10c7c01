package meshfile

import (
	"fmt"
	"strconv"
	"strings"
)

// A SyntaxError says where a file stopped making sense, and what belongs there.
type SyntaxError struct {
	File      string // as the user named it; "-" is standard input
	Line      int    // from 1; 0 in a binary format
	Offset    int64  // bytes from the start of the content, after decompression
	Want, Got string // "a vertex number from 0 to 2"; `"3"`, or "end of file"
}

func (e *SyntaxError) Error() string {
	place := fmt.Sprintf("%s: byte %d", e.File, e.Offset)
	if e.Line > 0 {
		place = fmt.Sprintf("%s:%d", e.File, e.Line)
	}
	return fmt.Sprintf("%s: want %s, got %s", place, e.Want, e.Got)
}

// A NoTrianglesError is a file that is well formed and holds no surface.
type NoTrianglesError struct {
	File, Format string
	Vertices     int
}

func (e *NoTrianglesError) Error() string {
	return fmt.Sprintf("%s: want at least one triangle, got none (%s file with %d vertices)",
		e.File, strings.ToUpper(e.Format), e.Vertices)
}

// A FormatError is a format asked for by a name that is none of Formats.
type FormatError struct{ Format string }

func (e *FormatError) Error() string {
	return fmt.Sprintf("want a mesh format out of %s, got %q", strings.Join(Formats, ", "), e.Format)
}

// quote shows bytes of a file in a message, cut to a length that one line can hold.
func quote(b []byte) string {
	if len(b) > 40 {
		return strconv.QuoteToASCII(string(b[:40])) + "..."
	}
	return strconv.QuoteToASCII(string(b))
}
