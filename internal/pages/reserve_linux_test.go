package pages

import (
	"os"
	"regexp"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// The kernel's own account of the process (proc(5): /proc/pid/smaps) must list the
// reserved memory as advised ("hg"), and as not touched.
func TestReserveAdvisesWithoutTouching(t *testing.T) {
	if _, err := os.Stat("/sys/kernel/mm/transparent_hugepage/enabled"); err != nil {
		Reserve(256 << 20) // on a kernel without large pages it must do nothing, quietly
		return
	}
	before, resident := advised(t)
	Reserve(256 << 20)
	after, residentAfter := advised(t)
	if got := after - before; got < 252<<20 {
		t.Errorf("%d bytes more are advised, want 256 MiB but for the ends", got)
	}
	if grown := residentAfter - resident; grown > 16<<20 {
		t.Errorf("%d bytes were touched, want next to none", grown)
	}
	var heap runtime.MemStats
	runtime.ReadMemStats(&heap)
	if heap.HeapAlloc > 64<<20 {
		t.Errorf("the heap keeps %d bytes", heap.HeapAlloc)
	}
}

// advised adds up the memory of this process that large pages were asked for, and what
// of it is resident.
func advised(t *testing.T) (size, resident int64) {
	t.Helper()
	text, err := os.ReadFile("/proc/self/smaps")
	if err != nil {
		t.Fatal(err)
	}
	header := regexp.MustCompile(`(?m)^[0-9a-f]+-[0-9a-f]+ `)
	starts := header.FindAllIndex(text, -1)
	for i, at := range starts {
		end := len(text)
		if i+1 < len(starts) {
			end = starts[i+1][0]
		}
		var own, there int64
		for line := range strings.Lines(string(text[at[0]:end])) {
			fields := strings.Fields(line)
			switch fields[0] {
			case "Size:":
				own = kib(t, fields[1])
			case "Rss:":
				there = kib(t, fields[1])
			case "VmFlags:":
				if slices.Contains(fields, "hg") {
					size += own
					resident += there
				}
			}
		}
	}
	return size, resident
}

func kib(t *testing.T, text string) int64 {
	t.Helper()
	n, err := strconv.ParseInt(text, 10, 64)
	if err != nil {
		t.Fatal(err)
	}
	return 1024 * n
}
