package cli

import (
	"encoding/json"
	"io"
	"math"

	"heatskin/mesh"
)

// A summary is what --summary writes: what was run, on which mesh, how long it took
// and what was checked. Its keys are part of the program's contract.
type summary struct {
	Version         string            `json:"version"`
	Command         string            `json:"command"`
	Arguments       []string          `json:"arguments"`
	Options         map[string]string `json:"options"` // flags with the values in force
	Mesh            *meshSummary      `json:"mesh,omitempty"`
	Sources         []sourceSummary   `json:"sources,omitempty"`
	Targets         []sourceSummary   `json:"targets,omitempty"`
	Held            []sourceSummary   `json:"held,omitempty"`
	Losing          []sourceSummary   `json:"losing,omitempty"`
	Stages          []stage           `json:"stages"`
	PeakMemoryBytes int64             `json:"peak_memory_bytes"`
	Warnings        []string          `json:"warnings"`

	Matrix *matrixSummary `json:"matrix,omitempty"`

	Solves int `json:"solves,omitempty"` // linear systems solved

	*distanceSummary
	*kernelSummary
	*pathSummary
	*modesSummary
	*passageSummary
	*steadySummary
	Check *mesh.Report `json:"check,omitempty"`
}

// meshSummary is the mesh as it was read, and what the computation made of it.
type meshSummary struct {
	File       string `json:"file"`
	Format     string `json:"format"`
	SHA256     string `json:"sha256"` // of the bytes as they lay on disk
	Bytes      int64  `json:"bytes"`
	Vertices   int    `json:"vertices"`
	Faces      int    `json:"faces"`
	Components int    `json:"components"`
	Area       number `json:"area"`
	Unit       string `json:"unit,omitempty"`

	ComputedVertices int `json:"computed_vertices,omitempty"` // after refinement
	ComputedFaces    int `json:"computed_faces,omitempty"`
}

// matrixSummary is how large the linear systems were.
type matrixSummary struct {
	Rows           int     `json:"rows"`
	Nonzeros       int64   `json:"nonzeros"` // of L, diagonal and both triangles
	FactorNonzeros int64   `json:"factor_nonzeros"`
	FactorFlops    float64 `json:"factor_flops"`
}

// sourceSummary is one source and how far off the surface it was asked for.
type sourceSummary struct {
	Name string `json:"name"`
	Gap  number `json:"gap"`
}

// places is the list for places of one word of the command line.
func (s *summary) places(word string) *[]sourceSummary {
	switch word {
	case "to":
		return &s.Targets
	case "hold":
		return &s.Held
	case "lose":
		return &s.Losing
	}
	return &s.Sources
}

// A number is null in JSON where it does not exist.
type number float64

func (x number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(x)) || math.IsInf(float64(x), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(x))
}

// write fills in what is known only at the end, and writes s as JSON.
func (s *summary) write(w io.Writer, c *clock) error {
	s.Stages = c.timed()
	s.PeakMemoryBytes = peakMemory()
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(s)
}
