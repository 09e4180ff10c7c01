package cli

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"strings"

	"github.com/spf13/pflag"

	"heatskin/mesh"
)

// sourceFlags are the places that distance is measured from or heat is put into:
// --at-vertex --at-point --at-file --at-boundary --at-crease, in the order in which
// they stand on the command line. A command that has another end registers a second
// group under the word "to". Loops that something is done to are such a group, too:
// "hold", "lose".
type sourceFlags struct {
	word  string // "at", "to", "hold" or "lose"
	asked []asked
	files []string // tables of points
}

// asked is one source flag: how to find its place on a mesh. original is the mesh as
// it was read, whose numbers the user knows; part is the one computed on, which has
// the same shape and begins with the same vertices.
type asked func(ctx context.Context, p *placer) ([]mesh.Datum, error)

// A placer holds what finding places on a mesh needs, each made on first use.
type placer struct {
	original, part *mesh.Mesh
	locator        *mesh.Locator
	loops          []mesh.Loop // of original
}

func (s *sourceFlags) register(flags *pflag.FlagSet, word string) {
	s.word = word
	add := func(name, usage string, parse func(text string) (asked, error)) {
		varFunc(flags, word+"-"+name, "", usage+" (repeatable)", func(text string) error {
			place, err := parse(text)
			if err == nil && name == "file" {
				s.files = append(s.files, text)
			}
			if err == nil {
				s.asked = append(s.asked, place)
			}
			return err
		})
	}
	add("vertex", "vertex `N`", atVertex)
	add("point", "the point of the surface nearest to `X,Y,Z`", atPoint)
	add("file", "the points in `FILE.csv`, columns x,y,z", atFile)
	add("boundary", "boundary loop `K` as check numbers them; 0 is the longest", atBoundary)
	add("crease", "every edge whose faces meet at a sharper angle than `DEGREES` (flat = 0)", atCrease)
}

// want is the error of a command line without any source.
func (s *sourceFlags) want(command string) error {
	if len(s.asked) > 0 {
		return nil
	}
	what := "source"
	if s.word == "to" {
		what = "target"
	}
	return usagef("%s: want a %[3]s: --%[2]s-vertex N, --%[2]s-point X,Y,Z, --%[2]s-file FILE.csv, --%[2]s-boundary K or --%[2]s-crease DEGREES",
		command, s.word, what)
}

// place finds every source on part and tells how far off it lies.
func (s *sourceFlags) place(ctx context.Context, j *job, original, part *mesh.Mesh, unit *meshFlags) ([]mesh.Datum, error) {
	data, err := s.find(ctx, original, part)
	list := j.summary.places(s.word)
	for _, d := range data {
		*list = append(*list, sourceSummary{d.Name, number(d.Gap)})
		if d.Gap > 1e-7*reach(part) { // single precision may move a point by that much
			j.note("%s lies %s off the surface", d.Name, unit.length(d.Gap))
		}
	}
	return data, err
}

// find finds every source on part, which is original or a refinement of it.
func (s *sourceFlags) find(ctx context.Context, original, part *mesh.Mesh) (data []mesh.Datum, err error) {
	p := &placer{original: original, part: part}
	for _, find := range s.asked {
		found, err := find(ctx, p)
		if err != nil {
			return nil, refuse(err)
		}
		data = append(data, found...)
	}
	return data, nil
}

// reach is the largest coordinate of m.
func reach(m *mesh.Mesh) (largest float64) {
	for _, x := range m.Positions {
		largest = max(largest, math.Abs(x))
	}
	return largest
}

func atVertex(text string) (asked, error) {
	n, err := whole(text, 0)
	if err != nil {
		return nil, err
	}
	return func(_ context.Context, p *placer) ([]mesh.Datum, error) {
		if n >= p.original.NumVertices() {
			return nil, fmt.Errorf("vertex %d: want a vertex number from 0 to %d", n, p.original.NumVertices()-1)
		}
		d := mesh.AtVertex(int32(n))
		d.Name = fmt.Sprintf("vertex %d", n)
		return []mesh.Datum{d}, nil
	}, nil
}

