package graph

import (
	"fmt"
	"math"
	"slices"
	"sync/atomic"

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
// Both directions of each edge are put into their rows by counting, as words of (column, position) that sort as
// integers: 16 bytes an edge beside the answer, time O(edges) on graphs of bounded degree.
func FromEdges(n int, edges []Edge, workers int) (*sparse.CSR, EdgeCounts, error) {
	var counts EdgeCounts
	if n < 0 || n > math.MaxInt32 || len(edges) > math.MaxUint32 {
		return nil, counts, fmt.Errorf("%d vertices and %d edges are more than a graph can hold", n, len(edges))
	}
	degree, loops, err := countEnds(n, edges, workers)
	if err != nil {
		return nil, counts, err
	}
	counts.Loops = loops
	start := make([]int, n+1)
	for i, d := range degree {
		start[i+1] = start[i] + int(d)
	}
	slots := make([]uint64, start[n])
	parallel.For(workers, len(edges), edgeGrain, func(lo, hi int) {
		for p := lo; p < hi; p++ {
			e := edges[p]
			if e.I == e.J {
				continue
			}
			slots[start[e.I]+int(atomic.AddInt32(&degree[e.I], -1))] = uint64(e.J)<<32 | uint64(p)
			slots[start[e.J]+int(atomic.AddInt32(&degree[e.J], -1))] = uint64(e.I)<<32 | uint64(p)
		}
	})
	if err := sortRows(slots, start, degree, edges, workers); err != nil {
		return nil, counts, err
	}
	a := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for i, d := range degree {
		a.RowPtr[i+1] = a.RowPtr[i] + int(d)
	}
	a.Col = make([]int32, a.RowPtr[n])
	a.Val = make([]float64, a.RowPtr[n])
	parallel.For(workers, n, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			at := a.RowPtr[i]
			for t, s := range slots[start[i] : start[i]+int(degree[i])] {
				a.Col[at+t] = int32(s >> 32)
				a.Val[at+t] = math.Log(edges[uint32(s)].W)
			}
		}
	})
	counts.Edges = a.NNZ() / 2
	counts.Repeated = len(edges) - loops - counts.Edges
	return a, counts, nil
}

// edgeGrain is the number of edges in a chunk of a parallel loop over edges.
const edgeGrain = 1 << 14

// countEnds counts the edges at each vertex, loops apart, and finds the first edge that cannot be used.
func countEnds(n int, edges []Edge, workers int) (degree []int32, loops int, err error) {
	degree = make([]int32, n)
	chunks := (len(edges) + edgeGrain - 1) / edgeGrain
	firstBad := make([]int, chunks)
	loop := make([]int, chunks)
	parallel.ForChunk(workers, len(edges), edgeGrain, func(_, c, lo, hi int) {
		firstBad[c] = -1
		for p := lo; p < hi; p++ {
			e := edges[p]
			if e.I < 0 || int(e.I) >= n || e.J < 0 || int(e.J) >= n || !(e.W > 0) || e.W > math.MaxFloat64 {
				firstBad[c] = p
				return
			}
			if e.I == e.J {
				loop[c]++
				continue
			}
			atomic.AddInt32(&degree[e.I], 1)
			atomic.AddInt32(&degree[e.J], 1)
		}
	})
	for c := range chunks {
		if p := firstBad[c]; p >= 0 {
			return nil, 0, &EdgeError{Position: p, Edge: edges[p], Vertices: n}
		}
		loops += loop[c]
	}
	return degree, loops, nil
}

// sortRows sorts each row's slots, keeps the first of each column, and leaves the number kept in degree. Position in
// the low half of a slot makes the kept one the first given.
func sortRows(slots []uint64, start []int, degree []int32, edges []Edge, workers int) error {
	n := len(degree)
	conflict := make([]*ConflictError, (n+rowGrain-1)/rowGrain)
	parallel.ForChunk(workers, n, rowGrain, func(_, c, lo, hi int) {
		for i := lo; i < hi; i++ {
			row := slots[start[i]:start[i+1]]
			slices.Sort(row)
			kept := 0
			for _, s := range row {
				if kept == 0 || row[kept-1]>>32 != s>>32 {
					row[kept] = s
					kept++
					continue
				}
				first, second := int(uint32(row[kept-1])), int(uint32(s))
				if edges[first].W != edges[second].W && (conflict[c] == nil || second < conflict[c].Second) {
					conflict[c] = &ConflictError{First: first, Second: second, A: edges[first], B: edges[second]}
				}
			}
			degree[i] = int32(kept)
		}
	})
	var worst *ConflictError
	for _, e := range conflict {
		if e != nil && (worst == nil || e.Second < worst.Second) {
			worst = e
		}
	}
	if worst != nil {
		return worst
	}
	return nil
}
