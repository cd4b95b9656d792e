package neighbors

import (
	"context"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/parallel"
)

// descent is the approximate search: nearest-neighbour descent (W. Dong, M. Charikar, K. Li, Efficient k-nearest
// neighbor graph construction for generic similarity measures, WWW 2011), started from the leaves of trees of random
// projections. A neighbour of a neighbour is likely a neighbour: in each round every point looks at the neighbours of
// its neighbours, in both directions of the graph, that it has not looked at before.
//
// It differs from the paper so as to give the same answer for any number of workers: rounds are synchronous, each
// reading the lists the last one left, and each point changes its own list only. A distance may so be computed twice.
type descent struct {
	t     *tree
	pool  int       // neighbours kept for each point
	close []float64 // pool of each point
	index []int32
	fresh []bool // found in the last round
	links links  // neighbours in both directions
}

// links lists for each point its neighbours in both directions, at most width of them, without repetition.
type links struct {
	width int
	count []int32
	index []int32
	fresh []bool
}

const (
	projectionTrees = 8
	mostRounds      = 16
	// settled is the share of list places that changed in the last round below which rounds end (delta of the paper).
	settled = 0.0005
)

func newDescent(t *tree, pool int) (*descent, error) {
	n := t.pts.N
	pool = min(pool, n-1)
	if n > math.MaxInt32/pool {
		return nil, fmt.Errorf("approximate search of %d points with lists of %d: more than %d entries", n, pool, math.MaxInt32)
	}
	s := &descent{t: t, pool: pool, close: make([]float64, n*pool), index: make([]int32, n*pool), fresh: make([]bool, n*pool)}
	for i := range s.close {
		s.close[i], s.index[i] = math.Inf(1), -1
	}
	w := 2 * pool
	s.links = links{width: w, count: make([]int32, n), index: make([]int32, n*w), fresh: make([]bool, n*w)}
	return s, nil
}

// list is the pool of point i, in the form that takes offers.
func (s *descent) list(i int) list {
	lo, hi := i*s.pool, (i+1)*s.pool
	return list{s.t, s.close[lo:hi], s.index[lo:hi], s.fresh[lo:hi]}
}

// list is a pool, nearest first; places not yet filled hold -1 at infinity.
type list struct {
	t     *tree
	close []float64
	index []int32
	fresh []bool
}

// offer puts point i at closeness c into the list, unless it stands there, and says whether it did.
func (l list) offer(c float64, i int32) bool {
	last := len(l.close) - 1
	b := best{pts: l.t.pts, id: l.t.id}
	if c > l.close[last] || (c == l.close[last] && (l.index[last] >= 0 && !b.before(i, l.index[last]))) {
		return false
	}
	j := len(l.close)
	for j > 0 && (c < l.close[j-1] || (c == l.close[j-1] && (l.index[j-1] < 0 || b.before(i, l.index[j-1])))) {
		j--
	}
	if j > 0 && l.index[j-1] == i { // equal closeness and neither before the other: it is the same point
		return false
	}
	copy(l.close[j+1:], l.close[j:last])
	copy(l.index[j+1:], l.index[j:last])
	copy(l.fresh[j+1:], l.fresh[j:last])
	l.close[j], l.index[j], l.fresh[j] = c, i, true
	return true
}

// run searches and says how many distances it computed.
func (s *descent) run(ctx context.Context, o Options) (distances int64, err error) {
	n := s.t.pts.N
	step := newSteps(projectionTrees+mostRounds, o.Progress)
	for tree := range projectionTrees {
		if err := ctx.Err(); err != nil {
			return 0, err
		}
		distances += s.start(o.Seed+uint64(tree), o.Workers)
		step.add(1)
	}
	for range mostRounds {
		if err := ctx.Err(); err != nil {
			return 0, err
		}
		s.link(o.Workers)
		changed, computed := s.round(ctx, o.Workers)
		distances += computed
		step.add(1)
		if float64(changed) < settled*float64(n)*float64(s.pool) {
			break
		}
	}
	return distances, ctx.Err()
}

