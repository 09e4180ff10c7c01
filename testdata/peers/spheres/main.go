// Spheres writes the meshes that `make bench-peers` measures on: unit spheres of
// 10*4^level+2 vertices as binary STL, each named for its level.
//
//	go run ./testdata/peers/spheres DIRECTORY LEVEL...
//
// An icosahedron is cut again and again, and its vertices are moved along the sphere, so
// that no two triangles are alike; distances on a sphere are arcs, which tells who is
// right. The triangles come in random order: a file gives no neighbourhood away for free.
package main

import (
	"bufio"
	"encoding/binary"
	"fmt"
	"log"
	"math"
	"os"
	"path/filepath"
	"strconv"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

func main() {
	log.SetFlags(0)
	log.SetPrefix("spheres: ")
	if len(os.Args) < 3 {
		log.Fatal("want the directory to write to, and levels")
	}
	for _, word := range os.Args[2:] {
		level, err := strconv.Atoi(word)
		if err != nil || level < 0 || level > 10 {
			log.Fatalf("want levels from 0 to 10, got %q", word)
		}
		m := meshtest.Shuffle(meshtest.Icosphere(level, 0.25, 1), 2)
		if err := write(filepath.Join(os.Args[1], fmt.Sprintf("%d.stl", level)), m); err != nil {
			log.Fatal(err)
		}
	}
}

// write leaves the normals zero: readers take them from the corners.
func write(name string, m *mesh.Mesh) error {
	f, err := os.Create(name)
	if err != nil {
		return err
	}
	w := bufio.NewWriterSize(f, 1<<20)
	header := make([]byte, 84)
	copy(header, "jittered sphere")
	binary.LittleEndian.PutUint32(header[80:], uint32(m.NumTriangles()))
	w.Write(header)
	record := make([]byte, 50) // normal, three corners of three singles, two spare bytes
	for t := m.Triangles; len(t) > 0; t = t[3:] {
		for corner, v := range t[:3] {
			for axis, x := range m.Positions[3*v : 3*v+3] {
				binary.LittleEndian.PutUint32(record[12+12*corner+4*axis:], math.Float32bits(float32(x)))
			}
		}
		w.Write(record)
	}
	if err := w.Flush(); err != nil { // and with it that of any write before
		f.Close()
		return err
	}
	return f.Close()
}
