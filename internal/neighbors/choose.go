package neighbors

import (
	"context"
	"math/rand/v2"
	"slices"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// AutoLimit is the most work that Auto does exactly: ten minutes of one processor, in nanoseconds by the model below. It
// is a model fed with counts, never a clock, so that the choice is the same on every machine.
const AutoLimit = 600e9

// Nanoseconds of one step in D columns, fitted by hand to measurements of each engine on one processor of 2023.
func pointCost(d int) float64 { return 4 + float64(0.7*float64(d)) }    // a distance in the tree
func boxCost(d int) float64   { return 3 + float64(1.2*float64(d)) }    // a box in the tree
func pairCost(d int) float64  { return 1.5 + float64(0.32*float64(d)) } // a pair in blocks

// plan is the engine for an exact search and the work it is expected to do.
type plan struct {
	blocks *blocks // nil for the tree
	work   float64 // nanoseconds by the model
}

const (
	probePoints  = 64
	probeBuckets = 2
)

// plan tries the tree on a few points, and blocks on a few buckets where the tree had to look at a good part of all
// points, and takes what costs less.
func (t *tree) plan(ctx context.Context, k int, o Options) plan {
	n, d := t.pts.N, t.pts.D
	places := sample(n, probePoints, o.Seed)
	finders := make([]*finder, len(places))
	parallel.For(o.Workers, len(places), 1, func(i, _ int) {
		f := t.finder()
		f.others(places[i], t.nodeOf(places[i], t.levels), make([]float64, k), make([]int32, k))
		finders[i] = f
	})
	var cost float64
	for _, f := range finders {
		cost += float64(float64(f.distances)*pointCost(d)) + float64(float64(f.boxes)*boxCost(d))
	}
	p := plan{work: cost / float64(len(places)) * float64(n)}
	if t.metric == points.Manhattan || cost/float64(len(places)) < 0.1*float64(n)*pairCost(d) && n > 4*bucketSize {
		return p
	}
	b := newBlocks(t, o.Workers)
	works := make([]*batch, probeBuckets)
	parallel.For(o.Workers, probeBuckets, 1, func(i, _ int) {
		lo, hi := b.bucket(t.nodeOf(places[i%len(places)], b.level))
		works[i] = b.batch()
		var bucket []int
		var close [][]float64
		var index [][]int32
		for place := lo; place < hi; place++ {
			bucket, close, index = append(bucket, place), append(close, make([]float64, k)), append(index, make([]int32, k))
		}
		works[i].others(ctx, bucket, close, index)
	})
	var pairs, queries float64
	for _, w := range works {
		pairs += float64(w.distances)
		queries += float64(len(w.places))
	}
	if work := pairs / queries * pairCost(d) * float64(n); work < p.work {
		return plan{blocks: b, work: work}
	}
	return p
}

// sample draws up to count distinct numbers below n, in increasing order.
func sample(n, count int, seed uint64) []int {
	r := rand.New(rand.NewPCG(seed, 0x5eed))
	if n <= count {
		out := make([]int, n)
		for i := range out {
			out[i] = i
		}
		return out
	}
	seen := map[int]bool{}
	var out []int
	for len(out) < count {
		if i := r.IntN(n); !seen[i] {
			seen[i] = true
			out = append(out, i)
		}
	}
	slices.Sort(out)
	return out
}

const (
	// fewPoints is the number of points below which approximate search is never worth its while.
	fewPoints = 2000
	// recallSample is the number of points that recall is measured on: at 10 neighbours the standard error is below 0.003.
	recallSample = 512
	// wantedRecall is the recall below which the search is repeated with longer lists.
	wantedRecall = 0.97
)

// approximate finds most of the nearest of every point and measures what share. Longer lists cost about their length
// squared: at 10 neighbours, lists of 14 gave recalls of 0.989 to 0.9996 and lists of 21 0.9988 to 1, at twice the
// distances, on 40,000 points of 8 to 16 intrinsic dimensions in 16 to 64 columns.
func (t *tree) approximate(ctx context.Context, k int, o Options) (*Lists, Report, error) {
	places := sample(t.pts.N, recallSample, o.Seed^0xACE)
	truth, computed := t.kthCloseness(ctx, places, k, o)
	rep := Report{Engine: "descent", Sample: len(places), Distances: computed}
	for pool := k + k/4 + 2; ; pool *= 2 {
		s, err := newDescent(t, pool)
		if err != nil {
			return nil, Report{}, err
		}
		distances, err := s.run(ctx, o)
		if err != nil {
			return nil, Report{}, err
		}
		rep.Distances += distances
		rep.Recall = s.recall(places, truth, k)
		if rep.Recall >= wantedRecall || pool >= 4*k+24 || pool >= t.pts.N-1 {
			return s.lists(k, o.Workers), rep, nil
		}
	}
}

// recall is the share of the k nearest of the places that s found. A neighbour is true if it is no farther than the
// k-th.
func (s *descent) recall(places []int, truth []float64, k int) float64 {
	found := 0
	for q, i := range places {
		for _, c := range s.list(i).close[:k] {
			if c <= truth[q] {
				found++
			}
		}
	}
	return float64(found) / float64(k*len(places))
}

// lists are the k nearest of each pool. A pool that holds fewer is given up for an exact search.
func (s *descent) lists(k, workers int) *Lists {
	n := s.t.pts.N
	out := newLists(n, k)
	parallel.For(workers, n, 4096, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			row, l := s.t.number(i), s.list(i)
			if l.index[k-1] < 0 {
				s.t.finder().others(i, s.t.nodeOf(i, s.t.levels), l.close[:k], l.index[:k])
			}
			copy(out.Dist[row*k:(row+1)*k], l.close)
			copy(out.Index[row*k:(row+1)*k], l.index)
			s.t.rename(out.Index[row*k : (row+1)*k])
		}
	})
	out.finish(s.t.metric, workers)
	return out
}

// kthCloseness finds exactly how near the k-th nearest of each of the places is.
func (t *tree) kthCloseness(ctx context.Context, places []int, k int, o Options) (truth []float64, distances int64) {
	m := len(places)
	close, index := make([]float64, m*k), make([]int32, m*k)
	counts := make([]int64, m)
	if t.metric == points.Manhattan {
		parallel.For(o.Workers, m, 1, func(q, _ int) {
			if ctx.Err() == nil {
				f := t.finder()
				f.others(places[q], t.nodeOf(places[q], t.levels), close[q*k:(q+1)*k], index[q*k:(q+1)*k])
				counts[q] = f.distances
			}
		})
	} else {
		b := newBlocks(t, o.Workers)
		parallel.For(o.Workers, m, bucketSize, func(lo, hi int) {
			if ctx.Err() == nil {
				w := b.batch()
				var c [][]float64
				var x [][]int32
				for q := lo; q < hi; q++ {
					c, x = append(c, close[q*k:(q+1)*k]), append(x, index[q*k:(q+1)*k])
				}
				w.others(ctx, places[lo:hi], c, x)
				counts[lo] = w.distances
			}
		})
	}
	truth = make([]float64, m)
	for q := range truth {
		truth[q] = close[(q+1)*k-1]
		distances += counts[q]
	}
	return truth, distances
}
