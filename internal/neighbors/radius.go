package neighbors

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"
	"sync/atomic"

	"github.com/kyroy/kdtree"
	"github.com/kyroy/kdtree/kdrange"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// TooManyPairsError says that a radius joins more pairs than the caller has room for.
type TooManyPairsError struct {
	Radius   float64
	MaxPairs int
}

func (e *TooManyPairsError) Error() string {
	return fmt.Sprintf("more than %d neighbours lie within radius %v of the points", e.MaxPairs, e.Radius)
}

// WithinRadius finds, for every point of pts, all others at distance radius or less, nearest first: 0 < radius < +Inf.
// A *TooManyPairsError ends the search once the lists together outgrow o.MaxPairs. Exact whatever o.Search says.
//
// Points are taken by buckets, the nodes of the tree with at most bucketSize points. The boxes of the buckets are
// filed by size class, the power of two above their largest half-width, with the centres of each class in one
// kyroy/kdtree: what may lie within the radius of a bucket has its centre in the bucket's box grown by the radius and
// the class's half-width. Without the classes one wide bucket would make every search wide.
func WithinRadius(ctx context.Context, pts *points.Matrix, radius float64, o Options) (*Ragged, Report, error) {
	if !(radius > 0) || math.IsInf(radius, 1) {
		return nil, Report{}, fmt.Errorf("radius %v is not a positive number", radius)
	}
	if err := check(pts, &o); err != nil {
		return nil, Report{}, err
	}
	t, err := newTree(ctx, pts, o)
	if err != nil {
		return nil, Report{}, err
	}
	b := newBuckets(t)
	out := make([]reach, b.count())
	var total, computed atomic.Int64
	step := newSteps(b.count(), o.Progress)
	parallel.For(o.Workers, b.count(), 4, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			if ctx.Err() != nil || total.Load() > int64(o.MaxPairs) {
				return
			}
			out[i] = b.within(i, radius, o.MaxPairs)
			total.Add(int64(len(out[i].pairs)))
			computed.Add(out[i].distances)
		}
		step.add(hi - lo)
	})
	if err := ctx.Err(); err != nil {
		return nil, Report{}, err
	}
	if total.Load() > int64(o.MaxPairs) {
		return nil, Report{}, &TooManyPairsError{Radius: radius, MaxPairs: o.MaxPairs}
	}
	return b.gather(out, o.Workers), Report{Engine: "buckets", Exact: true, Recall: 1, Distances: computed.Load()}, nil
}

// buckets are the nodes of one level of a tree, indexed by their centres.
type buckets struct {
	t       *tree
	level   int
	classes []class
}

// class holds the buckets whose largest half-width is in (half/2, half].
type class struct {
	half   float64
	number int // exponent of half
	tree   *kdtree.KDTree
}

func newBuckets(t *tree) *buckets {
	b := &buckets{t: t, level: t.bucketLevel()}
	files := map[int][]kdtree.Point{}
	for i := range b.count() {
		low, high := t.lowHigh(b.count() + i)
		centre, half := make([]float64, len(low)), 0.0
		for j := range low {
			centre[j] = low[j] + float64((high[j]-low[j])/2)
			half = max(half, high[j]-centre[j], centre[j]-low[j])
		}
		_, number := math.Frexp(half)
		files[number] = append(files[number], member{centre, int32(i)})
	}
	for number, centres := range files {
		b.classes = append(b.classes, class{math.Ldexp(1, number), number, kdtree.New(centres)})
	}
	slices.SortFunc(b.classes, func(x, y class) int { return cmp.Compare(x.number, y.number) })
	return b
}

func (b *buckets) count() int { return 1 << b.level }

// bounds are the places of the points of bucket i.
func (b *buckets) bounds(i int) (lo, hi int) {
	return points.Bound(b.t.pts.N, b.level, i), points.Bound(b.t.pts.N, b.level, i+1)
}

// reach is what lies within the radius of the points of one bucket.
type reach struct {
	pairs     []pair // in the order of the bucket's points
	counts    []int  // pairs of each point
	distances int64
}

type pair struct {
	close float64
	place int32
}

