package fieldfile

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"path/filepath"
	"sync"
)

// A WriteError is a file that could not be written. The cause is an error of the
// file system ("no space left on device"), or ErrAbandoned.
type WriteError struct {
	File string // as the user named it
	Err  error
}

func (e *WriteError) Error() string { return e.File + ": cannot be written: " + e.Err.Error() }
func (e *WriteError) Unwrap() error { return e.Err }

// ErrAbandoned is why nothing can be written after RemovePending.
var ErrAbandoned = errors.New("the program is ending")

// pending holds the temporary files that now exist. Creating, renaming and removing
// them happen under its lock, so that RemovePending sees each of them.
var pending struct {
	sync.Mutex
	names     map[string]bool
	abandoned bool
}

// RemovePending removes the temporary files of all Replace calls under way, and
// makes those and any later ones fail. It is for the moment before the process
// ends, as on an interrupt; it may be called from any goroutine.
func RemovePending() {
	pending.Lock()
	defer pending.Unlock()
	pending.abandoned = true
	for name := range pending.names {
		os.Remove(name) // there is nobody left to tell
	}
	clear(pending.names)
}

// Replace makes the file called name hold what write writes, whole or not at all:
// a temporary file beside it is written, synced and renamed over it. On any failure,
// a panic of write included, the temporary file is removed and what stood there
// before stays. A file that stood there keeps its permissions, and a symbolic link
// goes on to point at what it pointed at. What is no regular file (a device, a pipe)
// cannot be replaced and is written to directly.
//
// The writer is buffered. The error is that of write, as it is, or a *WriteError.
func Replace(name string, write func(io.Writer) error) error {
	place, mode := name, fs.FileMode(0)
	switch info, err := os.Stat(name); {
	case err == nil && info.IsDir():
		return &WriteError{File: name, Err: errors.New("it is a directory")}
	case err == nil && !info.Mode().IsRegular():
		file, err := os.OpenFile(name, os.O_WRONLY, 0)
		if err != nil {
			return writeError(name, err)
		}
		return fill(name, file, write, false)
	case err == nil:
		mode = info.Mode().Perm()
		if place, err = filepath.EvalSymlinks(name); err != nil {
			return writeError(name, err)
		}
	}
	file, err := createBeside(place)
	if err != nil {
		return writeError(name, err)
	}
	done := false
	defer func() {
		if !done {
			discard(file)
		}
	}()
	if mode != 0 {
		if err := file.Chmod(mode); err != nil {
			return writeError(name, err)
		}
	}
	if err := fill(name, file, write, true); err != nil {
		return err
	}
	if err := putInPlace(file.Name(), place); err != nil {
		return writeError(name, err)
	}
	done = true
	return nil
}

// fill runs write on the file, and closes it.
func fill(name string, file *os.File, write func(io.Writer) error, sync bool) error {
	out := bufio.NewWriterSize(&target{name: name, file: file}, 1<<16)
	err := write(out)
	if err == nil {
		err = out.Flush()
	}
	if err == nil && sync {
		// Without this a power cut after the rename could leave an empty file, and an
		// error that the disk has yet to report would be lost.
		err = writeError(name, file.Sync())
	}
	if closeErr := file.Close(); err == nil {
		err = writeError(name, closeErr)
	}
	return err
}

// A target writes to the temporary file and reports errors under the user's name.
type target struct {
	name string
	file *os.File
}

func (t *target) Write(p []byte) (int, error) {
	n, err := t.file.Write(p)
	return n, writeError(t.name, err)
}

// writeError wraps a file system's error without the temporary name in it.
func writeError(name string, err error) error {
	if err == nil {
		return nil
	}
	var path *fs.PathError
	var link *os.LinkError
	switch {
	case errors.As(err, &path):
		err = path.Err
	case errors.As(err, &link):
		err = link.Err
	}
	return &WriteError{File: name, Err: err}
}

// createBeside creates a temporary file in place's folder. os.CreateTemp would do but
// for its permissions, which are the user's alone; these are what the umask leaves.
func createBeside(place string) (*os.File, error) {
	folder, base := filepath.Split(place)
	if len(base) > 200 { // file systems allow 255 bytes
		base = base[:200]
	}
	pending.Lock()
	defer pending.Unlock()
	for try := 0; ; try++ {
		if pending.abandoned {
			return nil, ErrAbandoned
		}
		name := filepath.Join(folder, fmt.Sprintf(".%s.%08x.part", base, rand.Uint32()))
		file, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
		if errors.Is(err, fs.ErrExist) && try < 1000 {
			continue
		}
		if err != nil {
			return nil, err
		}
		if pending.names == nil {
			pending.names = make(map[string]bool)
		}
		pending.names[name] = true
		return file, nil
	}
}

// discard closes and removes a temporary file that is not to be kept.
func discard(file *os.File) {
	file.Close() // again, mostly; what it says no longer matters
	pending.Lock()
	defer pending.Unlock()
	if pending.names[file.Name()] {
		os.Remove(file.Name())
		delete(pending.names, file.Name())
	}
}

// putInPlace renames a temporary file that is written.
func putInPlace(temporary, place string) error {
	pending.Lock()
	defer pending.Unlock()
	if pending.abandoned {
		return ErrAbandoned
	}
	if err := os.Rename(temporary, place); err != nil {
		return err
	}
	delete(pending.names, temporary)
	// The rename itself lasts once the folder is synced. Not every file system can do
	// that, and the file is in place whole either way, so this is no failure.
	if folder, err := os.Open(filepath.Dir(place)); err == nil {
		_ = folder.Sync()
		folder.Close()
	}
	return nil
}

// CheckWritable tells before a long computation whether Replace could write a file
// called name. It leaves nothing behind.
func CheckWritable(name string) error {
	switch info, err := os.Stat(name); {
	case err == nil && info.IsDir():
		return &WriteError{File: name, Err: errors.New("it is a directory")}
	case err == nil && !info.Mode().IsRegular():
		return nil
	}
	file, err := createBeside(name)
	if err != nil {
		return writeError(name, err)
	}
	discard(file)
	return nil
}
