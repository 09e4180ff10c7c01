package cli

import (
	"os"
	"path/filepath"
	"testing"
)

// The layout is that of proc(5), /proc/pid/status.
func TestResidentPeak(t *testing.T) {
	name := filepath.Join(t.TempDir(), "status")
	if err := os.WriteFile(name, []byte("Name:\theatskin\nVmPeak:\t  999 kB\nVmHWM:\t   1234 kB\nVmRSS:\t 12 kB\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	if got, ok := residentPeak(name); !ok || got != 1234*1024 {
		t.Errorf("got %d, %v", got, ok)
	}
	if _, ok := residentPeak(name + ".missing"); ok {
		t.Error("a peak from a file that is not there")
	}
}

func TestPeakMemoryHoldsWhatWasTouched(t *testing.T) {
	const size = 64 << 20
	held := make([]byte, size)
	for i := range held {
		held[i] = 1 // a page counts once it is written
	}
	if got := peakMemory(); got < size {
		t.Errorf("peak %d bytes while holding %d", got, len(held))
	}
}
