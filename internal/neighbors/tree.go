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
		var err error
		if t.id, err = points.Order(ctx, t.pts, o.Workers); err != nil {
			return nil, err
		}
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
	b := t.box[v*2*d : (v+1)*2*d : (v+1)*2*d]
	if t.metric != points.Manhattan {
		switch d {
		case 2:
			g, h := max(b[0]-q[0], q[0]-b[2], 0), max(b[1]-q[1], q[1]-b[3], 0)
			return float64(g*g) + float64(h*h)
		case 3:
			g, h, k := max(b[0]-q[0], q[0]-b[3], 0), max(b[1]-q[1], q[1]-b[4], 0), max(b[2]-q[2], q[2]-b[5], 0)
			return float64(g*g) + float64(h*h) + float64(k*k)
		}
	}
	low, high := b[:d], b[d:]
	var s [4]float64
	body := d &^ 3
	for j, x := range q {
		g := max(low[j]-x, x-high[j], 0)
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
	distances int64 // computed so far
	boxes     int64 // looked at so far
	stack     []pending
}

// pending is a node still to be visited and how near its box is.
type pending struct {
	node int
	gap  float64
}

func (t *tree) finder() *finder {
	return &finder{t: t, best: best{pts: t.pts, id: t.id}, stack: make([]pending, 0, 2*t.levels+2)}
}

// nearest fills close and index with the places of the points nearest to q. There must be len(close) of them.
func (f *finder) nearest(q []float64, close []float64, index []int32) {
	f.best.reset(close, index, math.Inf(1))
	f.descend(q, 1, 0)
}

// others fills close and index with the places of the points nearest to the point at place i of a leaf, without that
// point. It climbs from the leaf to the root, looking into what each step adds; most of the neighbours are found first.
func (f *finder) others(i, leaf int, close []float64, index []int32) {
	f.best.reset(close, index, math.Inf(1))
	q := f.t.pts.Row(i)
	lo, hi := f.t.leaf(leaf)
	f.scan(q, lo, i)
	f.scan(q, i+1, hi)
	for v := 1<<f.t.levels + leaf; v > 1; v >>= 1 {
		if g := f.t.gap(q, v^1); g <= f.best.worst {
			f.descend(q, v^1, g)
		}
	}
}

// descend visits node v, whose box is at closeness gap to q, and what is below it, nearer nodes first.
func (f *finder) descend(q []float64, v int, gap float64) {
	leaves := 1 << f.t.levels
	stack := f.stack[:0]
	for {
		for v < leaves && gap <= f.best.worst {
			near, far := f.t.gap(q, 2*v), f.t.gap(q, 2*v+1)
			f.boxes += 2
			v *= 2
			w := v + 1
			if far < near {
				near, far, v, w = far, near, w, v
			}
			if far <= f.best.worst {
				stack = append(stack, pending{w, far})
			}
			gap = near
		}
		if gap <= f.best.worst {
			lo, hi := f.t.leaf(v - leaves)
			f.scan(q, lo, hi)
		}
		if len(stack) == 0 {
			return
		}
		v, gap = stack[len(stack)-1].node, stack[len(stack)-1].gap
		stack = stack[:len(stack)-1]
	}
}

// leaf is the range of places of a leaf.
func (t *tree) leaf(i int) (lo, hi int) {
	return points.Bound(t.pts.N, t.levels, i), points.Bound(t.pts.N, t.levels, i+1)
}

// scan offers the points at places [lo, hi). The sums for two and three columns are those of squared.
func (f *finder) scan(q []float64, lo, hi int) {
	f.distances += int64(hi - lo)
	d, worst := len(q), f.best.worst
	rows := f.t.pts.Data[lo*d : hi*d]
	switch {
	case d == 2 && f.t.metric != points.Manhattan:
		x, y := q[0], q[1]
		for i := lo; len(rows) >= 2; i++ {
			a, b := rows[0]-x, rows[1]-y
			rows = rows[2:]
			if c := float64(a*a) + float64(b*b); c <= worst {
				worst = f.best.offer(c, int32(i))
			}
		}
	case d == 3 && f.t.metric != points.Manhattan:
		x, y, z := q[0], q[1], q[2]
		for i := lo; len(rows) >= 3; i++ {
			a, b, e := rows[0]-x, rows[1]-y, rows[2]-z
			rows = rows[3:]
			if c := float64(a*a) + float64(b*b) + float64(e*e); c <= worst {
				worst = f.best.offer(c, int32(i))
			}
		}
	case f.t.metric == points.Manhattan:
		for i := lo; i < hi; i++ {
			if c := taxicab(q, rows[:d]); c <= worst {
				worst = f.best.offer(c, int32(i))
			}
			rows = rows[d:]
		}
	case d < 16:
		for i := lo; i < hi; i++ {
			if c := squared(q, rows[:d]); c <= worst {
				worst = f.best.offer(c, int32(i))
			}
			rows = rows[d:]
		}
	default:
		for i := lo; i < hi; i++ {
			if c := squaredUpTo(q, rows[:d], worst); c <= worst {
				worst = f.best.offer(c, int32(i))
			}
			rows = rows[d:]
		}
	}
}

// all finds the k nearest of every point of the tree.
func (t *tree) all(ctx context.Context, k int, o Options) (*Lists, Report, error) {
	n := t.pts.N
	out := newLists(n, k)
	finders := make([]*finder, o.Workers)
	step := newSteps(1<<t.levels, o.Progress)
	parallel.ForChunk(o.Workers, 1<<t.levels, 64, func(w, _, from, to int) {
		if ctx.Err() != nil {
			return
		}
		if finders[w] == nil {
			finders[w] = t.finder()
		}
		f := finders[w]
		for leaf := from; leaf < to; leaf++ {
			lo, hi := t.leaf(leaf)
			for i := lo; i < hi; i++ {
				row := t.number(i)
				index := out.Index[row*k : (row+1)*k]
				f.others(i, leaf, out.Dist[row*k:(row+1)*k], index)
				t.rename(index)
			}
		}
		step.add(to - from)
	})
	if err := ctx.Err(); err != nil {
		return nil, Report{}, err
	}
	out.finish(t.metric, o.Workers)
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
