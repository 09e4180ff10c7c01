package sparse

import (
	"sync"
	"sync/atomic"
)

// inParallel calls do(worker, i) once for each i from 0 to n-1, on up to the given number of goroutines,
// small i first. It returns when all calls have.
func inParallel(workers, n int, do func(worker, i int)) {
	workers = min(workers, n)
	if workers <= 1 {
		for i := range n {
			do(0, i)
		}
		return
	}
	var next atomic.Int64
	var wait sync.WaitGroup
	body := func(worker int) {
		for {
			i := int(next.Add(1)) - 1
			if i >= n {
				return
			}
			do(worker, i)
		}
	}
	for worker := 1; worker < workers; worker++ {
		wait.Go(func() { body(worker) })
	}
	body(0)
	wait.Wait()
}
