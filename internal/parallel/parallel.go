// Package parallel runs loops on several workers so that the answer does not depend on their number.
//
// A loop over n items is cut into fixed chunks of grain items. Workers take whole chunks; what a chunk computes
// depends on the chunk alone, and sums over chunks are added in chunk order.
package parallel

import (
	"runtime"
	"sync"
	"sync/atomic"
)

// Workers gives the number of workers to use for a request: requested if positive, otherwise GOMAXPROCS.
func Workers(requested int) int {
	if requested > 0 {
		return requested
	}
	return runtime.GOMAXPROCS(0)
}

// For calls body(lo, hi) for consecutive chunks [lo, hi) of grain items that cover [0, n). Calls may run at the
// same time on up to workers goroutines. body must write only to what belongs to its own chunk.
func For(workers, n, grain int, body func(lo, hi int)) {
	ForChunk(workers, n, grain, func(_, _, lo, hi int) { body(lo, hi) })
}

// ForChunk is For with two more arguments: the worker that runs the chunk (0 <= worker < workers), for scratch
// memory, and the chunk's number, for results kept by chunk. Nothing that reaches the answer may depend on worker.
func ForChunk(workers, n, grain int, body func(worker, chunk, lo, hi int)) {
	if n <= 0 {
		return
	}
	grain = max(grain, 1)
	chunks := (n + grain - 1) / grain
	workers = min(Workers(workers), chunks)
	run := func(worker, c int) { body(worker, c, c*grain, min((c+1)*grain, n)) }
	if workers == 1 {
		for c := range chunks {
			run(0, c)
		}
		return
	}
	var next atomic.Int64
	var wg sync.WaitGroup
	var failed atomic.Pointer[any]
	for w := range workers {
		wg.Go(func() {
			defer func() {
				if r := recover(); r != nil {
					failed.CompareAndSwap(nil, &r)
				}
			}()
			for failed.Load() == nil {
				c := int(next.Add(1)) - 1
				if c >= chunks {
					return
				}
				run(w, c)
			}
		})
	}
	wg.Wait()
	// A panic on a worker would end the process before the caller could report it: raise it where the caller is.
	if r := failed.Load(); r != nil {
		panic(*r)
	}
}

// Sum adds part(lo, hi) over the chunks of [0, n), in chunk order, so that the rounding is the same for any workers.
func Sum(workers, n, grain int, part func(lo, hi int) float64) float64 {
	if n <= 0 {
		return 0
	}
	grain = max(grain, 1)
	parts := make([]float64, (n+grain-1)/grain)
	ForChunk(workers, n, grain, func(_, c, lo, hi int) { parts[c] = part(lo, hi) })
	var s float64
	for _, v := range parts {
		s += v
	}
	return s
}

// Max is the largest part(lo, hi) over the chunks of [0, n), or 0 for n = 0.
func Max(workers, n, grain int, part func(lo, hi int) float64) float64 {
	if n <= 0 {
		return 0
	}
	grain = max(grain, 1)
	parts := make([]float64, (n+grain-1)/grain)
	ForChunk(workers, n, grain, func(_, c, lo, hi int) { parts[c] = part(lo, hi) })
	m := parts[0]
	for _, v := range parts[1:] {
		m = max(m, v)
	}
	return m
}
