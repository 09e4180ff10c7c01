package cli

import (
	"context"
	"errors"
	"math"
	"strconv"

	"github.com/spf13/pflag"

	"heatskin/mesh"
)

// meshFlags tell how the mesh is read: --format --weld --unit, and how it is measured.
type meshFlags struct {
	format string
	weld   float64 // NaN: as the format has it
	unit   string
	metric string // file; "": that of space
	tensor string
	kind   tensorKind
}

func (m *meshFlags) register(flags *pflag.FlagSet) {
	oneOfVar(flags, &m.format, "format", "", []string{"stl", "ply", "obj", "off"},
		"`stl|ply|obj|off`, needed for standard input; otherwise the content tells")
	m.weld = math.NaN()
	varFunc(flags, "weld", "", "join corners that lie within `LENGTH` of each other; 0 joins equal ones",
		func(text string) error {
			x, err := finite(text)
			if err == nil && x < 0 {
				err = errors.New("want a length of at least 0")
			}
			if err == nil {
				m.weld = x
			}
			return err
		})
	oneOfVar(flags, &m.unit, "unit", "", []string{"mm", "cm", "m", "um", "in"},
		"`mm|cm|m|um|in`, the file's length unit: labels results, converts nothing")
}

// load reads the mesh that the user named and passes on what was odd about it.
func (m *meshFlags) load(ctx context.Context, j *job, name string) (*mesh.Mesh, error) {
	if name == "-" && m.format == "" {
		return nil, usagef("-: a mesh from standard input needs --format stl, ply, obj or off")
	}
	if m.metric != "" && m.tensor != "" {
		return nil, usagef("--metric and --tensor: choose one")
	}
	j.clock.enter("read")
	makeRoom(name)
	part, err := mesh.Load(ctx, name, j.std.In, mesh.LoadOptions{Format: m.format, Weld: m.weld})
	if err != nil {
		return nil, refuse(err)
	}
	for _, text := range part.File.Warnings {
		j.warn(name + ": " + text)
	}
	j.summary.Mesh = &meshSummary{
		File:     part.File.Name,
		Format:   part.File.Format,
		SHA256:   part.File.SHA256,
		Bytes:    part.File.Bytes,
		Vertices: part.NumVertices(),
		Faces:    part.NumTriangles(),
		Unit:     m.unit,
	}
	return part, m.measure(part)
}

// refineFlags tell how finely the faces are cut for the computation, and whether
// the added vertices are shown: --max-edge --keep-refined.
type refineFlags struct {
	maxEdge float64 // 0: as the computation needs; +Inf: not at all
	keep    bool
}

func (r *refineFlags) register(flags *pflag.FlagSet) {
	varFunc(flags, "max-edge", "", "compute on faces cut until no edge is longer than `LENGTH`; none leaves them alone (default: as needed)",
		func(text string) error {
			if text == "none" {
				r.maxEdge = math.Inf(1)
				return nil
			}
			x, err := positive(text)
			if err != nil {
				return errors.New("want a length above 0, or none")
			}
			r.maxEdge = x
			return nil
		})
	flags.BoolVar(&r.keep, "keep-refined", false, "results on the refined mesh, with the vertices that were added")
}

// perUnit puts the user's unit behind a length, if one was given.
func (m *meshFlags) length(x float64) string {
	text := strconv.FormatFloat(x, 'g', 6, 64)
	if m.unit != "" {
		text += " " + m.unit
	}
	return text
}
