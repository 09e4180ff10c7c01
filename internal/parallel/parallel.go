// Package parallel shares loops out among goroutines so that results do not depend on how
// many there are.
package parallel

import (
	"runtime"
	"sync"
	"sync/atomic"
)

// blockSize is how many items one goroutine takes at a time: some ten microseconds of
// work, far more than it costs to fetch the next block.
const blockSize = 1 << 12

// EachBlock calls do for every block [lo, hi) of the numbers below n, on as many
// goroutines as there are processors. The blocks are the same for any number of them,
// so what is summed by block, and then over blocks in order, is too.
func EachBlock(n int, do func(block, lo, hi int)) {
	EachPart(NumBlocks(n), func(block int) {
		do(block, block*blockSize, min(n, (block+1)*blockSize))
	})
}

// NumBlocks is how many blocks EachBlock makes of n.
func NumBlocks(n int) int { return (n + blockSize - 1) / blockSize }

// EachPart calls do for the numbers below parts, on as many goroutines as there are
// processors, low ones first. It returns when all calls have.
func EachPart(parts int, do func(part int)) { On(runtime.GOMAXPROCS(0), parts, do) }

// On is EachPart on the given number of goroutines; 1 or less is the caller's own.
func On(workers, parts int, do func(part int)) {
	if workers = min(workers, parts); workers <= 1 {
		for part := range parts {
			do(part)
		}
		return
	}
	var taken atomic.Int64
	var wait sync.WaitGroup
	for range workers {
		wait.Go(func() {
			for {
				part := int(taken.Add(1)) - 1
				if part >= parts {
					return
				}
				do(part)
			}
		})
	}
	wait.Wait()
}

// Gather lists the numbers below n that are wanted, in rising order.
func Gather(n int, wanted func(i int32) bool) []int32 {
	found := make([][]int32, NumBlocks(n))
	EachBlock(n, func(block, lo, hi int) {
		for i := int32(lo); i < int32(hi); i++ {
			if wanted(i) {
				found[block] = append(found[block], i)
			}
		}
	})
	count := 0
	for _, list := range found {
		count += len(list)
	}
	all := make([]int32, 0, count)
	for _, list := range found {
		all = append(all, list...)
	}
	return all
}
