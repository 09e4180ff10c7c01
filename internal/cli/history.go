package cli

import (
	"io"
	"slices"

	"heatskin/internal/fieldfile"
)

// writeHistory writes id,x,y,z,gap,time,u with a row for each probe and time, times in
// the order asked for, and the columns that are carried over. The first fields read are
// those of the times.
func (p *probes) writeHistory(w io.Writer, times []float64) error {
	rows := len(p.ids) * len(times)
	var id []string
	var columns [6][]float64 // x, y, z, gap, time, u
	var probe []int
	for i := range p.ids {
		for k, t := range times {
			id, probe = append(id, p.ids[i]), append(probe, i)
			for c, value := range [6]float64{p.points[i][0], p.points[i][1], p.points[i][2], p.places[i].Gap, t, p.fields[k].Values[i]} {
				columns[c] = append(columns[c], value)
			}
		}
	}
	series := []fieldfile.Series{fieldfile.Text("id", id)}
	for c, name := range []string{"x", "y", "z", "gap", "time", "u"} {
		series = append(series, fieldfile.Floats(name, columns[c]))
	}
	for c, name := range p.table.Names {
		if slices.Contains(probeColumns, name) {
			continue
		}
		texts := make([]string, rows)
		for row, i := range probe {
			texts[row] = p.table.Cell(i, c)
		}
		series = append(series, fieldfile.Text(name, texts))
	}
	return fieldfile.WriteTable(w, rows, series...)
}
