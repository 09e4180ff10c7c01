package pages

import (
	"runtime"
	"runtime/debug"

	"golang.org/x/sys/unix"
)

const piece = 32 << 20 // bytes allocated at a time

// Reserve has the heap's next so many bytes lie in large pages, if the system has them:
// at most half of its memory, since it may refuse more even untouched. Call it first
// thing: what the heap has used before would be cleared, and touched by that.
func Reserve(bytes int64) {
	var system unix.Sysinfo_t
	if unix.Sysinfo(&system) == nil {
		bytes = min(bytes, int64(uint64(system.Totalram)*uint64(system.Unit)/2))
	}
	if bytes < least {
		return
	}
	// Memory that is allocated, advised upon and let go untouched stays the heap's, advice
	// and all; the allocator takes the lowest addresses first.
	defer debug.SetGCPercent(debug.SetGCPercent(-1))
	var room [][]byte
	for ; bytes > 0; bytes -= piece {
		p := make([]byte, piece)
		room = append(room, p)
		if unix.Madvise(p, unix.MADV_HUGEPAGE) != nil { // the heap aligns such pieces to small pages
			break // a kernel without large pages: nothing is lost but speed
		}
	}
	runtime.KeepAlive(room)
	room = nil
	runtime.GC()
}