// within finds all pairs from bucket i; it stops early past limit of them.
func (b *buckets) within(i int, radius float64, limit int) reach {
	near, bound := closeness(b.t.metric), bound(b.t.metric, radius)
	var r reach
	lo, hi := b.bounds(i)
	others := b.beside(i, radius, bound)
	for p := lo; p < hi; p++ {
		q, first := b.t.pts.Row(p), len(r.pairs)
		for _, o := range others {
			if b.t.gap(q, b.count()+int(o)) > bound {
				continue
			}
			ol, oh := b.bounds(int(o))
			r.distances += int64(oh - ol)
			for s := ol; s < oh; s++ {
				if c := near(q, b.t.pts.Row(s)); c <= bound && s != p {
					r.pairs = append(r.pairs, pair{c, int32(s)})
				}
			}
		}
		slices.SortFunc(r.pairs[first:], func(x, y pair) int {
			if c := cmp.Compare(x.close, y.close); c != 0 {
				return c
			}
			if c := slices.Compare(b.t.pts.Row(int(x.place)), b.t.pts.Row(int(y.place))); c != 0 {
				return c
			}
			return cmp.Compare(b.t.number(int(x.place)), b.t.number(int(y.place)))
		})
		r.counts = append(r.counts, len(r.pairs)-first)
		if len(r.pairs) > limit {
			return r
		}
	}
	return r
}

// bound is the largest closeness whose distance is radius or less as computed.
func bound(m points.Metric, radius float64) float64 {
	if m == points.Manhattan {
		return radius
	}
	b := radius * radius
	for math.Sqrt(b) > radius {
		b = math.Nextafter(b, 0)
	}
	for up := math.Nextafter(b, math.Inf(1)); math.Sqrt(up) <= radius && !math.IsInf(b, 1); up = math.Nextafter(b, math.Inf(1)) {
		b = up
	}
	return b
}

// beside lists the buckets whose box comes within the radius of the box of bucket i, itself among them.
func (b *buckets) beside(i int, radius, bound float64) []int32 {
	low, high := b.t.lowHigh(b.count() + i)
	box := make(kdrange.Range, len(low))
	nearest := make([]float64, len(low))
	var out []int32
	for _, c := range b.classes {
		grow := float64((radius + c.half) * (1 + 1e-9)) // rounding of the centres
		for j := range low {
			box[j] = [2]float64{low[j] - grow, high[j] + grow}
		}
		for _, p := range c.tree.RangeSearch(box) {
			o := p.(member).id
			ol, _ := b.t.lowHigh(b.count() + int(o))
			for j := range nearest { // the point of bucket i's box nearest to the other box, in each column
				nearest[j] = min(max(low[j], ol[j]), high[j])
			}
			if b.t.gap(nearest, b.count()+int(o)) <= bound {
				out = append(out, o)
			}
		}
	}
	return out
}

// gather puts the buckets' finds into the caller's order.
func (b *buckets) gather(found []reach, workers int) *Ragged {
	n := b.t.pts.N
	out := &Ragged{Start: make([]int, n+1)}
	for i := range found {
		lo, _ := b.bounds(i)
		for p, c := range found[i].counts {
			out.Start[b.t.number(lo+p)+1] = c
		}
	}
	for i := range n {
		out.Start[i+1] += out.Start[i]
	}
	out.Index, out.Dist = make([]int32, out.Start[n]), make([]float64, out.Start[n])
	parallel.For(workers, len(found), 16, func(from, to int) {
		for i := from; i < to; i++ {
			lo, _ := b.bounds(i)
			at := 0
			for p, c := range found[i].counts {
				to := out.Start[b.t.number(lo+p)]
				for s, pr := range found[i].pairs[at : at+c] {
					out.Index[to+s], out.Dist[to+s] = int32(b.t.number(int(pr.place))), pr.close
				}
				at += c
			}
			found[i] = reach{}
		}
	})
	parallel.For(workers, len(out.Dist), 1<<16, func(lo, hi int) { distances(b.t.metric, out.Dist[lo:hi]) })
	return out
}
