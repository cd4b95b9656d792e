package neighbors

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// nearest finds the k nearest of all points by the index of buckets: each bucket is scanned for itself, then whatever
// lies within the worst k-th distance found, nearest buckets first.
func (b *buckets) nearest(k, workers int) *Lists {
	t := b.t
	out := newLists(t.pts.N, k)
	parallel.For(workers, b.count(), 4, func(from, to int) {
		f := t.finder()
		for i := from; i < to; i++ {
			lo, hi := b.bounds(i)
			worst := 0.0
			bests := make([]best, hi-lo)
			for p := lo; p < hi; p++ {
				f.best.reset(out.Dist[p*k:(p+1)*k], out.Index[p*k:(p+1)*k], math.Inf(1))
				f.scan(t.pts.Row(p), lo, p)
				f.scan(t.pts.Row(p), p+1, hi)
				bests[p-lo] = f.best
				worst = max(worst, f.best.worst)
			}
			others := b.beside(i, math.Sqrt(worst)*(1+1e-12), worst*(1+1e-12))
			centre := t.pts.Row(lo + (hi-lo)/2)
			gap := func(o int32) float64 { return t.gap(centre, b.count()+int(o)) }
			slices.SortFunc(others, func(x, y int32) int { return int(math.Copysign(1, gap(x)-gap(y))) })
			for p := lo; p < hi; p++ {
				f.best = bests[p-lo]
				for _, o := range others {
					if ol, oh := b.bounds(int(o)); int(o) != i && t.gap(t.pts.Row(p), b.count()+int(o)) <= f.best.worst {
						f.scan(t.pts.Row(p), ol, oh)
					}
				}
			}
		}
	})
	out.finish(t.metric, workers)
	return out
}

// TestBucketsAgree holds the search that the benchmark times against the tree.
func TestBucketsAgree(t *testing.T) {
	r := rand.New(rand.NewPCG(51, 2))
	for _, shape := range shapes {
		s, err := points.Prepare(context.Background(), shape.make(r, 1500, 3), points.Options{})
		if err != nil {
			t.Fatal(err)
		}
		if s.Points.N < 500 {
			continue
		}
		tr, err := newTree(context.Background(), s.Points, Options{Metric: points.Euclidean, Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		want, _, err := tr.all(context.Background(), 8, Options{Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		if !same(newBuckets(tr).nearest(8, 2), want) {
			t.Errorf("%s: buckets and tree differ", shape.name)
		}
	}
}

// BenchmarkBuckets sets the tree against the index of buckets in kyroy/kdtree: all 10 nearest of uniform points, and of
// a sheet of five dimensions in 16 columns.
func BenchmarkBuckets(b *testing.B) {
	for _, d := range []int{2, 3, 5, 8, 16} {
		b.Run(fmt.Sprintf("d=%d", d), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, uint64(d)))
			n := map[int]int{2: 400_000, 3: 400_000, 5: 100_000, 8: 20_000, 16: 20_000}[d]
			m := fill(n, d, func(int, int) float64 { return r.Float64() })
			if d == 16 {
				m = clustered(n, d, 1, 5)
			}
			s, err := points.Prepare(context.Background(), m, points.Options{Workers: 2})
			if err != nil {
				b.Fatal(err)
			}
			var ours, theirs time.Duration
			for b.Loop() {
				t, err := newTree(context.Background(), s.Points, Options{Metric: points.Euclidean, Workers: 2})
				if err != nil {
					b.Fatal(err)
				}
				start := time.Now()
				if _, _, err := t.all(context.Background(), 10, Options{Workers: 2}); err != nil {
					b.Fatal(err)
				}
				ours += time.Since(start)
				start = time.Now()
				newBuckets(t).nearest(10, 2)
				theirs += time.Since(start)
			}
			b.ReportMetric(ours.Seconds()/float64(b.N), "s-tree")
			b.ReportMetric(theirs.Seconds()/float64(b.N), "s-buckets")
			b.ReportMetric(theirs.Seconds()/ours.Seconds(), "buckets/tree")
		})
	}
}

// BenchmarkIndex counts queries of new points, 10 nearest among a million in two columns, on two goroutines.
func BenchmarkIndex(b *testing.B) {
	r := rand.New(rand.NewPCG(2, 2))
	m := fill(1_000_000, 2, func(int, int) float64 { return r.Float64() })
	x, err := NewIndex(context.Background(), m, Options{Workers: 2})
	if err != nil {
		b.Fatal(err)
	}
	q := fill(200_000, 2, func(int, int) float64 { return r.Float64() })
	for b.Loop() {
		parallel.For(2, q.N, 1000, func(lo, hi int) {
			index, dist := make([]int32, 10), make([]float64, 10)
			for i := lo; i < hi; i++ {
				if err := x.Nearest(q.Row(i), index, dist); err != nil {
					b.Error(err)
				}
			}
		})
	}
	b.ReportMetric(float64(b.N*q.N)/b.Elapsed().Seconds(), "queries/s")
}
