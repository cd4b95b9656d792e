package neighbors

import (
	"context"
	"math"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// tree is a balanced k-d tree without pointers: points in the order of points.Order, nodes numbered as in a heap
// (children of v are 2v and 2v+1, the root is 1), and around each node the smallest box that holds its points.
type tree struct {
	pts    *points.Matrix
	id     []int32 // number of each point for the caller; nil where it is its place
	metric points.Metric
	levels int
	box    []float64 // of node v: D lows and D highs at v*2*D
}

// newTree builds a tree over pts, which is used as it stands if it is in order and copied if not.
func newTree(ctx context.Context, pts *points.Matrix, o Options) (*tree, error) {
	t := &tree{pts: pts, metric: o.Metric, levels: points.Levels(pts.N)}
	t.boxes(o.Workers)
	if !t.ordered() {
		t.pts = points.NewMatrix(pts.N, pts.D)
		copy(t.pts.Data, pts.Data)
		t.id = points.Order(t.pts, o.Workers)
		t.boxes(o.Workers)
	}
	return t, ctx.Err()
}

// boxes computes the box of every node, leaves first.
func (t *tree) boxes(workers int) {
	d, leaves := t.pts.D, 1<<t.levels
	t.box = make([]float64, 2*leaves*2*d)
	parallel.For(workers, leaves, 256, func(lo, hi int) {
		for leaf := lo; leaf < hi; leaf++ {
			low, high := t.lowHigh(leaves + leaf)
			a, b := points.Bound(t.pts.N, t.levels, leaf), points.Bound(t.pts.N, t.levels, leaf+1)
			copy(low, t.pts.Row(a))
			copy(high, t.pts.Row(a))
			for i := a + 1; i < b; i++ {
				for j, v := range t.pts.Row(i) {
					low[j], high[j] = min(low[j], v), max(high[j], v)
				}
			}
		}
	})
	for v := leaves - 1; v >= 1; v-- {
		low, high := t.lowHigh(v)
		ll, lh := t.lowHigh(2 * v)
		rl, rh := t.lowHigh(2*v + 1)
		for j := range low {
			low[j], high[j] = min(ll[j], rl[j]), max(lh[j], rh[j])
		}
	}
}

// lowHigh is the box of node v.
func (t *tree) lowHigh(v int) (low, high []float64) {
	d := t.pts.D
	b := t.box[v*2*d : (v+1)*2*d : (v+1)*2*d]
	return b[:d], b[d:]
}

// ordered says whether every node is cut across its widest column, as points.Order does.
func (t *tree) ordered() bool {
	for v := 1; v < 1<<t.levels; v++ {
		low, high := t.lowHigh(v)
		axis := 0
		for j := range low {
			if high[j]-low[j] > high[axis]-low[axis] {
				axis = j
			}
		}
		_, left := t.lowHigh(2 * v)
		right, _ := t.lowHigh(2*v + 1)
		if left[axis] > right[axis] {
			return false
		}
	}
	return true
}

// gap is the closeness of q to the nearest point of the box of node v. It is rounded as closeness is, and never above
// the closeness of a point inside: each term is at most the point's, and sums of such terms in one order keep that.
func (t *tree) gap(q []float64, v int) float64 {
	d := len(q)
	b := t.box[v*2*d : (v+1)*2*d]
	low, high := b[:d], b[d:2*d]
	var s [4]float64
	body := d &^ 3
	for j, x := range q {
		var g float64
		if x < low[j] {
			g = low[j] - x
		} else if x > high[j] {
			g = x - high[j]
		} else {
			continue
		}
		if t.metric != points.Manhattan {
			g = float64(g * g)
		}
		if j < body {
			s[j&3] += g
		} else {
			s[0] += g
		}
	}
	return (s[0] + s[1]) + (s[2] + s[3])
}

// finder is the scratch memory of one goroutine's queries.
type finder struct {
	t         *tree
	best      best
	near      func(a, b []float64) float64
	distances int64
	stack     []pending
}

type pending struct {
	node int32
	gap  float64
}

func (t *tree) finder() *finder {
	return &finder{t: t, best: best{pts: t.pts, id: t.id}, near: closeness(t.metric), stack: make([]pending, 0, 2*t.levels+2)}
}

// nearest fills close and index with the places of the points nearest to q, but for the point at place self (-1 for
// none). There must be len(close) such points.
func (f *finder) nearest(q []float64, self int, close []float64, index []int32) {
	f.best.reset(close, index, math.Inf(1))
	f.stack = append(f.stack[:0], pending{1, 0})
	leaves := 1 << f.t.levels
	for len(f.stack) > 0 {
		top := f.stack[len(f.stack)-1]
		f.stack = f.stack[:len(f.stack)-1]
		if top.gap > f.best.worst {
			continue
		}
		v := int(top.node)
		for v < leaves {
			l, r := pending{int32(2 * v), f.t.gap(q, 2*v)}, pending{int32(2*v + 1), f.t.gap(q, 2*v+1)}
			if r.gap < l.gap {
				l, r = r, l
			}
			if r.gap <= f.best.worst {
				f.stack = append(f.stack, r)
			}
			v, top.gap = int(l.node), l.gap
			if l.gap > f.best.worst {
				break
			}
		}
		if v >= leaves && top.gap <= f.best.worst {
			f.scan(q, self, v-leaves)
		}
	}
}

// scan offers the points of a leaf.
func (f *finder) scan(q []float64, self, leaf int) {
	lo, hi := points.Bound(f.t.pts.N, f.t.levels, leaf), points.Bound(f.t.pts.N, f.t.levels, leaf+1)
	for i := lo; i < hi; i++ {
		if c := f.near(q, f.t.pts.Row(i)); c <= f.best.worst && i != self {
			f.best.offer(c, int32(i))
		}
	}
	f.distances += int64(hi - lo)
}

// all finds the k nearest of every point of the tree.
func (t *tree) all(ctx context.Context, k int, o Options) (*Lists, Report, error) {
	n := t.pts.N
	out := &Lists{N: n, K: k, Index: make([]int32, n*k), Dist: make([]float64, n*k)}
	finders := make([]*finder, o.Workers)
	step := newSteps(n, o.Progress)
	parallel.ForChunk(o.Workers, n, 1024, func(w, _, lo, hi int) {
		if ctx.Err() != nil {
			return
		}
		if finders[w] == nil {
			finders[w] = t.finder()
		}
		f := finders[w]
		for i := lo; i < hi; i++ {
			row := t.number(i)
			index := out.Index[row*k : (row+1)*k]
			f.nearest(t.pts.Row(i), i, out.Dist[row*k:(row+1)*k], index)
			t.rename(index)
		}
		step.add(hi - lo)
	})
	if err := ctx.Err(); err != nil {
		return nil, Report{}, err
	}
	parallel.For(o.Workers, n*k, 1<<16, func(lo, hi int) { distances(t.metric, out.Dist[lo:hi]) })
	rep := Report{Engine: "tree", Exact: true, Recall: 1}
	for _, f := range finders {
		if f != nil {
			rep.Distances += f.distances
		}
	}
	return out, rep, nil
}

// number is the caller's number of the point at a place.
func (t *tree) number(i int) int {
	if t.id == nil {
		return i
	}
	return int(t.id[i])
}

// rename turns places into the caller's numbers.
func (t *tree) rename(index []int32) {
	if t.id == nil {
		return
	}
	for r, i := range index {
		index[r] = t.id[i]
	}
}