func atPoint(text string) (asked, error) {
	words := strings.Split(text, ",")
	if len(words) != 3 {
		return nil, errors.New("want three numbers X,Y,Z")
	}
	var x [3]float64
	for axis, word := range words {
		var err error
		if x[axis], err = finite(word); err != nil {
			return nil, err
		}
	}
	return func(_ context.Context, p *placer) ([]mesh.Datum, error) {
		return []mesh.Datum{p.nearest(x, "point "+text)}, nil
	}, nil
}

func atFile(name string) (asked, error) {
	if name == "" {
		return nil, errors.New("want the name of a CSV file with columns x,y,z")
	}
	var points [][3]float64 // read once: the file may be a pipe
	return func(_ context.Context, p *placer) ([]mesh.Datum, error) {
		if points == nil {
			var err error
			if points, err = readPoints(name); err != nil {
				return nil, err
			}
		}
		data := make([]mesh.Datum, len(points))
		for i, x := range points {
			data[i] = p.nearest(x, fmt.Sprintf("%s row %d", name, i+1))
		}
		return data, nil
	}, nil
}

func atBoundary(text string) (asked, error) {
	k, err := whole(text, 0)
	if err != nil {
		return nil, err
	}
	return func(_ context.Context, p *placer) ([]mesh.Datum, error) {
		loop, err := p.loop(k)
		if err != nil {
			return nil, err
		}
		d := mesh.AtEdges(loop.Edges())
		d.Name = fmt.Sprintf("boundary loop %d", k)
		return []mesh.Datum{d}, nil
	}, nil
}

func atCrease(text string) (asked, error) {
	degrees, err := finite(text)
	if err != nil {
		return nil, err
	}
	if degrees < 0 || degrees >= 180 {
		return nil, errors.New("want a bend angle from 0 to below 180 degrees")
	}
	return func(_ context.Context, p *placer) ([]mesh.Datum, error) {
		edges := mesh.Creases(p.part, degrees)
		if len(edges) == 0 {
			return nil, fmt.Errorf("crease of more than %s degrees: no edge of the mesh is that sharp; check prints the bend angles", text)
		}
		d := mesh.AtEdges(edges)
		d.Name = fmt.Sprintf("creases sharper than %s degrees", text)
		return []mesh.Datum{d}, nil
	}, nil
}

// nearest is the datum of the surface point nearest to x.
func (p *placer) nearest(x [3]float64, name string) mesh.Datum {
	if p.locator == nil {
		p.locator = mesh.NewLocator(p.part)
	}
	point, gap := p.locator.Nearest(x)
	d := mesh.AtPoint(point)
	d.Name, d.Gap = name, gap
	return d
}

// loop is boundary loop k of the mesh as it was read, as it runs on the refined one.
// Refinement may change the order of loops that are equally long but for round-off,
// so the loop is found again by its vertices, not by its number.
func (p *placer) loop(k int) (mesh.Loop, error) {
	if p.loops == nil {
		p.loops = mesh.BoundaryLoops(p.original)
	}
	switch n := len(p.loops); {
	case n == 0:
		return mesh.Loop{}, fmt.Errorf("boundary loop %d: the surface is closed, it has no boundary", k)
	case k >= n:
		return mesh.Loop{}, fmt.Errorf("boundary loop %d: want a loop number from 0 to %d", k, n-1)
	}
	coarse := p.loops[k]
	if p.part == p.original {
		return coarse, nil
	}
	wanted := make(map[int32]bool, len(coarse.Vertices))
	for _, v := range coarse.Vertices {
		wanted[v] = true
	}
	for _, fine := range mesh.BoundaryLoops(p.part) {
		met := 0
		for _, v := range fine.Vertices {
			if wanted[v] {
				met++
			}
		}
		if met >= len(wanted) {
			return fine, nil
		}
	}
	return mesh.Loop{}, fmt.Errorf("boundary loop %d is not whole on the refined mesh; try --max-edge none", k)
}

// openInput opens a table that the user named.
func openInput(name string) (*os.File, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	if info, err := f.Stat(); err == nil && info.IsDir() {
		f.Close()
		return nil, fmt.Errorf("%s: want a file, got a directory", name)
	}
	return f, nil
}
