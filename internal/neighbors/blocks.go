package neighbors

import (
	"context"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/gonum"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// blocks searches for a bucket of queries at a time. Inner products of a bucket with a bucket come from one matrix
// product, which takes a fraction of the time of as many distances; with x and y moved to the centre of the points,
//
//	|x - y|^2 / 2 = |x|^2 / 2 + |y|^2 / 2 - x.y
//
// up to a rounding error of at most slack * (|x|^2 + |y|^2) / 2. That formula cancels, so that it only chooses: whatever
// it leaves in doubt is computed again as in every other engine. Buckets whose box is too far from that of the queries
// are left out. Euclidean only.
type blocks struct {
	t     *tree
	level int
	half  []float64 // |x|^2 / 2 * (1 - slack)
	cols  []float64 // centred points, bucket by bucket: bucket [lo, hi) is a D by hi-lo matrix, row-major, at lo*D
	slack float64
}

// bucketSize is the largest number of points in a bucket, a multiple of points.Leaf. Products of 64 by 64 are the
// largest that gonum's dgemm does not spread over goroutines of its own.
const bucketSize = 4 * points.Leaf

// bucketLevel is the level of a tree whose nodes are buckets.
func (t *tree) bucketLevel() int { return max(0, t.levels-2) }

func newBlocks(t *tree, workers int) *blocks {
	n, d := t.pts.N, t.pts.D
	b := &blocks{t: t, level: t.bucketLevel(), half: make([]float64, n), cols: make([]float64, n*d)}
	// With u = 2^-53, the formula's parts err by at most (2d+2)u (product, started at |y|^2/2), (d/4+4)u (norms), 4u
	// (centring) and (d/2+10)u (the distance it stands for), each times (|x|^2 + |y|^2)/2. The slack is larger.
	b.slack = float64(4*d+64) * 0x1p-53
	centre := make([]float64, d)
	low, high := t.lowHigh(1)
	for j := range centre {
		centre[j] = low[j] + float64((high[j]-low[j])/2)
	}
	parallel.For(workers, 1<<b.level, 16, func(from, to int) {
		for v := from; v < to; v++ {
			lo, hi := b.bucket(v)
			for i := lo; i < hi; i++ {
				var s float64
				for j, x := range t.pts.Row(i) {
					x -= centre[j]
					b.cols[lo*d+j*(hi-lo)+i-lo] = x
					s += float64(x * x)
				}
				b.half[i] = s / 2 * (1 - b.slack)
			}
		}
	})
	return b
}

// bucket is the range of places of bucket v.
func (b *blocks) bucket(v int) (lo, hi int) {
	return points.Bound(b.t.pts.N, b.level, v), points.Bound(b.t.pts.N, b.level, v+1)
}

// batch is the scratch memory of one goroutine's batches of queries.
type batch struct {
	b         *blocks
	places    []int
	best      []best
	limit     []float64 // of each query: what half[y] - x.y may be
	query     []float64 // centred queries, a D by len(places) matrix
	product   []float64
	low, high []float64 // box around the queries
	distances int64
}

func (b *blocks) batch() *batch {
	d := b.t.pts.D
	return &batch{
		b: b, best: make([]best, bucketSize), limit: make([]float64, bucketSize), query: make([]float64, bucketSize*d),
		product: make([]float64, bucketSize*bucketSize), low: make([]float64, d), high: make([]float64, d),
	}
}

// others finds the nearest of the points at up to bucketSize places, each without the point itself, writing to
// close[q] and index[q] the closeness and place of those of places[q].
func (w *batch) others(ctx context.Context, places []int, close [][]float64, index [][]int32) {
	t, d, m := w.b.t, w.b.t.pts.D, len(places)
	w.places = places
	for q, i := range places {
		v := t.nodeOf(i, w.b.level)
		lo, hi := w.b.bucket(v)
		for j := range d {
			w.query[j*m+q] = w.b.cols[lo*d+j*(hi-lo)+i-lo]
		}
		for j, x := range t.pts.Row(i) {
			if q == 0 {
				w.low[j], w.high[j] = x, x
			}
			w.low[j], w.high[j] = min(w.low[j], x), max(w.high[j], x)
		}
		w.best[q] = best{pts: t.pts, id: t.id}
		w.best[q].reset(close[q], index[q], math.Inf(1))
		w.limit[q] = math.Inf(1)
	}
	home := t.nodeOf(places[0], w.b.level)
	w.scan(home)
	w.descend(ctx, 1, home+1<<w.b.level)
}

// worst is the largest closeness that can still change an answer.
func (w *batch) worst() float64 {
	worst := 0.0
	for q := range w.places {
		worst = max(worst, w.best[q].worst)
	}
	return worst
}

// descend visits the buckets below node v, nearer ones first, but for node home, which is done. It stops early when ctx
// ends: the answers are then worthless.
func (w *batch) descend(ctx context.Context, v, home int) {
	if v == home || w.gap(v) > w.worst() || ctx.Err() != nil {
		return
	}
	if first := 1 << w.b.level; v >= first {
		w.scan(v - first)
		return
	}
	near, far := 2*v, 2*v+1
	if w.gap(far) < w.gap(near) {
		near, far = far, near
	}
	w.descend(ctx, near, home)
	w.descend(ctx, far, home)
}

// gap is a lower bound on the closeness of any query to any point of node v.
func (w *batch) gap(v int) float64 {
	low, high := w.b.t.lowHigh(v)
	var s float64
	for j := range low {
		g := max(low[j]-w.high[j], w.low[j]-high[j], 0)
		s += float64(g * g)
	}
	return s * (1 - w.b.slack) // the sums differ in order from those of closeness
}

// scan offers the points of bucket v to all queries.
func (w *batch) scan(v int) {
	lo, hi := w.b.bucket(v)
	d, m, n := w.b.t.pts.D, len(w.places), hi-lo
	for q := range m {
		copy(w.product[q*n:(q+1)*n], w.b.half[lo:hi])
	}
	gonum.Implementation{}.Dgemm(blas.Trans, blas.NoTrans, m, n, d, -1, w.query, m, w.b.cols[lo*d:hi*d], n, 1, w.product, n)
	w.distances += int64(m) * int64(n)
	for q, place := range w.places {
		limit, b := w.limit[q], &w.best[q]
		for j, p := range w.product[q*n : (q+1)*n] {
			if p <= limit && lo+j != place {
				if c := squared(w.b.t.pts.Row(place), w.b.t.pts.Row(lo+j)); c <= b.worst {
					limit = b.offer(c, int32(lo+j))/2 - w.b.half[place]
				}
			}
		}
		w.limit[q] = limit
	}
}

// nodeOf is the node of a level that holds place i.
func (t *tree) nodeOf(i, level int) int {
	v := int(uint64(i) << level / uint64(t.pts.N))
	for points.Bound(t.pts.N, level, v+1) <= i {
		v++
	}
	return v
}

// all finds the nearest of every point.
func (b *blocks) all(ctx context.Context, k int, o Options) (*Lists, Report, error) {
	out := newLists(b.t.pts.N, k)
	works := make([]*batch, o.Workers)
	step := newSteps(1<<b.level, o.Progress)
	parallel.ForChunk(o.Workers, 1<<b.level, 1, func(worker, _, v, _ int) {
		if ctx.Err() != nil {
			return
		}
		if works[worker] == nil {
			works[worker] = b.batch()
		}
		lo, hi := b.bucket(v)
		var places []int
		var close [][]float64
		var index [][]int32
		for i := lo; i < hi; i++ {
			row := b.t.number(i)
			places = append(places, i)
			close, index = append(close, out.Dist[row*k:(row+1)*k]), append(index, out.Index[row*k:(row+1)*k])
		}
		works[worker].others(ctx, places, close, index)
		for _, x := range index {
			b.t.rename(x)
		}
		step.add(1)
	})
	rep := Report{Engine: "blocks", Exact: true, Recall: 1}
	for _, w := range works {
		if w != nil {
			rep.Distances += w.distances
		}
	}
	out.finish(b.t.metric, o.Workers)
	return out, rep, ctx.Err()
}
