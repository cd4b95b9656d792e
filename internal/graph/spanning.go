package graph

import (
	"cmp"
	"math"
	"slices"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// SpanningForest gives the edges of a minimum spanning forest of a, whose Val is a length: each with I < J and its
// length as W, in ascending order of length. The graph cut at length r (longer edges removed) falls apart into N less
// the number of lengths <= r pieces, and the last length is the smallest r at which a hangs together as well as it
// ever does. Empty for a graph without edges.
//
// Boruvka's method (1926): each round joins every piece to its nearest other piece. Equal lengths are told apart by
// their ends, so that rounds cannot close a cycle and the forest is one and the same for any number of workers. The
// time is O(entries log N), in practice 5 to 8 passes over the entries.
func SpanningForest(a *sparse.CSR, workers int) []Edge {
	piece := make([]int32, a.N) // of each vertex
	for v := range piece {
		piece[v] = int32(v)
	}
	forest := make([]Edge, 0, max(a.N-1, 0))
	pieces := a.N
	near := make([]outEdge, a.N)  // of each vertex, its shortest edge to another piece
	best := make([]outEdge, a.N)  // of each piece
	parent := make([]int32, a.N)  // of each piece, the piece it joins
	renamed := make([]int32, a.N) // of each piece, its number in the next round
	for {
		parallel.For(workers, a.N, rowGrain, func(lo, hi int) {
			for v := lo; v < hi; v++ {
				if near[v].length < 0 {
					continue // all neighbours in one piece with v since an earlier round
				}
				near[v] = nearestOther(a, piece, int32(v))
			}
		})
		for c := range pieces {
			best[c] = outEdge{length: -1}
		}
		joined := false
		for v, e := range near {
			if c := piece[v]; e.length >= 0 && (best[c].length < 0 || e.less(best[c])) {
				best[c] = e
				joined = true
			}
		}
		if !joined {
			slices.SortFunc(forest, func(x, y Edge) int {
				return cmp.Or(cmp.Compare(x.W, y.W), cmp.Compare(x.I, y.I), cmp.Compare(x.J, y.J))
			})
			return forest
		}
		for c := range pieces {
			parent[c] = int32(c)
			e := best[c]
			if e.length < 0 {
				continue
			}
			other := piece[e.a]
			if other == int32(c) {
				other = piece[e.b]
			}
			if best[other] == e && other < int32(c) {
				continue // the pair chose each other: the smaller piece is not its own parent, this one is the root
			}
			parent[c] = other
			forest = append(forest, Edge{e.a, e.b, e.length})
		}
		pieces = contract(piece, parent[:pieces], renamed)
	}
}

// forest is the spanning forest of g.lengths(local), kept for the next question.
func (g *Graph) forest(local bool, workers int) []Edge {
	f := &g.forests[0]
	if local {
		f = &g.forests[1]
	}
	f.once.Do(func() { f.edges = SpanningForest(g.lengths(local, workers), workers) })
	return f.edges
}

// outEdge is an edge {a, b}, a < b, with its length; length -1 means none.
type outEdge struct {
	length float64
	a, b   int32
}

func (e outEdge) less(f outEdge) bool {
	if e.length != f.length {
		return e.length < f.length
	}
	if e.a != f.a {
		return e.a < f.a
	}
	return e.b < f.b
}

func nearestOther(a *sparse.CSR, piece []int32, v int32) outEdge {
	e := outEdge{length: -1}
	least := math.Inf(1)
	col, val := a.Row(int(v))
	for t, u := range col {
		if piece[u] == piece[v] || val[t] > least {
			continue
		}
		if f := (outEdge{val[t], min(u, v), max(u, v)}); e.length < 0 || f.less(e) {
			e, least = f, val[t]
		}
	}
	return e
}

// contract follows parents to their roots, numbers the roots, and renames the pieces of all vertices.
func contract(piece, parent, renamed []int32) int {
	for c := range parent {
		r := parent[c]
		for parent[r] != r {
			parent[r] = parent[parent[r]]
			r = parent[r]
		}
		parent[c] = r
	}
	count := 0
	for c, r := range parent {
		if int32(c) == r {
			renamed[c] = int32(count)
			count++
		}
	}
	for v, c := range piece {
		piece[v] = renamed[parent[c]]
	}
	return count
}
