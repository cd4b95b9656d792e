package lexmin

import (
	"sync"
	"sync/atomic"
)

// aside runs work on other workers while there are any to spare.
type aside struct {
	group   sync.WaitGroup
	failed  atomic.Pointer[any]
	started bool
}

// run starts do on another worker, or says that none is free.
func (a *aside) run(w *worker, do func(*worker)) bool {
	select {
	case w.tokens <- struct{}{}:
	default:
		return false
	}
	a.started = true
	a.group.Go(func() {
		defer func() {
			if r := recover(); r != nil {
				a.failed.CompareAndSwap(nil, &r)
			}
			<-w.tokens
		}()
		other := w.spare.Get().(*worker)
		do(other)
		other.stack = other.stack[:0]
		w.spare.Put(other)
	})
	return true
}

// wait ends when all that was started has ended; meanwhile another may take the caller's place. A panic on a worker
// is raised again where the caller is.
func (a *aside) wait(w *worker) {
	if !a.started {
		return
	}
	<-w.tokens
	a.group.Wait()
	w.tokens <- struct{}{}
	if r := a.failed.Load(); r != nil {
		panic(*r)
	}
}
