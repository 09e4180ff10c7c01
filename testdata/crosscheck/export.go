// Export writes what crosscheck.py judges: four meshes as OFF files, and for each the
// triangulation that heatskin computes on and its matrices L and M, in the Matrix Market
// exchange format (R. F. Boisvert, R. Pozo, K. A. Remington, NISTIR 5935, 1996).
//
//	go run ./testdata/crosscheck DIRECTORY
//
// `make crosscheck` runs both.
package main

import (
	"bufio"
	"encoding/json"
	"fmt"
	"log"
	"os"
	"path/filepath"

	"heatskin/internal/meshtest"
	"heatskin/internal/sparse"
	"heatskin/mesh"
)

// about is what crosscheck.py has to know beside the matrices.
type about struct {
	Name     string    `json:"name"`
	Original int       `json:"original"` // vertices of the mesh; what has been added follows
	Source   int32     `json:"source"`   // a vertex off the held loop
	Held     []int32   `json:"held"`     // vertices of boundary loop 0
	Changed  bool      `json:"changed"`  // edges have been flipped or split
	Corners  []int32   `json:"corners"`  // of the triangles computed on
	Lengths  []float64 `json:"lengths"`  // of their edges, from each corner to the next
}

func main() {
	log.SetFlags(0)
	log.SetPrefix("crosscheck: ")
	if len(os.Args) != 2 {
		log.Fatal("want the directory to write to")
	}
	bracket, _ := meshtest.Bracket(3, 12)
	for name, m := range map[string]*mesh.Mesh{
		"sphere":  meshtest.ShakenSphere(3, 1),          // closed, uneven
		"bracket": bracket,                              // closed, slivers and fans as from CAD
		"slit":    meshtest.SlitPlate(14, 0, 1, 0.3, 2), // open, with a slit
		"book":    meshtest.Book(3, 12),                 // three sheets at one edge
	} {
		if err := export(os.Args[1], name, m); err != nil {
			log.Fatal(err)
		}
	}
}

// export does as the program does with --max-edge none.
func export(dir, name string, m *mesh.Mesh) error {
	s, err := mesh.NewSurface(m)
	if err != nil {
		return err
	}
	var data []mesh.Datum
	if loops := mesh.BoundaryLoops(m); len(loops) > 0 {
		data = append(data, mesh.AtEdges(loops[0].Edges()))
	}
	if err := s.Place(data); err != nil {
		return err
	}
	s.Delaunay(s.NumFaces())

	a := about{Name: name, Original: m.NumVertices(), Changed: s.Flips+s.Splits > 0, Held: []int32{}, Corners: s.Vert, Lengths: s.Length}
	held := make([]bool, s.NumVertices)
	for h := range int32(len(s.Vert)) {
		if len(data) > 0 && s.OnDatum(h, 0) {
			held[s.Vert[h]], held[s.Vert[h-h%3+(h+1)%3]] = true, true
		}
	}
	for v, is := range held {
		if is {
			a.Held = append(a.Held, int32(v))
		}
	}
	for a.Source = int32(a.Original / 2); held[a.Source]; {
		a.Source++
	}
	path := func(suffix string) string { return filepath.Join(dir, name+suffix) }
	if err := write(path(".off"), func(w *bufio.Writer) {
		fmt.Fprintf(w, "OFF\n%d %d 0\n", m.NumVertices(), m.NumTriangles())
		for p := m.Positions; len(p) > 0; p = p[3:] {
			fmt.Fprintln(w, p[0], p[1], p[2])
		}
		for t := m.Triangles; len(t) > 0; t = t[3:] {
			fmt.Fprintln(w, 3, t[0], t[1], t[2])
		}
	}); err != nil {
		return err
	}
	matrices := map[string]*sparse.Matrix{
		"-L.mtx":          s.Laplacian(),
		"-lumped.mtx":     {Pattern: &sparse.Pattern{Ptr: make([]int64, s.NumVertices+1)}, Diag: s.LumpedMass()},
		"-consistent.mtx": s.ConsistentMass(),
	}
	for suffix, matrix := range matrices {
		if err := write(path(suffix), func(w *bufio.Writer) { writeMatrix(w, matrix) }); err != nil {
			return err
		}
	}
	text, err := json.Marshal(a)
	if err != nil {
		return err
	}
	return os.WriteFile(path(".json"), text, 0o666)
}

// writeMatrix writes the lower triangle, with numbers that read back to the same double.
func writeMatrix(w *bufio.Writer, a *sparse.Matrix) {
	n := a.Dim()
	fmt.Fprintf(w, "%%%%MatrixMarket matrix coordinate real symmetric\n%d %d %d\n", n, n, n+len(a.Adj)/2)
	for i := range n {
		fmt.Fprintln(w, i+1, i+1, a.Diag[i])
		for k := a.Ptr[i]; k < a.Ptr[i+1]; k++ {
			if j := a.Adj[k]; int(j) < i {
				fmt.Fprintln(w, i+1, j+1, a.Off[k])
			}
		}
	}
}

func write(name string, content func(w *bufio.Writer)) error {
	f, err := os.Create(name)
	if err != nil {
		return err
	}
	w := bufio.NewWriter(f)
	content(w)
	if err := w.Flush(); err != nil {
		f.Close()
		return err
	}
	return f.Close()
}
