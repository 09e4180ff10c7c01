//go:build unix

package fieldfile

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
	"testing"
)

func says(text string) func(io.Writer) error {
	return func(w io.Writer) error {
		_, err := io.WriteString(w, text)
		return err
	}
}

// holds checks a folder's whole content: names and texts.
func holds(t *testing.T, folder string, want map[string]string) {
	t.Helper()
	entries, err := os.ReadDir(folder)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		text, known := want[e.Name()]
		if !known {
			t.Errorf("%s was left behind", e.Name())
			continue
		}
		if got, err := os.ReadFile(filepath.Join(folder, e.Name())); err != nil || string(got) != text {
			t.Errorf("%s holds %q (%v), want %q", e.Name(), got, err, text)
		}
	}
	if len(entries) < len(want) {
		t.Errorf("%d files, want %d", len(entries), len(want))
	}
}

func TestReplaceIsWholeOrNothing(t *testing.T) {
	folder := t.TempDir()
	name := filepath.Join(folder, "field.csv")
	long := strings.Repeat("0123456789", 100_000)
	if err := Replace(name, says(long)); err != nil {
		t.Fatal(err)
	}
	holds(t, folder, map[string]string{"field.csv": long})
	umask := syscall.Umask(0)
	syscall.Umask(umask)
	if info, err := os.Stat(name); err != nil || info.Mode().Perm() != fs.FileMode(0o666&^umask) {
		t.Errorf("permissions %v (%v), want what umask %o leaves", info.Mode(), err, umask)
	}

	failure := errors.New("the numbers ran out")
	err := Replace(name, func(w io.Writer) error {
		if err := says(long[:900_000])(w); err != nil {
			return err
		}
		return failure
	})
	if err != failure {
		t.Errorf("got %v, want the writer's own error", err)
	}
	holds(t, folder, map[string]string{"field.csv": long})

	func() {
		defer func() {
			if recover() == nil {
				t.Error("the panic was swallowed")
			}
		}()
		_ = Replace(name, func(io.Writer) error { panic("broken") })
	}()
	holds(t, folder, map[string]string{"field.csv": long})

	if err := os.Chmod(name, 0o640); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("field.csv", filepath.Join(folder, "link")); err != nil {
		t.Fatal(err)
	}
	if err := Replace(filepath.Join(folder, "link"), says("short")); err != nil {
		t.Fatal(err)
	}
	holds(t, folder, map[string]string{"field.csv": "short", "link": "short"})
	if info, err := os.Lstat(name); err != nil || info.Mode() != 0o640 {
		t.Errorf("mode %v (%v), want the former one", info.Mode(), err)
	}
}

func TestReplaceRefusals(t *testing.T) {
	folder := t.TempDir()
	for _, tc := range []struct {
		name string
		want error
	}{
		{filepath.Join(folder, "no", "such", "folder.csv"), syscall.ENOENT},
		{filepath.Join(folder, strings.Repeat("long", 64)), syscall.ENAMETOOLONG},
		{folder, nil},
		{"/dev/full", syscall.ENOSPC}, // a disk that is full
	} {
		err := Replace(tc.name, says("text"))
		var write *WriteError
		if !errors.As(err, &write) || write.File != tc.name || tc.want != nil && !errors.Is(err, tc.want) {
			t.Errorf("%s: got %v, want %v", tc.name, err, tc.want)
			continue
		}
		if strings.Contains(err.Error(), ".part") {
			t.Errorf("%v names the temporary file", err)
		}
		if tc.name != "/dev/full" && tc.want != syscall.ENAMETOOLONG {
			if check := CheckWritable(tc.name); check == nil || check.Error() != err.Error() {
				t.Errorf("%s: CheckWritable says %v, Replace %v", tc.name, check, err)
			}
		}
	}
	if err := Replace("/dev/null", says("text")); err != nil {
		t.Errorf("/dev/null: %v", err)
	}
	if info, err := os.Stat("/dev/null"); err != nil || info.Mode().IsRegular() {
		t.Errorf("/dev/null has become %v", info.Mode())
	}
	if err := CheckWritable(filepath.Join(folder, "new.csv")); err != nil {
		t.Error(err)
	}
	holds(t, folder, nil)
}

// A disk may fill up while the file is written: a limit on file size stands for it.
func TestReplaceOnFullDisk(t *testing.T) {
	folder := t.TempDir()
	name := filepath.Join(folder, "field.csv")
	if err := os.WriteFile(name, []byte("before"), 0o666); err != nil {
		t.Fatal(err)
	}
	var limit syscall.Rlimit
	if err := syscall.Getrlimit(syscall.RLIMIT_FSIZE, &limit); err != nil {
		t.Fatal(err)
	}
	tight := limit
	tight.Cur = 1 << 16
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &tight); err != nil {
		t.Fatal(err)
	}
	err := Replace(name, says(strings.Repeat("x", 1<<20)))
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &limit); err != nil {
		t.Fatal(err)
	}
	var write *WriteError
	if !errors.As(err, &write) || !errors.Is(err, syscall.EFBIG) {
		t.Errorf("got %v", err)
	}
	holds(t, folder, map[string]string{"field.csv": "before"})
}

// An interrupt in the middle of a write: the temporary file goes, at once.
func TestRemovePending(t *testing.T) {
	folder := t.TempDir()
	writing, removed := make(chan bool), make(chan bool)
	var group sync.WaitGroup
	var err error
	group.Go(func() {
		err = Replace(filepath.Join(folder, "field.csv"), func(w io.Writer) error {
			writing <- true
			<-removed
			return says("too late")(w)
		})
	})
	<-writing
	RemovePending()
	holds(t, folder, nil)
	removed <- true
	group.Wait()
	if !errors.Is(err, ErrAbandoned) {
		t.Errorf("the write under way: %v", err)
	}
	if err := Replace(filepath.Join(folder, "later.csv"), says("text")); !errors.Is(err, ErrAbandoned) {
		t.Errorf("a later write: %v", err)
	}
	holds(t, folder, nil)
	pending.abandoned = false
}

// Many at once over one name: each whole, nothing left behind.
func TestReplaceAtOnce(t *testing.T) {
	folder := t.TempDir()
	name := filepath.Join(folder, "field.csv")
	text := strings.Repeat("same", 50_000)
	var group sync.WaitGroup
	for range 20 {
		group.Go(func() {
			if err := Replace(name, says(text)); err != nil {
				t.Error(err)
			}
		})
	}
	group.Wait()
	holds(t, folder, map[string]string{"field.csv": text})
}
