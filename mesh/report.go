package mesh

import (
	"fmt"
	"io"
	"math"
	"strings"
	"text/tabwriter"
)

// judge says what the numbers mean for a computation. welded is how many components
// the mesh would have if WeldTolerance were applied.
func (r *Report) judge(outOfRange error, welded int) {
	find := func(format string, args ...any) { r.Findings = append(r.Findings, fmt.Sprintf(format, args...)) }
	advise := func(format string, args ...any) { r.Advice = append(r.Advice, fmt.Sprintf(format, args...)) }
	torn := welded < r.Components
	withArea := r.Faces - r.RepeatedCorners - r.FlatFaces

	switch {
	case withArea == 0:
		find("no triangle has an area")
		advise("export the part again: there is no surface in this file")
	case outOfRange != nil:
		find("%v", outOfRange)
		advise("convert the file to a unit in which the part measures between 1e-140 and 1e140")
	case torn:
		find("%d components are %d once boundary vertices that touch are joined: neighbours in space are strangers in the file", r.Components, welded)
		advise("give --weld %.3g, unless the gaps are meant", r.weldLength())
	case r.Components > 1:
		find("%d components: from one to another a distance is infinite, and no heat passes", r.Components)
		advise("put a source on each component that matters")
	}
	if !torn && r.WeldJoins > 0 {
		find("%d boundary vertices lie on or next to others (%d exactly): cracks, or slits that are meant", r.WeldJoins, r.CoincidentVertices)
		advise("give --weld %.3g if they are cracks: distances go round them, and no heat passes", r.weldLength())
	}
	if r.NonManifoldEdges > 0 {
		find("%d edges have more than two faces: distance and heat pass to all of them", r.NonManifoldEdges)
	}
	if r.NonManifoldVertices > 0 {
		find("%d vertices join parts of the surface that touch nowhere else there: distance passes through them", r.NonManifoldVertices)
	}
	switch {
	case !r.Orientable:
		find("the surface has one side only (no orientation fits all faces), which matters to neither distance nor heat")
	case r.InconsistentEdges > 0:
		find("%d faces are turned against their neighbours (across %d edges), which matters to neither distance nor heat", r.ReversedFaces, r.InconsistentEdges)
	}
	if r.DuplicateFaces > 0 {
		find("%d faces repeat the corners of another: those in the same order are left out, others count as a second layer", r.DuplicateFaces)
		advise("remove doubled faces if they are not meant: they hold heat twice")
	}
	if n := r.RepeatedCorners + r.FlatFaces; n > 0 && withArea > 0 {
		find("%d faces have no area (%d with a repeated corner): they are passed over or widened by a hair", n, r.RepeatedCorners)
	}
	if r.FoldedEdges > 0 {
		find("at %d edges the surface folds back onto itself: distances go round the fold", r.FoldedEdges)
		advise("look at the folds: they are often faults of an export")
	}
	if r.IsolatedVertices > 0 {
		find("%d vertices are in no triangle with an area: they have no value, and cannot be a source", r.IsolatedVertices)
	}
	if r.NonDelaunayEdges > 0 && withArea > 0 {
		slivers := ""
		if r.Slivers > 0 {
			slivers = fmt.Sprintf(", and %d faces are slivers", r.Slivers)
		}
		find("%d edges (%.2g %%) are not Delaunay%s: edges are flipped inside the surface for heat, and distances are not the worse for it",
			r.NonDelaunayEdges, 100*float64(r.NonDelaunayEdges)/float64(max(1, r.Edges)), slivers)
	}

	r.FitForDistance = withArea > 0 && outOfRange == nil && !torn
	r.FitForHeat = r.FitForDistance
	switch {
	case !r.FitForDistance:
		r.Verdict = "not fit for distance or heat as it is"
	case len(r.Advice) > 0:
		r.Verdict = "fit for distance and for heat, with what is said below in mind"
	default:
		r.Verdict = "fit for distance and for heat"
	}
}

// weldLength is a tolerance to be advised: 0 where that joins all that would be joined.
func (r *Report) weldLength() float64 {
	if r.CoincidentVertices == r.WeldJoins {
		return 0
	}
	return r.WeldTolerance
}

// WriteText writes the report for reading.
func (r *Report) WriteText(w io.Writer) error {
	const listed = 10 // boundary loops shown
	table := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	row := func(name, format string, args ...any) {
		fmt.Fprintf(table, "%s\t%s\n", name, fmt.Sprintf(format, args...)) // an error stays with the writer until Flush
	}
	if r.File != "" {
		row("mesh", "%s (%s)", r.File, strings.ToUpper(r.Format))
	}
	row("vertices", "%d", r.Vertices)
	row("edges", "%d", r.Edges)
	row("faces", "%d", r.Faces)
	row("components", "%d", r.Components)
	row("area", "%.9g", r.Area)
	for axis, name := range []string{"x", "y", "z"} {
		lo, hi := r.Box.Min[axis], r.Box.Max[axis]
		row("extent in "+name, "%.6g to %.6g (%.6g)", lo, hi, min(hi-lo, math.MaxFloat64))
	}
	row("Euler characteristic", "%d", r.EulerCharacteristic)
	if r.Genus != nil {
		row("genus", "%d", *r.Genus)
	} else {
		row("genus", "not defined on this surface")
	}
	row("boundary loops", "%d", len(r.BoundaryLoops))
	for i, l := range r.BoundaryLoops {
		if i == listed {
			row("  ...", "%d more", len(r.BoundaryLoops)-listed)
			break
		}
		kind := ""
		if l.Open {
			kind = ", open at both ends"
		}
		row(fmt.Sprintf("  loop %d", i), "length %.6g, %d vertices from vertex %d%s", l.Length, l.Vertices, l.FirstVertex, kind)
	}
	for _, s := range []struct {
		name string
		*Spread
	}{{"edge lengths", r.EdgeLength}, {"angles (degrees)", r.Angle}, {"bends (degrees)", r.Bend}} {
		if s.Spread != nil {
			row(s.name, "%.4g to %.4g; 1 %% below %.4g, half below %.4g, 99 %% below %.4g", s.Min, s.Max, s.P1, s.Median, s.P99)
		}
	}
	for _, c := range []struct {
		name  string
		count int
	}{
		{"edges, more than two faces", r.NonManifoldEdges},
		{"edges, faces turned against each other", r.InconsistentEdges},
		{"edges, folded", r.FoldedEdges},
		{"edges, not Delaunay", r.NonDelaunayEdges},
		{"faces, doubled", r.DuplicateFaces},
		{"faces, repeated corner", r.RepeatedCorners},
		{"faces, no area", r.FlatFaces},
		{"faces, an angle below 1 degree", r.Slivers},
		{"vertices, pinched", r.NonManifoldVertices},
		{"vertices, without a face", r.IsolatedVertices},
		{"vertices, coincident on the boundary", r.CoincidentVertices},
	} {
		row(c.name, "%d", c.count)
	}
	if err := table.Flush(); err != nil {
		return err
	}
	var b strings.Builder
	fmt.Fprintf(&b, "\nverdict: %s\n", r.Verdict)
	for _, text := range r.Findings {
		fmt.Fprintf(&b, "- %s\n", text)
	}
	if len(r.Advice) > 0 {
		b.WriteString("what to do:\n")
		for _, text := range r.Advice {
			fmt.Fprintf(&b, "- %s\n", text)
		}
	}
	_, err := io.WriteString(w, b.String())
	return err
}
