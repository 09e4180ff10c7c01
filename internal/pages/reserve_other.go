//go:build !linux

package pages

// Reserve has the heap's next so many bytes lie in large pages, if the system has them.
func Reserve(bytes int64) {}
