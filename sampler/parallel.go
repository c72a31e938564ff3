package sampler

import (
	"runtime"
	"sync"
	"sync/atomic"
)

// parallel calls work(0) … work(n−1) from at most threads goroutines (0: one
// per processor), each with a work function of its own from New. Callers write
// results by index, so that they do not depend on who did what.
func parallel(n, threads int, New func() func(i int)) {
	if threads < 1 {
		threads = runtime.GOMAXPROCS(0)
	}
	var next atomic.Int64
	run := func() {
		work := New()
		for i := next.Add(1) - 1; i < int64(n); i = next.Add(1) - 1 {
			work(int(i))
		}
	}
	if threads = min(threads, n); threads <= 1 {
		run()
		return
	}
	var group sync.WaitGroup
	for range threads {
		group.Go(run)
	}
	group.Wait()
}

// each is parallel for work that needs nothing of its own.
func each(n, threads int, work func(i int)) {
	parallel(n, threads, func() func(int) { return work })
}
