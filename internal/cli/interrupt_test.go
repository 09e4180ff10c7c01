//go:build unix

package cli

import (
	"bytes"
	"io"
	"os"
	"os/exec"
	"strings"
	"syscall"
	"testing"
	"time"
)

// These tests run the program as a process of its own: TestMain puts it in the path.

const demoPart = "../../testdata/demo/cap.stl"

// ends waits for the process and checks its exit status. A process that hangs is
// killed, and has no exit status then.
func ends(t *testing.T, cmd *exec.Cmd, want int) {
	t.Helper()
	hung := time.AfterFunc(20*time.Second, func() { _ = cmd.Process.Kill() })
	defer hung.Stop()
	_ = cmd.Wait() // tells of a status other than 0, which is looked at below
	if got := cmd.ProcessState.ExitCode(); got != want {
		t.Errorf("exit status %d, want %d (%v)", got, want, cmd.ProcessState)
	}
}

func TestInterruptWhileReading(t *testing.T) {
	for _, signal := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM} {
		t.Run(signal.String(), func(t *testing.T) {
			var stderr bytes.Buffer
			cmd := exec.Command("heatskin", "check", "-", "--format", "obj")
			cmd.Stderr = &stderr
			mesh, err := cmd.StdinPipe()
			if err != nil {
				t.Fatal(err)
			}
			if err := cmd.Start(); err != nil {
				t.Fatal(err)
			}
			// A pipe holds far less than a megabyte: once this is through, somebody reads.
			if _, err := io.WriteString(mesh, strings.Repeat("v 0 0 0\n", 1<<17)); err != nil {
				t.Fatal(err)
			}
			if err := cmd.Process.Signal(signal); err != nil {
				t.Fatal(err)
			}
			ends(t, cmd, statusFailed)
			if got := stderr.String(); got != "heatskin: "+errInterrupted.Error()+"\n" {
				t.Errorf("standard error: %q", got)
			}
		})
	}
}

func TestInterruptWhileTheReaderStalls(t *testing.T) {
	cmd := exec.Command("heatskin", "distance", demoPart, "--at-vertex", "0", "--quiet")
	table, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	if _, err := io.ReadFull(table, make([]byte, 10)); err != nil {
		t.Fatal(err)
	}
	if err := cmd.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	ends(t, cmd, statusFailed)
}

func TestReaderThatLeft(t *testing.T) {
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	r.Close()
	var stderr bytes.Buffer
	cmd := exec.Command("heatskin", "distance", demoPart, "--at-vertex", "0", "--quiet")
	cmd.Stdout, cmd.Stderr = w, &stderr
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	w.Close()
	ends(t, cmd, statusFailed)
	if stderr.Len() > 0 {
		t.Errorf("standard error: %q", stderr.String())
	}
}
