package mesh

import (
	"runtime"
	"sync"
	"sync/atomic"
)

// blockSize is how many items one goroutine takes at a time: some ten microseconds of
// work, far more than it costs to fetch the next block.
const blockSize = 1 << 12

// eachBlock calls do for every block [lo, hi) of the numbers below n, on as many
// goroutines as there are processors. The blocks are the same for any number of them,
// so what is summed by block, and then over blocks in order, is too.
func eachBlock(n int, do func(block, lo, hi int)) {
	eachPart(numBlocks(n), func(block int) {
		do(block, block*blockSize, min(n, (block+1)*blockSize))
	})
}

// numBlocks is how many blocks eachBlock makes of n.
func numBlocks(n int) int { return (n + blockSize - 1) / blockSize }

// eachPart calls do for the numbers below parts, on as many goroutines as there are
// processors, low ones first. It returns when all calls have.
func eachPart(parts int, do func(part int)) {
	workers := min(runtime.GOMAXPROCS(0), parts)
	if workers <= 1 {
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

// gather lists the numbers below n that are wanted, in rising order.
func gather(n int, wanted func(i int32) bool) []int32 {
	found := make([][]int32, numBlocks(n))
	eachBlock(n, func(block, lo, hi int) {
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
