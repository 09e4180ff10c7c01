package parallel

import (
	"runtime"
	"slices"
	"sync/atomic"
	"testing"
)

// Every number is seen once, in blocks that do not depend on the processors at hand.
func TestEachBlock(t *testing.T) {
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	for _, processors := range []int{1, 3, 8} {
		runtime.GOMAXPROCS(processors)
		for _, n := range []int{0, 1, blockSize, 5*blockSize + 7} {
			seen := make([]atomic.Int32, n)
			ends := make([]int, NumBlocks(n))
			EachBlock(n, func(block, lo, hi int) {
				ends[block] = hi
				for i := lo; i < hi; i++ {
					seen[i].Add(1)
				}
			})
			for i := range seen {
				if got := seen[i].Load(); got != 1 {
					t.Fatalf("%d processors: %d of %d seen %d times, want once", processors, i, n, got)
				}
			}
			if !slices.IsSorted(ends) || n > 0 && ends[len(ends)-1] != n {
				t.Errorf("%d processors: blocks end at %v, want rising up to %d", processors, ends, n)
			}
		}
	}
}

func TestGather(t *testing.T) {
	n := 3*blockSize + 5
	var want []int32
	for i := int32(0); i < int32(n); i += 7 {
		want = append(want, i)
	}
	if got := Gather(n, func(i int32) bool { return i%7 == 0 }); !slices.Equal(got, want) {
		t.Errorf("got %d numbers, want the %d multiples of 7 in order", len(got), len(want))
	}
}
