package pages

import (
	"runtime"
	"unsafe"

	"golang.org/x/sys/unix"
)

const large = 2 << 20 // bytes of a large page; where they are larger, advice for smaller stretches does nothing

// Reserve has the heap's next so many bytes lie in large pages, if the system has them.
func Reserve(bytes int64) {
	if bytes < least || int64(int(bytes)) != bytes {
		return
	}
	// Memory that is allocated in one piece, advised upon, and let go untouched stays the
	// heap's, advice and all; the allocator takes the lowest addresses first.
	room := make([]byte, bytes)
	skip := int(-uintptr(unsafe.Pointer(&room[0])) % large)
	if err := unix.Madvise(room[skip:], unix.MADV_HUGEPAGE); err != nil {
		return // the kernel has no large pages: nothing is lost but speed
	}
	runtime.KeepAlive(room)
	room = nil
	runtime.GC()
}
