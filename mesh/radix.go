package mesh

import (
	"runtime"

	"heatskin/internal/parallel"
)

// digits is how many values a radix digit has: enough for few passes, few enough that
// the places being written to stay in the first cache.
const digits = 1 << digitBits

const digitBits = 10

// distribute puts item(0) to item(len(dst)-1) into dst by their digit at shift, those of
// one digit in the order they came, and tells where each digit starts. Each goroutine
// counts, and then moves, a stretch of its own; item is called twice for each number.
func distribute(dst []uint64, shift int, item func(i int) uint64) (start [digits + 1]int) {
	parts := 1
	if len(dst) > 4*digits {
		parts = runtime.GOMAXPROCS(0)
	}
	stretch := func(part int) (lo, hi int) { return len(dst) * part / parts, len(dst) * (part + 1) / parts }
	places := make([][digits]int, parts)
	parallel.EachPart(parts, func(part int) {
		count := &places[part]
		lo, hi := stretch(part)
		for i := lo; i < hi; i++ {
			count[item(i)>>shift%digits]++
		}
	})
	total := 0
	for digit := range digits {
		start[digit] = total
		for part := range parts {
			count := places[part][digit]
			places[part][digit] = total
			total += count
		}
	}
	start[digits] = total
	parallel.EachPart(parts, func(part int) {
		place := &places[part]
		lo, hi := stretch(part)
		for i := lo; i < hi; i++ {
			x := item(i)
			digit := x >> shift % digits
			dst[place[digit]] = x
			place[digit]++
		}
	})
	return start
}

// radixSort sorts items by their upper halves, below 1<<30, and keeps the order of
// equal ones. scratch is as long as items.
func radixSort(items, scratch []uint64) {
	from, to := items, scratch
	for shift := 32; shift < 62; shift += digitBits {
		distribute(to, shift, func(i int) uint64 { return from[i] })
		from, to = to, from
	}
	copy(items, from) // three passes have ended in scratch
}
