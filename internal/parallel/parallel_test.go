package parallel

import (
	"math"
	"testing"
)

func TestSumIsTheSameForAnyWorkers(t *testing.T) {
	term := func(lo, hi int) float64 {
		var s float64
		for i := lo; i < hi; i++ {
			s += math.Sin(float64(i)) * 1e8
		}
		return s
	}
	for _, n := range []int{0, 1, 7, 1000, 12345} {
		want := Sum(1, n, 100, term)
		for workers := 2; workers <= 9; workers++ {
			if got := Sum(workers, n, 100, term); got != want {
				t.Errorf("n=%d workers=%d: sum %v, with one worker %v", n, workers, got, want)
			}
		}
	}
}

func TestForCoversEveryItemOnce(t *testing.T) {
	for _, n := range []int{1, 99, 100, 101, 5000} {
		seen := make([]int32, n)
		For(4, n, 100, func(lo, hi int) {
			for i := lo; i < hi; i++ {
				seen[i]++
			}
		})
		for i, c := range seen {
			if c != 1 {
				t.Fatalf("n=%d: item %d visited %d times", n, i, c)
			}
		}
	}
}

func TestPanicReachesTheCaller(t *testing.T) {
	defer func() {
		if r := recover(); r != "broken" {
			t.Errorf("recovered %v, want the worker's panic", r)
		}
	}()
	For(4, 1000, 1, func(lo, _ int) {
		if lo == 500 {
			panic("broken")
		}
	})
}
