package graph

import (
	"fmt"

	"pinfill/internal/neighbors"
	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// FromLists joins the k nearest of each vertex into an undirected graph: {i, j} is an edge where j is among the first
// k of i's list or i among the first k of j's; 1 <= k <= l.K. One search with a large K serves every smaller k, and
// with K >= LocalRank they all have the same own scales. The error says that k or the lists are out of order.
//
// workers = 0 means GOMAXPROCS. Memory: 12 bytes an entry of the answer (2 k entries a vertex at most on average, about
// 1.15 k on points of few dimensions), 16 bytes a vertex, and for a while 4 + 8 ceil(k/64) more.
func FromLists(l *neighbors.Lists, k, workers int) (*Graph, error) {
	if k < 1 || k > l.K {
		return nil, fmt.Errorf("graph of %d neighbours from lists of %d", k, l.K)
	}
	in := lists{n: l.N, stride: l.K, index: l.Index, dist: l.Dist}
	if err := in.check(workers); err != nil {
		return nil, err
	}
	rank := min(LocalRank, l.K)
	return &Graph{Skeleton: symmetrise(in, k, workers), Local: localScales(in, rank, workers), Rank: rank}, nil
}

// FromRagged makes a graph of all pairs within a radius. The lists hold each pair from both sides and are used up: their
// memory becomes the graph's. near, if given, are the nearest neighbours of the same vertices whatever the radius, for
// the own scales; without it a vertex's scale is the distance to its LocalRank-th neighbour within the radius or, where
// there are fewer, to the farthest one.
func FromRagged(l *neighbors.Ragged, near *neighbors.Lists, workers int) (*Graph, error) {
	n := len(l.Start) - 1
	a := &sparse.CSR{N: n, RowPtr: l.Start, Col: l.Index, Val: l.Dist}
	g := &Graph{Skeleton: a, Rank: LocalRank}
	if near != nil {
		if near.N != n {
			return nil, sizeError("nearest neighbours", near.N, n)
		}
		in := lists{n: near.N, stride: near.K, index: near.Index, dist: near.Dist}
		if err := in.check(workers); err != nil {
			return nil, err
		}
		g.Rank = min(LocalRank, near.K)
		g.Local = localScales(in, g.Rank, workers)
	} else {
		g.Local = raggedScales(l, workers)
	}
	parallel.For(workers, n, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			sparse.SortRow(a.Row(i))
		}
	})
	return g, nil
}
