package solve

import "pinfill/internal/sparse"

// pendants finds the free vertices that hang from a single vertex: removing it would cut them off from every fixed
// vertex. Any p-harmonic function is constant there, equal to its value at that vertex, so they need no solving; left
// in, they would be stretches without slope, where for p > 2 the energy has no curvature.
//
// anchor[v] is the vertex from which free vertex v hangs, or -1. Depth-first search with low points (Hopcroft and
// Tarjan 1973) from one root that stands for all fixed vertices: the subtree of v hangs from its parent a where no
// edge leads from it to a vertex visited before a. Time O(n + edges).
func pendants(g *sparse.CSR, isFixed func(v int32) bool) []int32 {
	n := g.N
	order := make([]int32, 0, n) // free vertices as they are met
	visit := make([]int32, n)    // 1-based position in order, 0 before; the root has 0
	low := make([]int32, n)
	parent := make([]int32, n)
	next := make([]int, n)
	hangs := make([]bool, n) // the subtree of v hangs from its parent
	for s := range n {
		if isFixed(int32(s)) {
			continue
		}
		if visit[s] != 0 || !besideFixed(g, s, isFixed) {
			continue
		}
		meet := func(v, from int32) {
			order = append(order, v)
			visit[v] = int32(len(order))
			low[v] = visit[v]
			parent[v] = from
			next[v] = g.RowPtr[v]
		}
		meet(int32(s), -1)
		for v := int32(s); v >= 0; {
			if k := next[v]; k < g.RowPtr[v+1] {
				next[v]++
				u := g.Col[k]
				switch {
				case isFixed(u):
					low[v] = 0
				case visit[u] == 0:
					meet(u, v)
					v = u
				case u != parent[v]:
					low[v] = min(low[v], visit[u])
				}
				continue
			}
			a := parent[v]
			if a >= 0 {
				low[a] = min(low[a], low[v])
				hangs[v] = low[v] >= visit[a]
			}
			v = a
		}
	}
	anchor := low // no longer needed; every free vertex that is reachable is in order
	for v := range anchor {
		anchor[v] = -1
	}
	for _, v := range order {
		a := parent[v]
		switch {
		case a < 0:
		case anchor[a] >= 0:
			anchor[v] = anchor[a]
		case hangs[v]:
			anchor[v] = a
		}
	}
	return anchor
}

func besideFixed(g *sparse.CSR, v int, isFixed func(v int32) bool) bool {
	cols, _ := g.Row(v)
	for _, u := range cols {
		if isFixed(u) {
			return true
		}
	}
	return false
}
