package solve

import (
	"container/heap"
	"context"
	"math"

	"pinfill/internal/lexmin"
	"pinfill/internal/sparse"
)

// runInfinite solves region c at p = inf for the shares y at its fixed vertices, which range over [0, 1].
func (pl *plan) runInfinite(ctx context.Context, c int, y []float64) ([]float64, infiniteCertificate, int, error) {
	r := &pl.regions[c]
	f, stats, err := lexmin.Solve(ctx, r.graph, r.fixed, y, lexmin.Options{Workers: pl.settings.Workers})
	if err != nil {
		return nil, infiniteCertificate{}, 0, err
	}
	return f, certifyInfinite(r, y, f), stats.Paths, nil
}

// infiniteCertificate proves a vector at p = inf on one region, in the region's own scale.
type infiniteCertificate struct {
	imbalance float64 // largest |steepest up - steepest down| over the steepest slope, or the excess of a path, if larger
}

// certifyInfinite tests the vector f on region r. The lexicographic minimiser is the only f whose steepest slope up
// equals its steepest slope down at every free vertex (Kyng, Rao, Sachdeva and Spielman 2015). No path between two
// fixed vertices can be steeper than the steepest edge of f; the paths from a few fixed vertices are tried, among
// them those with the least and the greatest value.
func certifyInfinite(r *region, y, f []float64) infiniteCertificate {
	g := r.graph
	held := make([]bool, g.N)
	for _, v := range r.fixed {
		held[v] = true
	}
	var steepest, worst float64
	for v := range g.N {
		cols, vals := g.Row(v)
		var up, down float64
		for k, u := range cols {
			slope := math.Exp(vals[k]) * (f[v] - f[u])
			down, up = max(down, slope), max(up, -slope)
			if math.IsNaN(slope) {
				worst = math.Inf(1)
			}
		}
		steepest = max(steepest, up, down)
		if !held[v] {
			worst = max(worst, math.Abs(up-down))
		}
	}
	if steepest == 0 {
		return infiniteCertificate{imbalance: math.Inf(1)} // values differ, so some edge must have a slope
	}
	worst /= steepest
	sources := map[int32]bool{r.fixed[0]: true, r.fixed[len(r.fixed)-1]: true}
	least, most := 0, 0
	for k := range y {
		if y[k] < y[least] {
			least = k
		}
		if y[k] > y[most] {
			most = k
		}
	}
	sources[r.fixed[least]], sources[r.fixed[most]] = true, true
	for k, v := range r.fixed {
		if !sources[v] {
			continue
		}
		dist := distances(g, held, v)
		for t, u := range r.fixed {
			if u == v || math.IsInf(dist[u], 1) {
				continue
			}
			worst = max(worst, math.Abs(y[k]-y[t])/dist[u]/steepest-1)
		}
	}
	return infiniteCertificate{imbalance: worst}
}

// distances gives the shortest distance from source to each vertex through vertices that are not held, an edge being
// 1/w long (Dijkstra 1959).
func distances(g *sparse.CSR, held []bool, source int32) []float64 {
	dist := make([]float64, g.N)
	for v := range dist {
		dist[v] = math.Inf(1)
	}
	dist[source] = 0
	q := &queue{{source, 0}}
	for q.Len() > 0 {
		e := heap.Pop(q).(entry)
		if e.dist > dist[e.v] || held[e.v] && e.v != source {
			continue
		}
		cols, vals := g.Row(int(e.v))
		for k, u := range cols {
			if d := e.dist + math.Exp(-vals[k]); d < dist[u] {
				dist[u] = d
				heap.Push(q, entry{u, d})
			}
		}
	}
	return dist
}

type entry struct {
	v    int32
	dist float64
}

type queue []entry

func (q queue) Len() int           { return len(q) }
func (q queue) Less(i, j int) bool { return q[i].dist < q[j].dist }
func (q queue) Swap(i, j int)      { q[i], q[j] = q[j], q[i] }
func (q *queue) Push(x any)        { *q = append(*q, x.(entry)) }
func (q *queue) Pop() any {
	old := *q
	e := old[len(old)-1]
	*q = old[:len(old)-1]
	return e
}
