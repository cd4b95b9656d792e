package graph

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// Edge is a given edge: two vertices and a weight.
type Edge struct {
	I, J int32
	W    float64 // > 0 and finite; not its logarithm
}

// EdgeCounts say what FromEdges made of the edges.
type EdgeCounts struct {
	Edges    int // undirected edges of the graph
	Repeated int // given again, either way round, with the same weight
	Loops    int // from a vertex to itself; left out, for no difference lies along them
}

// EdgeError says that one given edge cannot be used.
type EdgeError struct {
	Position int // 0-based among the edges
	Edge     Edge
	Vertices int // of the graph
}

func (e *EdgeError) Error() string {
	if e.Edge.I < 0 || int(e.Edge.I) >= e.Vertices || e.Edge.J < 0 || int(e.Edge.J) >= e.Vertices {
		return fmt.Sprintf("edge %d joins vertices %d and %d of a graph of %d vertices", e.Position, e.Edge.I, e.Edge.J, e.Vertices)
	}
	return fmt.Sprintf("edge %d has weight %v, not a positive finite number", e.Position, e.Edge.W)
}

// ConflictError says that one pair of vertices was given two weights.
type ConflictError struct {
	First, Second int // 0-based positions among the edges, First < Second
	A, B          Edge
}

func (e *ConflictError) Error() string {
	return fmt.Sprintf("edges %d and %d join vertices %d and %d with weights %v and %v", e.First, e.Second, e.A.I, e.A.J, e.A.W, e.B.W)
}

// FromEdges builds the graph of n vertices with the given edges: ln w on each. An edge may be given once or several
// times, either way round, with equal weights; the order of edges does not reach the answer.
//
// Errors: *EdgeError for the first edge with an end outside 0..n-1 or a weight that is not positive and finite,
// otherwise *ConflictError for the first edge whose pair already has another weight. workers = 0 means GOMAXPROCS.
//
// Both directions of each edge are dealt out to blocks of vertices in the order of the edges, then each block sorts its
// rows in cache: 32 bytes an edge beside the answer, time O(edges) on graphs of bounded degree.
func FromEdges(n int, edges []Edge, workers int) (*sparse.CSR, EdgeCounts, error) {
	if n < 0 || n > math.MaxInt32 || len(edges) > math.MaxUint32 {
		return nil, EdgeCounts{}, fmt.Errorf("%d vertices and %d edges are more than a graph can hold", n, len(edges))
	}
	d := newDeal(n, edges)
	loops, err := d.count(workers)
	if err != nil {
		return nil, EdgeCounts{}, err
	}
	d.scatter(workers)
	degree := make([]int32, n)
	if !d.sortBlocks(degree, workers) {
		return nil, EdgeCounts{}, firstConflict(edges)
	}
	a := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for i, d := range degree {
		a.RowPtr[i+1] = a.RowPtr[i] + int(d)
	}
	a.Col = make([]int32, a.RowPtr[n])
	a.Val = make([]float64, a.RowPtr[n])
	parallel.For(workers, d.blocks, 1, func(b, _ int) {
		lo := a.RowPtr[b<<d.shift]
		hi := a.RowPtr[min((b+1)<<d.shift, n)]
		copy(a.Col[lo:hi], d.to[d.start[b]:])
		for t, w := range d.val[d.start[b] : d.start[b]+hi-lo] {
			a.Val[lo+t] = math.Log(w)
		}
	})
	counts := EdgeCounts{Edges: a.NNZ() / 2, Loops: loops}
	counts.Repeated = len(edges) - loops - counts.Edges
	return a, counts, nil
}

// firstConflict finds the first edge whose pair was given before with another weight, and the first that gave it.
func firstConflict(edges []Edge) *ConflictError {
	pos := make([]uint32, 0, len(edges))
	for p, e := range edges {
		if e.I != e.J {
			pos = append(pos, uint32(p))
		}
	}
	pair := func(p uint32) uint64 {
		e := edges[p]
		return uint64(min(e.I, e.J))<<32 | uint64(max(e.I, e.J))
	}
	slices.SortFunc(pos, func(p, q uint32) int {
		if c := cmp.Compare(pair(p), pair(q)); c != 0 {
			return c
		}
		return cmp.Compare(p, q)
	})
	var worst *ConflictError
	first := uint32(0)
	for t, p := range pos {
		if t == 0 || pair(p) != pair(first) {
			first = p
		} else if edges[p].W != edges[first].W && (worst == nil || int(p) < worst.Second) {
			worst = &ConflictError{First: int(first), Second: int(p), A: edges[first], B: edges[p]}
		}
	}
	return worst
}
