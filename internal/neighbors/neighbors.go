// Package neighbors finds the nearest points of points: the K nearest of every point (KNearest), every pair within a
// distance (WithinRadius), the nearest of new points (Index), and the nearest of a set that grows (Growing).
//
// Points are rows of a points.Matrix, finite, of moderate size (their squared distances neither overflow nor vanish), as
// points.Prepare makes them. Every answer is exact unless the caller allows an approximate one and the Report says so,
// and is the same for any number of workers and any order of the rows: neighbours are ordered by the computed squared
// distance (L1 distance with Manhattan) and, where that is equal, lexicographically by their coordinates, so that the
// row number decides only between identical points, which points.Prepare leaves none of. All engines compute a distance
// by the same sums in the same order and hence agree to the last bit.
//
// The engines: "tree", a k-d tree without pointers, for points of few intrinsic dimensions; "blocks", matrix products of
// buckets of points, where a tree would look at most points anyway; "descent", the approximate one; and "buckets", boxes of
// points in kyroy/kdtree, for WithinRadius. KNearest chooses by trying the exact engines on a few points and counting
// their work. The bucket index could find the k nearest too; in processor time it takes 1.3 times what the tree takes in
// two and three columns, where the boxes it needs are the tree's, and 1.6 to 2 times in five and more (BenchmarkBuckets).
package neighbors

import (
	"cmp"
	"context"
	"fmt"
	"math"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// Search says whether neighbours may be approximate.
type Search string

// Kinds of search.
const (
	Exact       Search = "exact"       // the true neighbours, however long it takes
	Approximate Search = "approximate" // nearly all the true neighbours, their share measured and reported
	Auto        Search = "auto"        // Approximate where Exact is expected to cost more than AutoLimit, Exact elsewhere
)

// Options steer a search. The zero value means exact, Euclidean, all processors, no progress.
type Options struct {
	Search   Search              // "" means Exact
	Metric   points.Metric       // "" means Euclidean; points.Cosine is Euclidean on the unit vectors that points.Prepare makes
	Workers  int                 // 0 means GOMAXPROCS; the answer does not depend on it
	Seed     uint64              // draws of the approximate search and of the sample its recall is measured on
	MaxPairs int                 // most entries WithinRadius may store (each pair is two); 0 means 1<<27
	Progress func(share float64) // called now and then, share in [0, 1], by one goroutine at a time; may be nil
}

// Lists hold K neighbours for each of N points, nearest first, the point itself left out.
type Lists struct {
	N, K  int
	Index []int32   // Index[i*K+r] is the r-th nearest of point i
	Dist  []float64 // its distance
}

// Row is the neighbours and distances of point i, to be read only.
func (l *Lists) Row(i int) ([]int32, []float64) {
	lo, hi := i*l.K, (i+1)*l.K
	return l.Index[lo:hi:hi], l.Dist[lo:hi:hi]
}

func newLists(n, k int) *Lists {
	return &Lists{N: n, K: k, Index: make([]int32, n*k), Dist: make([]float64, n*k)}
}

// finish turns closeness into distance.
func (l *Lists) finish(m points.Metric, workers int) {
	parallel.For(workers, len(l.Dist), 1<<16, func(lo, hi int) { distances(m, l.Dist[lo:hi]) })
}

// Ragged holds lists of various lengths: that of point i is [Start[i], Start[i+1]).
type Ragged struct {
	Start []int
	Index []int32
	Dist  []float64
}

// Row is the neighbours and distances of point i, to be read only.
func (l *Ragged) Row(i int) ([]int32, []float64) {
	lo, hi := l.Start[i], l.Start[i+1]
	return l.Index[lo:hi:hi], l.Dist[lo:hi:hi]
}

// Report says how a search went.
type Report struct {
	Engine    string  // "tree", "blocks", "buckets" or "descent"
	Exact     bool    // the answer is exact
	Recall    float64 // share of true neighbours found: 1 if exact, measured on Sample points if not
	Sample    int     // points the recall was measured on; 0 if exact
	Distances int64   // distances computed
}

// KNearest finds the k nearest other points of every point of pts, 1 <= k < pts.N.
func KNearest(ctx context.Context, pts *points.Matrix, k int, o Options) (*Lists, Report, error) {
	if k < 1 || k >= pts.N {
		return nil, Report{}, fmt.Errorf("%d nearest of %d points: the number must be at least 1 and less than that of points", k, pts.N)
	}
	if err := check(pts, &o); err != nil {
		return nil, Report{}, err
	}
	t, err := newTree(ctx, pts, o)
	if err != nil {
		return nil, Report{}, err
	}
	if o.Search == Approximate && pts.N >= fewPoints {
		return t.approximate(ctx, k, o)
	}
	p := t.plan(ctx, k, o)
	switch {
	case o.Search == Auto && p.work > AutoLimit:
		return t.approximate(ctx, k, o)
	case p.blocks != nil:
		return p.blocks.all(ctx, k, o)
	}
	return t.all(ctx, k, o)
}

// check refuses what no search can take, and fills in the defaults of o.
func check(pts *points.Matrix, o *Options) error {
	o.Search, o.Metric = cmp.Or(o.Search, Exact), cmp.Or(o.Metric, points.Euclidean)
	o.Workers, o.MaxPairs = parallel.Workers(o.Workers), cmp.Or(o.MaxPairs, 1<<27)
	switch o.Search {
	case Exact, Approximate, Auto:
	default:
		return fmt.Errorf("search %q is not known", o.Search)
	}
	switch o.Metric {
	case points.Euclidean, points.Manhattan:
	case points.Cosine:
		o.Metric = points.Euclidean
	default:
		return fmt.Errorf("metric %q is not known", o.Metric)
	}
	if pts.N < 1 || pts.D < 1 || pts.N > math.MaxInt32 {
		return fmt.Errorf("no neighbours among %d points in %d columns", pts.N, pts.D)
	}
	for k, v := range pts.Data {
		if !(math.Abs(v) <= 0x1p501) {
			return fmt.Errorf("point %d: coordinate %d is %v, beyond what distances can hold", k/pts.D, k%pts.D, v)
		}
	}
	return nil
}
