package mesh_test

import (
	"bytes"
	"compress/gzip"
	"context"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"errors"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"heatskin/internal/meshtest"
	"heatskin/mesh"
)

var asFormat = mesh.LoadOptions{Weld: math.NaN()}

// binarySTL writes m by the format's own definition: 80 bytes, a count, and 12
// single-precision numbers and 2 bytes for each triangle, all little-endian.
func binarySTL(m *mesh.Mesh) []byte {
	b := append(make([]byte, 80), 0, 0, 0, 0)
	binary.LittleEndian.PutUint32(b[80:], uint32(m.NumTriangles()))
	for f := range m.NumTriangles() {
		b = append(b, make([]byte, 12)...)
		for _, v := range m.Triangles[3*f : 3*f+3] {
			for _, x := range m.Positions[3*v : 3*v+3] {
				b = binary.LittleEndian.AppendUint32(b, math.Float32bits(float32(x)))
			}
		}
		b = append(b, 0, 0)
	}
	return b
}

func TestLoadSTL(t *testing.T) {
	// Coordinates are multiples of 1/8: single precision holds them exactly.
	want := meshtest.Soup(meshtest.Box(1, 1, 2, [3]int{8, 8, 16}, 0, 0)).Weld(0)
	content := binarySTL(want)
	var zipped bytes.Buffer
	z := gzip.NewWriter(&zipped)
	z.Write(content)
	z.Close()
	folder := t.TempDir()
	for name, bytes := range map[string][]byte{"box.stl": content, "box.stl.gz": zipped.Bytes(), "odd-name": content} {
		path := filepath.Join(folder, name)
		if err := os.WriteFile(path, bytes, 0o600); err != nil {
			t.Fatal(err)
		}
		m, err := mesh.Load(context.Background(), path, nil, asFormat)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(m.Positions, want.Positions) || !slices.Equal(m.Triangles, want.Triangles) {
			t.Errorf("%s: not the mesh that was written", name)
		}
		sum := sha256.Sum256(bytes)
		if m.File.SHA256 != hex.EncodeToString(sum[:]) || m.File.Bytes != int64(len(bytes)) || m.File.Format != "stl" || m.File.Name != path {
			t.Errorf("%s: file info %+v", name, m.File)
		}
	}
}

// The hash covers what lies behind the mesh, blocks long and short, too.
func TestLoadHashesTheWholeFile(t *testing.T) {
	content := append(binarySTL(meshtest.Icosphere(5, 0, 0)), make([]byte, 1_000_000)...)
	m, err := mesh.Load(context.Background(), "-", bytes.NewReader(content), mesh.LoadOptions{Format: "stl"})
	if err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256(content)
	if m.File.SHA256 != hex.EncodeToString(sum[:]) || m.File.Bytes != int64(len(content)) {
		t.Errorf("hash of %d bytes is %s", m.File.Bytes, m.File.SHA256)
	}
}

// OFF keeps its own numbering unless it is told to weld.
func TestLoadWelds(t *testing.T) {
	const off = "OFF\n6 2 0\n0 0 0\n1 0 0\n0 1 0\n0 1 0\n1 0 0.001\n1 1 0\n3 0 1 2\n3 3 4 5\n"
	for _, tc := range []struct {
		weld float64
		want []int32
	}{
		{math.NaN(), []int32{0, 1, 2, 3, 4, 5}},
		{0, []int32{0, 1, 2, 2, 3, 4}},
		{0.01, []int32{0, 1, 2, 2, 1, 3}},
	} {
		m, err := mesh.Load(context.Background(), "-", strings.NewReader(off), mesh.LoadOptions{Format: "off", Weld: tc.weld})
		if err != nil || !slices.Equal(m.Triangles, tc.want) {
			t.Errorf("weld %v: got %v, %v; want %v", tc.weld, m, err, tc.want)
		}
	}
}

func TestLoadRefuses(t *testing.T) {
	ctx := context.Background()
	folder := t.TempDir()
	var path *fs.PathError
	if _, err := mesh.Load(ctx, filepath.Join(folder, "none.stl"), nil, asFormat); !errors.As(err, &path) {
		t.Errorf("missing file: %v", err)
	}
	if _, err := mesh.Load(ctx, folder, nil, asFormat); err == nil || !strings.Contains(err.Error(), "directory") {
		t.Errorf("directory: %v", err)
	}
	flat := "OFF\n3 2 0\n0 0 0\n1 1 1\n2 2 2\n3 0 1 2\n3 0 1 1\n"
	var empty *mesh.EmptyError
	if _, err := mesh.Load(ctx, "-", strings.NewReader(flat), asFormat); !errors.As(err, &empty) || !strings.HasPrefix(err.Error(), "-: ") {
		t.Errorf("flat mesh: %v", err)
	}
	if _, err := mesh.Load(ctx, "-", strings.NewReader(flat), mesh.LoadOptions{Weld: -1}); err == nil {
		t.Error("a negative tolerance is accepted")
	}
	over, cancel := context.WithCancel(ctx)
	cancel()
	content := binarySTL(meshtest.Icosphere(6, 0, 0))
	if _, err := mesh.Load(over, "-", bytes.NewReader(content), mesh.LoadOptions{Format: "stl"}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func BenchmarkLoad(b *testing.B) {
	path := filepath.Join(b.TempDir(), "sphere.stl")
	content := binarySTL(meshtest.Icosphere(8, 0.2, 1)) // 65 MB
	if err := os.WriteFile(path, content, 0o600); err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(content)))
	for b.Loop() {
		if _, err := mesh.Load(context.Background(), path, nil, asFormat); err != nil {
			b.Fatal(err)
		}
	}
}
