package solve

import (
	"math/rand/v2"
	"sort"

	"pinfill/internal/sparse"
)

type link struct {
	u, v int
	a    float64 // ln w
}

// fromEdges builds the symmetric matrix of a list of edges.
func fromEdges(n int, edges []link) *sparse.CSR {
	rows := make([][]link, n)
	for _, e := range edges {
		rows[e.u] = append(rows[e.u], e)
		rows[e.v] = append(rows[e.v], link{e.v, e.u, e.a})
	}
	g := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for v, r := range rows {
		sort.Slice(r, func(i, j int) bool { return r[i].v < r[j].v })
		for _, e := range r {
			g.Col = append(g.Col, int32(e.v))
			g.Val = append(g.Val, e.a)
		}
		g.RowPtr[v+1] = len(g.Col)
	}
	return g
}

// randomProblem is a connected graph of 8 to 40 vertices, a random tree with random further edges, ln w uniform over
// spread, 2 to 6 fixed vertices with values of few or many levels.
func randomProblem(rng *rand.Rand, spread float64) Problem {
	n := 8 + rng.IntN(33)
	seen := map[[2]int]bool{}
	var edges []link
	add := func(u, v int) {
		if u > v {
			u, v = v, u
		}
		if u == v || seen[[2]int{u, v}] {
			return
		}
		seen[[2]int{u, v}] = true
		edges = append(edges, link{u, v, spread * (rng.Float64() - 0.5)})
	}
	for v := 1; v < n; v++ {
		add(v, rng.IntN(v))
	}
	for range rng.IntN(3 * n) {
		add(rng.IntN(n), rng.IntN(n))
	}
	perm := rng.Perm(n)[:2+rng.IntN(5)]
	sort.Ints(perm)
	p := Problem{Graph: fromEdges(n, edges), P: 2}
	levels := rng.IntN(2) == 0
	for _, v := range perm {
		p.Fixed = append(p.Fixed, int32(v))
		y := rng.Float64()
		if levels {
			y = float64(rng.IntN(2))
		}
		p.Values = append(p.Values, y)
	}
	return p
}
