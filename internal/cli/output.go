package cli

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"maps"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/pflag"

	"heatskin/internal/fieldfile"
	"heatskin/mesh"
)

// outputFlags say where results go: --out --probe --probe-out --summary.
type outputFlags struct {
	out      []string
	probe    string
	probeOut string
	summary  string
	kinds    []string // extensions that --out takes
	history  string   // probes over time, for a command that has times
	tables   []string // further CSV files that the command's own flags name

	points *probes // what --probe holds, once read
}

// A result is what a command found: fields over the vertices that it computed with,
// and the mesh to show them on.
type result struct {
	part   *mesh.Mesh         // computed on
	shown  *mesh.Mesh         // written; its vertices are the first of the fields
	fields []fieldfile.Column // by vertex
	probed []fieldfile.Column // fields at the probes, if they are not the linear ones
	tables []table

	// standard writes what standard output gets, for a command with a table of its
	// own; nil: the fields, unless --out takes them.
	standard func(io.Writer) error
}

// A table is a further file of a command.
type table struct {
	name  string
	write func(io.Writer) error
}

// fieldFormats are the kinds of file that --out writes, by extension.
var fieldFormats = map[string]func(io.Writer, *mesh.Mesh, []fieldfile.Column) error{
	".csv": writeCSV,
	".ply": fieldfile.WritePLY,
	".vtu": fieldfile.WriteVTU,
}

func writeCSV(w io.Writer, m *mesh.Mesh, fields []fieldfile.Column) error {
	return fieldfile.WriteCSV(w, m, m.NumVertices(), fields)
}

func (o *outputFlags) register(flags *pflag.FlagSet) {
	o.registerOut(flags, slices.Sorted(maps.Keys(fieldFormats)), "write the field to `FILE`, %s (repeatable); without it, CSV goes to standard output")
	flags.StringVar(&o.probe, "probe", "", "places to read the field at: `FILE.csv`, columns id,x,y,z")
	flags.StringVar(&o.probeOut, "probe-out", "", "the field at the probes, as `FILE.csv`")
	o.registerSummary(flags)
}

// registerOut adds --out alone, for files of some kinds.
func (o *outputFlags) registerOut(flags *pflag.FlagSet, kinds []string, usage string) {
	o.kinds = kinds
	flags.StringArrayVar(&o.out, "out", nil, fmt.Sprintf(usage, strings.Join(kinds, ", ")))
}

// registerSummary adds --summary alone, for a command without a field.
func (o *outputFlags) registerSummary(flags *pflag.FlagSet) {
	flags.StringVar(&o.summary, "summary", "", "what was run, on what, how long it took and what was checked, as `FILE.json`")
}

// prepare finds out what would keep the results from being written, before anything
// long is computed: names of no known kind, two results for one file, a directory
// that is not there, one of the inputs. It also reads the probes.
func (o *outputFlags) prepare(inputs ...string) error {
	for _, name := range o.out {
		if !slices.Contains(o.kinds, extension(name)) {
			return usagef("--out %s: want a name that ends in one of %s", name, strings.Join(o.kinds, ", "))
		}
	}
	if o.history != "" && o.probe == "" {
		return usagef("--history %s: want --probe FILE.csv too, which names the places", o.history)
	}
	if (o.probe == "") != (o.probeOut == "" && o.history == "") {
		return usagef("--probe FILE.csv and --probe-out FILE.csv go together: one names the places, the other takes the values")
	}
	for _, name := range append([]string{o.probeOut, o.history}, o.tables...) {
		if name != "" && extension(name) != ".csv" {
			return usagef("%s: this table is written as CSV, want a name that ends in .csv", name)
		}
	}
	seen := map[string]string{}
	for _, name := range append(inputs, o.probe) {
		if name != "" && name != "-" {
			seen[absolute(name)] = "an input"
		}
	}
	for _, name := range o.files() {
		key := absolute(name)
		if was := seen[key]; was != "" {
			return usagef("%s would be written over %s; choose another name", name, was)
		}
		seen[key] = "another result"
	}
	for _, name := range o.files() {
		if err := fieldfile.CheckWritable(name); err != nil {
			return err
		}
	}
	if o.probe != "" {
		var err error
		if o.points, err = readProbes(o.probe); err != nil {
			return refuse(err)
		}
	}
	return nil
}

// files are all files to be written.
func (o *outputFlags) files() []string {
	list := slices.Clone(o.out)
	for _, name := range append([]string{o.probeOut, o.history, o.summary}, o.tables...) {
		if name != "" {
			list = append(list, name)
		}
	}
	return list
}

// extension is that of a file's name, in lower case.
func extension(name string) string { return strings.ToLower(filepath.Ext(name)) }

func absolute(name string) string {
	if full, err := filepath.Abs(name); err == nil {
		return full
	}
	return name
}

// save writes everything that a command found, each file whole or not at all.
func (o *outputFlags) save(ctx context.Context, j *job, r *result) error {
	j.clock.enter("write")
	rows := r.shown.NumVertices()
	fields := make([]fieldfile.Column, len(r.fields))
	for i, f := range r.fields {
		fields[i] = fieldfile.Column{Name: f.Name, Values: f.Values[:rows]}
	}

	var pending []table
	for _, name := range o.out {
		write := fieldFormats[extension(name)]
		pending = append(pending, table{name, func(w io.Writer) error { return write(w, r.shown, fields) }})
	}
	if o.points != nil {
		o.points.read(r)
		if o.probeOut != "" {
			pending = append(pending, table{o.probeOut, o.points.write})
		}
		j.noteProbes(o.points)
	}
	pending = append(pending, r.tables...)
	if err := j.saveFiles(ctx, pending); err != nil {
		return err
	}
	if r.standard == nil && len(o.out) == 0 {
		r.standard = func(w io.Writer) error { return writeCSV(w, r.shown, fields) }
	}
	if r.standard != nil {
		if err := j.print(r.standard); err != nil {
			return err
		}
	}
	return o.saveSummary(ctx, j)
}

// saveSummary writes --summary, if it was asked for, with the last stage in it.
func (o *outputFlags) saveSummary(ctx context.Context, j *job) error {
	j.clock.stop()
	if o.summary == "" {
		return nil
	}
	return j.saveFiles(ctx, []table{{o.summary, func(w io.Writer) error { return j.summary.write(w, j.clock) }}})
}

// saveFiles puts files in place, one after the other.
func (j *job) saveFiles(ctx context.Context, files []table) error {
	for _, f := range files {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := fieldfile.Replace(f.name, f.write); err != nil {
			return err
		}
	}
	return nil
}

// print writes to standard output.
func (j *job) print(write func(io.Writer) error) error {
	w := bufio.NewWriterSize(j.std.Out, 1<<16)
	err := write(w)
	if err == nil {
		err = w.Flush()
	}
	if err != nil {
		return fmt.Errorf("standard output: %w", err)
	}
	return nil
}
