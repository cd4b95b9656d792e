package lexmin

import (
	"context"
	"fmt"
	"math"
	"slices"
	"testing"
	"time"

	"pinfill/internal/testproblems"
)

// BenchmarkSolve prints the time of a solve as a multiple of one Dijkstra search from all labels over the same graph,
// taken in the same run, and the work done.
func BenchmarkSolve(b *testing.B) {
	for _, c := range []struct{ n, d int }{{4000, 2}, {50000, 2}, {200000, 2}, {200000, 3}} {
		pr := testproblems.Cloud(1, c.n, c.d, 10, 20)
		b.Run(fmt.Sprintf("n=%d/d=%d", c.n, c.d), func(b *testing.B) {
			var st Stats
			for b.Loop() {
				var err error
				if _, st, err = Solve(context.Background(), pr.Graph, pr.Fixed, pr.Values, Options{}); err != nil {
					b.Fatal(err)
				}
			}
			solve := b.Elapsed().Seconds() / float64(b.N)
			b.ReportMetric(solve/oneSearch(pr), "dijkstras")
			b.ReportMetric(float64(st.HeapPops)/float64(c.n), "pops/row")
			b.ReportMetric(float64(st.Paths)/float64(c.n), "paths/row")
			b.ReportMetric(float64(st.Searches)/float64(st.Paths), "searches/path")
		})
	}
}

// oneSearch is the median time in seconds of five searches from all labels.
func oneSearch(pr testproblems.Problem) float64 {
	s := newSolver(pr.Graph, pr.Fixed, make([]float64, len(pr.Fixed)), 0, 1, Options{})
	s.length = make([]float64, len(pr.Graph.Val))
	w := s.spare.Get().(*worker)
	var all []int32
	for v := range s.set {
		if s.set[v] != held {
			all = append(all, int32(v))
		}
	}
	w.measure(part{vertices: all}, slices.Max(pr.Graph.Val))
	var times []float64
	for range 5 {
		start := time.Now()
		w.distances(all, 1, 0, 1, s.upper, s.ids.Add(1))
		times = append(times, time.Since(start).Seconds())
	}
	if math.IsInf(s.upper[all[0]].dist, 1) {
		panic("not reached")
	}
	slices.Sort(times)
	return times[2]
}