// start offers to each point the others of its leaf in one tree of random projections.
func (s *descent) start(seed uint64, workers int) int64 {
	places, starts := projections(s.t, 2*s.pool, seed, workers)
	near := closeness(s.t.metric)
	var total int64
	for v := range len(starts) - 1 {
		m := int64(starts[v+1] - starts[v])
		total += m * (m - 1) / 2
	}
	parallel.For(workers, len(starts)-1, 16, func(from, to int) {
		for v := from; v < to; v++ {
			leaf := places[starts[v]:starts[v+1]]
			for a, i := range leaf {
				for _, j := range leaf[:a] {
					c := near(s.t.pts.Row(int(i)), s.t.pts.Row(int(j)))
					s.list(int(i)).offer(c, j)
					s.list(int(j)).offer(c, i)
				}
			}
		}
	})
	return total
}

// link sets links: the list of each point and, nearest first as room allows, the points in whose lists it stands.
// All that is fresh is then looked at once, and is fresh no more.
func (s *descent) link(workers int) {
	n, w := s.t.pts.N, s.links.width
	starts := make([]int32, n+1)
	for _, j := range s.index {
		if j >= 0 {
			starts[j+1]++
		}
	}
	for i := range n {
		starts[i+1] += starts[i]
	}
	type arrow struct {
		slot int32 // of the list entry
		from int32
	}
	arrows := make([]arrow, starts[n])
	fill := slices.Clone(starts[:n])
	for i := range n {
		for r := range s.pool {
			slot := i*s.pool + r
			if j := s.index[slot]; j >= 0 {
				arrows[fill[j]] = arrow{int32(slot), int32(i)}
				fill[j]++
			}
		}
	}
	parallel.For(workers, n, 512, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			index, fresh := s.links.index[i*w:(i+1)*w], s.links.fresh[i*w:(i+1)*w]
			l, c := s.list(i), 0
			for r, j := range l.index {
				if j >= 0 {
					index[c], fresh[c] = j, l.fresh[r]
					c++
				}
			}
			back := arrows[starts[i]:starts[i+1]]
			slices.SortFunc(back, func(a, b arrow) int {
				switch x, y := s.close[a.slot], s.close[b.slot]; {
				case x < y:
					return -1
				case x > y:
					return 1
				}
				return int(a.from) - int(b.from)
			})
			for _, b := range back {
				if c == w {
					break
				}
				if !slices.Contains(l.index, b.from) {
					index[c], fresh[c] = b.from, s.fresh[b.slot]
					c++
				}
			}
			s.links.count[i] = int32(c)
		}
	})
	clear(s.fresh)
}

// round lets every point look at the neighbours of its neighbours.
func (s *descent) round(ctx context.Context, workers int) (changed, distances int64) {
	n, w := s.t.pts.N, s.links.width
	const grain = 256
	type tally struct{ changed, distances int64 }
	tallies := make([]tally, (n+grain-1)/grain)
	seen := make([][]int32, workers) // seen[w][j] = i+1: point i has looked at j
	parallel.ForChunk(workers, n, grain, func(worker, chunk, lo, hi int) {
		if ctx.Err() != nil {
			return
		}
		if seen[worker] == nil {
			seen[worker] = make([]int32, n)
		}
		mark, count := seen[worker], &tallies[chunk]
		near := upTo(s.t.metric)
		for i := lo; i < hi; i++ {
			me, l, q := int32(i+1), s.list(i), s.t.pts.Row(i)
			mark[i] = me
			for _, j := range l.index {
				if j >= 0 {
					mark[j] = me
				}
			}
			first := i * w
			for a := first; a < first+int(s.links.count[i]); a++ {
				via, fresh := int(s.links.index[a]), s.links.fresh[a]
				if mark[via] != me && fresh { // a point in whose list i stands
					mark[via] = me
					s.look(l, near, q, int32(via), &count.changed, &count.distances)
				}
				for b := via * w; b < via*w+int(s.links.count[via]); b++ {
					if j := s.links.index[b]; (fresh || s.links.fresh[b]) && mark[j] != me {
						mark[j] = me
						s.look(l, near, q, j, &count.changed, &count.distances)
					}
				}
			}
		}
	})
	for _, t := range tallies {
		changed += t.changed
		distances += t.distances
	}
	return changed, distances
}

// look offers point j to the list of q.
func (s *descent) look(l list, near func(a, b []float64, most float64) float64, q []float64, j int32, changed, distances *int64) {
	*distances++
	worst := l.close[len(l.close)-1]
	if c := near(q, s.t.pts.Row(int(j)), worst); c <= worst && l.offer(c, j) {
		*changed++
	}
}
