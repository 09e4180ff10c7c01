package mesh

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"hash"
	"io"
	"math"
	"os"
	"slices"

	"heatskin/internal/meshfile"
)

// LoadOptions say how a file is to be read.
type LoadOptions struct {
	Format string  // "stl", "ply", "obj" or "off"; "" goes by the content
	Weld   float64 // join corners within this distance, 0: exactly equal; NaN: as the format wants it, STL exactly, others not
}

// Load reads a mesh from the named file ("-": from stdin) and welds it. Triangles
// keep the file's order and vertices that of their first appearance in it. Welding
// is as (*Mesh).Weld says. O(n).
//
// The error names file and place: meshfile's errors where the content makes no
// sense, a *fs.PathError where the file cannot be opened or read, an *EmptyError
// (wrapped) if no triangle has an area, or ctx.Err().
func Load(ctx context.Context, name string, stdin io.Reader, opt LoadOptions) (*Mesh, error) {
	if opt.Weld < 0 || math.IsInf(opt.Weld, 0) {
		return nil, fmt.Errorf("welding tolerance %v: want a finite length, 0 or above", opt.Weld)
	}
	in, size, err := open(name, stdin)
	if err != nil {
		return nil, err
	}
	defer in.Close()
	digest := newDigester(in, size)
	soup, err := meshfile.Read(ctx, digest, name, opt.Format)
	if err == nil {
		err = digest.drain(ctx) // what follows the mesh's end is hashed, too
	}
	sum := digest.finish()
	if err != nil {
		return nil, err
	}
	m := &Mesh{
		Positions: soup.Positions,
		Triangles: soup.Triangles,
		File: FileInfo{
			Name:     name,
			Format:   soup.Format,
			SHA256:   hex.EncodeToString(sum),
			Bytes:    digest.count,
			Warnings: soup.Warnings,
		},
	}
	if math.IsNaN(opt.Weld) && !soup.Indexed {
		opt.Weld = 0
	}
	if !math.IsNaN(opt.Weld) {
		m.weldInPlace(opt.Weld)
	}
	if !m.anyArea() {
		return nil, fmt.Errorf("%s: %w", name, &EmptyError{Triangles: m.NumTriangles()})
	}
	return m, ctx.Err()
}

func open(name string, stdin io.Reader) (in io.ReadCloser, size int64, err error) {
	if name == "-" {
		return io.NopCloser(stdin), 0, nil
	}
	f, err := os.Open(name)
	if err != nil {
		return nil, 0, err
	}
	info, err := f.Stat()
	switch {
	case err != nil:
	case info.IsDir():
		err = fmt.Errorf("%s: want a mesh file, got a directory", name)
	case info.Mode().IsRegular():
		size = info.Size()
	}
	if err != nil {
		f.Close()
		return nil, 0, err
	}
	return f, size, nil
}

// weldInPlace is Weld for a mesh that nobody else has seen yet: it needs no second
// copy of the corners.
func (m *Mesh) weldInPlace(tolerance float64) {
	number := m.Triangles
	own := len(m.Triangles) == m.NumVertices() // STL: corner h is point h
	for h := 0; own && h < len(number); h++ {
		own = number[h] == int32(h)
	}
	if !own {
		number = make([]int32, m.NumVertices())
	}
	positions := weldExactly(number, m.Positions, m.Positions[:0])
	if tolerance > 0 {
		positions = weldNear(number, positions, tolerance)
	}
	if !own {
		for h, v := range m.Triangles {
			m.Triangles[h] = number[v]
		}
	}
	m.Positions = slices.Clone(positions) // lets go of the corners' memory
}

func (m *Mesh) anyArea() bool {
	t := m.Triangles
	for h := 0; h < len(t); h += 3 {
		if hasArea(m.Positions, t[h], t[h+1], t[h+2]) {
			return true
		}
	}
	return false
}

// A digester reads in blocks and takes their SHA-256 in a goroutine, beside whoever
// parses them. finish must be called.
type digester struct {
	in    io.Reader
	size  int64 // of in, if known
	count int64 // bytes read so far
	rest  []byte
	block []byte
	err   error // met while reading ahead
	todo  chan []byte
	done  chan []byte // blocks that may be filled again
	hash  hash.Hash
	over  chan struct{}
}

const digestBlock = 1 << 18

func newDigester(in io.Reader, size int64) *digester {
	const blocks = 4
	d := &digester{
		in: in, size: size, hash: sha256.New(),
		todo: make(chan []byte, blocks), done: make(chan []byte, blocks), over: make(chan struct{}),
	}
	for range blocks {
		d.done <- make([]byte, digestBlock)
	}
	go func() {
		for b := range d.todo {
			d.hash.Write(b)
			d.done <- b[:cap(b)]
		}
		close(d.over)
	}()
	return d
}

// Size is the number of bytes yet to come, 0 where it is not known.
func (d *digester) Size() int64 { return max(0, d.size-d.count) }

func (d *digester) Read(p []byte) (int, error) {
	if len(d.rest) == 0 {
		if err := d.fill(); err != nil {
			return 0, err
		}
	}
	n := copy(p, d.rest)
	d.rest = d.rest[n:]
	return n, nil
}

// fill brings in one block. A block is handed to the hash only once it has been read
// through, since both only read it but filling it again must wait for both.
func (d *digester) fill() error {
	d.pass()
	if d.err != nil {
		return d.err
	}
	d.block = <-d.done
	n, err := d.in.Read(d.block)
	for n == 0 && err == nil {
		n, err = d.in.Read(d.block)
	}
	d.block, d.err = d.block[:n], err
	d.rest = d.block
	d.count += int64(n)
	if n == 0 {
		return d.err
	}
	return nil
}

func (d *digester) pass() {
	if d.block != nil {
		d.todo <- d.block
		d.block = nil
	}
}

// drain reads what is left.
func (d *digester) drain(ctx context.Context) error {
	for {
		d.rest = nil
		switch err := d.fill(); {
		case errors.Is(err, io.EOF):
			return nil
		case err != nil:
			return err
		case ctx.Err() != nil:
			return ctx.Err()
		}
	}
}

// finish ends the goroutine and gives the hash of all that was read.
func (d *digester) finish() []byte {
	d.pass()
	close(d.todo)
	<-d.over
	return d.hash.Sum(nil)
}
