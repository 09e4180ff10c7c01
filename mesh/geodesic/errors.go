package geodesic

import "fmt"

// A DatumError is a source or target that does not fit the mesh.
type DatumError struct {
	Name      string // of the datum, as the user asked for it
	Want, Got string
}

func (e *DatumError) Error() string {
	name := e.Name
	if name == "" {
		name = "datum"
	}
	return fmt.Sprintf("%s: want %s, got %s", name, e.Want, e.Got)
}

// A SizeError is a mesh so large or so small that products of four lengths leave the
// range of numbers.
type SizeError struct{ Extent float64 }

func (e *SizeError) Error() string {
	return fmt.Sprintf("exact distances: want a mesh between 1e-70 and 1e70 across, got one of %g; scale it", e.Extent)
}

// A MemoryError is a wave that would have outgrown Options.MaxBytes. Distances up to
// Reach were done.
type MemoryError struct {
	Bytes, Limit int64
	Reach        float64
}

func (e *MemoryError) Error() string {
	return fmt.Sprintf("exact distances: want at most %d bytes of working memory, got to distance %g with %d; "+
		"raise the limit or set a radius", e.Limit, e.Reach, e.Bytes)
}

// A StallError is a wave that crossed every triangle many times over and came no
// farther: triangles so thin that round-off alone moves the wave about in them.
type StallError struct {
	Reach float64 // distances up to here were done
}

func (e *StallError) Error() string {
	return fmt.Sprintf("exact distances: want the wave to go on, got no farther than %g; "+
		"weld the triangles that are thinner than round-off", e.Reach)
}

// A TraceError is a shortest line that could not be drawn to its length: on a mesh so
// twisted or so flat in places that round-off leads the line astray.
type TraceError struct {
	Distance float64 // the distance, found by propagation
	Length   float64 // of the line drawn, 0 if it did not arrive
}

func (e *TraceError) Error() string {
	return fmt.Sprintf("shortest line: want length %g, got a line of %g; the distance itself stands", e.Distance, e.Length)
}
