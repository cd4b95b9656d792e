package advise

import (
	"context"
	"math"
	"slices"
)

// greedy is the state of Next: everything is given the labels and the picks so far.
type greedy struct {
	p      *NextProblem
	system solver
	weight []float64           // r, rows times doubt; 0 at held vertices
	total  []float64           // G r
	diag   []float64           // G_kk, exact where exact says so
	exact  []bool              //
	out    []bool              // held, excluded or named already
	column map[int32][]float64 // exact columns G_k of vertices not named yet, by vertex
	named  []named
	left   float64 // r' G r
	median float64 // median of G_kk at the start, over free vertices
}

// named is a pick with its column at the time it was named.
type named struct {
	vertex int32
	column []float64
}

// start sets up r, G r and the diagonal.
func (g *greedy) start(ctx context.Context, fixed []int32) error {
	n := g.p.Conductance.N
	g.weight, g.total, g.out, g.exact = make([]float64, n), make([]float64, n), make([]bool, n), make([]bool, n)
	for v := range n {
		g.weight[v] = g.p.rows(v) * max(g.p.doubt(v), doubtFloor)
		g.out[v] = g.p.excluded(v)
	}
	for _, v := range fixed {
		g.weight[v], g.out[v] = 0, true
	}
	if _, err := g.system.SolvePoisson(ctx, [][]float64{g.weight}, [][]float64{g.total}, solveTol); err != nil {
		return err
	}
	for v, w := range g.weight {
		g.left += w * g.total[v]
	}
	var err error
	if g.diag, err = g.diagonal(ctx); err != nil {
		return err
	}
	var free []float64
	for _, v := range g.system.Free() {
		free = append(free, g.diag[v])
	}
	slices.Sort(free)
	g.median = free[len(free)/2]
	return nil
}

// score is the variance that naming v removes, for its cost.
func (g *greedy) score(v int) float64 {
	if g.out[v] || !(g.diag[v] > 0) {
		return -1
	}
	s := g.total[v] * g.total[v] / g.diag[v] / g.p.cost(v)
	if !g.exact[v] {
		s /= doubtfulDiagonal
	}
	return s
}

// leaders gives the vertices of largest score, best first, equals by number.
func (g *greedy) leaders(most int) []int32 {
	var lead []int32
	var least float64
	for v := range g.out {
		s := g.score(v)
		if s < 0 || len(lead) == most && s <= least {
			continue
		}
		at, _ := slices.BinarySearchFunc(lead, s, func(a int32, s float64) int {
			if g.score(int(a)) >= s {
				return -1
			}
			return 1
		})
		lead = slices.Insert(lead, at, int32(v))
		lead = lead[:min(len(lead), most)]
		least = g.score(int(lead[len(lead)-1]))
	}
	return lead
}

// next names one vertex, or nil if none is left.
func (g *greedy) next(ctx context.Context) (*Pick, error) {
	for try := 0; ; try++ {
		lead := g.leaders(2 * columnBlock)
		if len(lead) == 0 {
			return nil, nil
		}
		chosen := lead[0]
		if !g.exact[chosen] && try == columnTries {
			// The estimates never agreed with the exact values: take the best exact one.
			for _, v := range lead {
				if g.exact[v] {
					chosen = v
					break
				}
			}
		}
		if g.column[chosen] != nil {
			return g.name(chosen), nil
		}
		ask := []int32{chosen}
		for _, v := range lead {
			if !g.exact[chosen] && !g.exact[v] && v != chosen && len(ask) < columnBlock {
				ask = append(ask, v)
			}
		}
		if err := g.solve(ctx, ask); err != nil {
			return nil, err
		}
	}
}

// solve finds exact columns of G given labels and picks.
func (g *greedy) solve(ctx context.Context, ask []int32) error {
	n := len(g.out)
	b, x := make([][]float64, len(ask)), make([][]float64, len(ask))
	for k, v := range ask {
		b[k], x[k] = make([]float64, n), make([]float64, n)
		b[k][v] = 1
	}
	if _, err := g.system.SolvePoisson(ctx, b, x, solveTol); err != nil {
		return err
	}
	for k, v := range ask {
		for _, m := range g.named {
			project(x[k], m, v)
		}
		g.column[v] = x[k]
		g.diag[v], g.exact[v] = x[k][v], true
	}
	return nil
}

// project removes from the column x of vertex v what a pick settles: x - m_v m / m_k.
func project(x []float64, m named, v int32) {
	share := m.column[v] / m.column[m.vertex]
	if share == 0 {
		return
	}
	for i, t := range m.column {
		x[i] -= float64(share * t)
	}
	x[m.vertex] = 0
}

// name takes v: everything is down-dated by its column.
func (g *greedy) name(v int32) *Pick {
	m := named{v, g.column[v]}
	delete(g.column, v)
	own := m.column[v]
	pick := &Pick{Vertex: v, Reason: Central}
	removed := g.total[v] * g.total[v] / own
	if g.left > 0 {
		pick.Gain = min(removed/g.left, 1)
	}
	for x, t := range m.column {
		if g.weight[x] > 0 {
			pick.Follows += g.p.rows(x) * min(max(t/own, 0), 1)
		}
	}
	switch {
	case g.p.Doubt != nil && g.p.doubt(int(v)) >= boundaryMin:
		pick.Reason = Boundary
	case own >= remoteRatio*g.median:
		pick.Reason = Remote
	}
	share := g.total[v] / own
	for x, t := range m.column {
		g.total[x] -= float64(share * t)
		g.diag[x] = max(g.diag[x]-float64(t*t)/own, 1e-3*g.diag[x])
	}
	g.left -= removed
	g.out[v], g.total[v], g.weight[v] = true, 0, 0
	for _, k := range sortedKeys(g.column) {
		c := g.column[k]
		project(c, m, k)
		g.diag[k] = c[k]
		if !(c[k] > 0) || math.IsNaN(c[k]) {
			g.out[k] = true
			delete(g.column, k)
		}
	}
	g.named = append(g.named, m)
	g.forget()
	return pick
}

// keepColumns bounds the columns kept for vertices that lead no longer.
const keepColumns = 32

func (g *greedy) forget() {
	for len(g.column) > keepColumns {
		worst, at := math.Inf(1), int32(-1)
		for _, k := range sortedKeys(g.column) {
			if s := g.score(int(k)); s < worst {
				worst, at = s, k
			}
		}
		delete(g.column, at) // its diagonal stays exact
	}
}

func sortedKeys(m map[int32][]float64) []int32 {
	keys := make([]int32, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}
