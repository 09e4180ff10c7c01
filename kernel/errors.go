package kernel

import "fmt"

// A TimeError is a time that heat cannot be asked for.
type TimeError struct {
	Index int // among the times given
	Time  float64
}

func (e *TimeError) Error() string {
	return fmt.Sprintf("time %g (number %d): want a finite time above 0", e.Time, e.Index+1)
}

// An OptionError is an option out of its range.
type OptionError struct {
	Option string // its name, in lower case
	Want   string
	Got    string
}

func (e *OptionError) Error() string {
	return fmt.Sprintf("%s: want %s, got %s", e.Option, e.Want, e.Got)
}

// A LoadError is an amount of heat that cannot be put where it was asked for.
type LoadError struct {
	Vertex int // -1: the load as a whole
	Amount float64
	Reason string
}

func (e *LoadError) Error() string {
	if e.Vertex < 0 {
		return "heat at the source: " + e.Reason
	}
	return fmt.Sprintf("heat %g at vertex %d: %s", e.Amount, e.Vertex, e.Reason)
}

// An OperatorError is a vertex at which the surface has no usable area or weights: a
// triangle there is flat to the last digit.
type OperatorError struct {
	Vertex       int
	Area, Weight float64 // entries of M and L there
}

func (e *OperatorError) Error() string {
	return fmt.Sprintf("vertex %d: area %g and weight %g; want finite numbers, the area above 0: a triangle there is flat to the last digit (weld or refine the mesh)", e.Vertex, e.Area, e.Weight)
}
