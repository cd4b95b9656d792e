package neighbors

import "sync"

// steps reports the progress of a parallel loop of n steps, at most a hundred times.
type steps struct {
	mu       sync.Mutex
	n, done  int
	next     int
	progress func(share float64)
}

func newSteps(n int, progress func(share float64)) *steps {
	return &steps{n: n, progress: progress, next: n / 100}
}

// add counts m more steps as done.
func (s *steps) add(m int) {
	if s.progress == nil {
		return
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.done += m
	if s.done >= s.next {
		s.next = s.done + s.n/100
		s.progress(float64(s.done) / float64(s.n))
	}
}
