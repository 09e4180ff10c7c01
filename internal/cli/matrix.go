package cli

import (
	"context"
	"io"

	"heatskin/internal/fieldfile"
)

// A distanceMatrix holds the distances between all sources, row by row.
type distanceMatrix struct {
	n      int
	values []float64
}

// measureMatrix measures between every two of n sources. Seen from a point, a line's
// nearest place may fall between vertices, and the line then sees the point better:
// hence the lesser of the two, which also makes the matrix symmetric.
func measureMatrix(ctx context.Context, r ruler, n int) (*distanceMatrix, error) {
	m := &distanceMatrix{n: n}
	for i := range n {
		row, err := r.between(ctx, i)
		if err != nil {
			return nil, err
		}
		m.values = append(m.values, row...)
	}
	for i := range n {
		for k := range i {
			least := min(m.values[i*n+k], m.values[k*n+i])
			m.values[i*n+k], m.values[k*n+i] = least, least
		}
	}
	return m, nil
}

func (m *distanceMatrix) write(w io.Writer) error {
	from, to := make([]int, len(m.values)), make([]int, len(m.values))
	for i := range m.values {
		from[i], to[i] = i/m.n, i%m.n
	}
	return fieldfile.WriteTable(w, len(m.values),
		fieldfile.Ints("from", from), fieldfile.Ints("to", to), fieldfile.Floats("distance", m.values))
}
