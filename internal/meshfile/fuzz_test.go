package meshfile_test

import (
	"bytes"
	"runtime"
	"strings"
	"testing"

	"heatskin/internal/meshfile"
)

// fuzzRead holds a reader to what it promises of any bytes: no panic; either an
// error of one line or a mesh that is whole; memory in proportion to the file.
func fuzzRead(f *testing.F, format string, seeds ...[]byte) {
	for _, seed := range seeds {
		f.Add(seed)
		f.Add(seed[:len(seed)/2])
		f.Add(seed[:len(seed)*9/10])
	}
	f.Fuzz(func(t *testing.T, file []byte) {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		soup, err := read(file, "fuzz", format, "u")
		runtime.ReadMemStats(&after)
		// Buffers of 2 MiB and gzip's own; then at most 24 bytes of position or 12 of
		// triangle for 2 bytes of file, doubled by growing. Gzip packs up to 1000 to 1.
		due := uint64(8<<20) + 100*uint64(len(file))
		if !bytes.HasPrefix(file, []byte{0x1f, 0x8b}) && after.TotalAlloc-before.TotalAlloc > due {
			t.Errorf("%d bytes allocated for %d", after.TotalAlloc-before.TotalAlloc, len(file))
		}
		if err != nil {
			if message := err.Error(); strings.ContainsAny(message, "\n\r") || len(message) > 400 {
				t.Errorf("message of %d bytes: %q", len(message), message)
			}
			return
		}
		checkWhole(t, soup)
	})
}

func checkWhole(t *testing.T, soup *meshfile.Soup) {
	n := len(soup.Positions) / 3
	if len(soup.Positions)%3 != 0 || len(soup.Triangles)%3 != 0 || len(soup.Triangles) == 0 {
		t.Fatalf("%d coordinates, %d corners", len(soup.Positions), len(soup.Triangles))
	}
	for _, x := range soup.Positions {
		if x-x != 0 {
			t.Fatalf("coordinate %v", x)
		}
	}
	for _, v := range soup.Triangles {
		if v < 0 || int(v) >= n {
			t.Fatalf("corner %d of %d points", v, n)
		}
	}
	for name, values := range soup.Properties {
		if len(values) != n {
			t.Fatalf("%d values of %s for %d points", len(values), name, n)
		}
	}
}

func FuzzBinarySTL(f *testing.F) {
	fuzzRead(f, "stl", binarySTL(wavyGrid(1)), binarySTL(cornerPositions, cornerTriangles))
}

func FuzzASCIISTL(f *testing.F) {
	fuzzRead(f, "stl", asciiSTL(wavyGrid(1)), bytes.ToUpper(asciiSTL(cornerPositions, cornerTriangles)))
}

func FuzzPLY(f *testing.F) {
	fuzzRead(f, "ply", plyText(wavyGrid(1)), plyBytes(wavyGrid(1)),
		[]byte("ply\nformat binary_big_endian 1.0\nelement vertex 1\nproperty double u\nproperty list uchar int l\nproperty short x\nproperty char y\nproperty uint z\n"+
			"element face 1\nproperty list uint short vertex_index\nend_header\n\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x04\x00\x00\x00\x00\x00\x00\x00\x00"))
}

func FuzzOBJ(f *testing.F) {
	fuzzRead(f, "obj", objText(wavyGrid(1)), []byte("v 0 0 0\nv 2 0 0\nv 2 2 0\nv 1 1 0\nv 0 2 0\nf -5 -4 \\\n-3 -2/1 -1//2\n"))
}

func FuzzOFF(f *testing.F) {
	fuzzRead(f, "off", []byte("COFF\n4 2 0\n0 0 0 1 1 1 1\n1 0 0\n0 1 0\n0 0 1\n3 0 1 2 255\n4 0 1 2 3\n"))
}

func FuzzGzip(f *testing.F) {
	f.Add([]byte("\x1f\x8b\x08\x00\x00\x00\x00\x00\x00\x03\xf3\x77\x73\xe3\x02\x00"))
	fuzzRead(f, "")
}
