package graph

import (
	"fmt"
	"math"
	"math/bits"
	"sync/atomic"

	"pinfill/internal/neighbors"
	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// lists is what symmetrise reads: the K nearest of each of n vertices, nearest first, row-major.
type lists struct {
	n, stride int
	index     []int32
	dist      []float64
}

// symmetrise joins j to i where j is among the first k of i's list or i among the first k of j's. An edge found from
// both sides has the same distance in both lists, to the last bit, as package neighbors promises.
//
// Row i of the answer holds its own list and the vertices that list i one-sidedly. One pass marks the one-sided
// entries, a bit each, and counts them at their far end; a second fills the rows, and sorting each row by column
// makes the answer independent of which worker arrived first. Workspace: 4 + 8 ceil(k/64) bytes a vertex.
func symmetrise(l lists, k, workers int) *sparse.CSR {
	words := (k + 63) / 64
	oneSided := make([]uint64, l.n*words)
	extra := make([]int32, l.n) // one-sided arrivals of each row; counted down while filling
	parallel.For(workers, l.n, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			own := l.index[i*l.stride : i*l.stride+k]
			mask := oneSided[i*words : (i+1)*words]
			for t, j := range own {
				if !l.holds(int(j), k, int32(i)) {
					mask[t>>6] |= 1 << (t & 63)
					atomic.AddInt32(&extra[j], 1)
				}
			}
		}
	})
	a := &sparse.CSR{N: l.n, RowPtr: make([]int, l.n+1)}
	for i, e := range extra {
		a.RowPtr[i+1] = a.RowPtr[i] + k + int(e)
	}
	a.Col = make([]int32, a.RowPtr[l.n])
	a.Val = make([]float64, a.RowPtr[l.n])
	parallel.For(workers, l.n, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			own := l.index[i*l.stride : i*l.stride+k]
			dist := l.dist[i*l.stride : i*l.stride+k]
			at := a.RowPtr[i]
			copy(a.Col[at:], own)
			copy(a.Val[at:], dist)
			for w, word := range oneSided[i*words : (i+1)*words] {
				for ; word != 0; word &= word - 1 {
					t := w<<6 + bits.TrailingZeros64(word)
					j := own[t]
					slot := a.RowPtr[j+1] - 1 - int(atomic.AddInt32(&extra[j], -1))
					a.Col[slot], a.Val[slot] = int32(i), dist[t]
				}
			}
		}
	})
	parallel.For(workers, l.n, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			sparse.SortRow(a.Row(i))
		}
	})
	return a
}

// holds says whether i is among the first k of j's list.
func (l lists) holds(j, k int, i int32) bool {
	for _, v := range l.index[j*l.stride : j*l.stride+k] {
		if v == i {
			return true
		}
	}
	return false
}

// localScales gives each vertex's distance to its neighbour of the given rank.
func localScales(l lists, rank, workers int) []float64 {
	s := make([]float64, l.n)
	parallel.For(workers, l.n, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			s[i] = l.dist[i*l.stride+rank-1]
		}
	})
	return s
}

// raggedScales gives each vertex's distance to its neighbour of rank LocalRank, or the farthest of fewer; NaN without.
func raggedScales(l *neighbors.Ragged, workers int) []float64 {
	s := make([]float64, len(l.Start)-1)
	parallel.For(workers, len(s), rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			s[i] = math.NaN()
			if _, dist := l.Row(i); len(dist) > 0 {
				s[i] = dist[min(LocalRank, len(dist))-1]
			}
		}
	})
	return s
}

// check refuses lists that are not what symmetrise trusts: indices in range and never the row's own, distances
// positive, finite and ascending.
func (l lists) check(workers int) error {
	if len(l.index) < l.n*l.stride || len(l.dist) < l.n*l.stride {
		return fmt.Errorf("neighbour lists of %d vertices and %d neighbours hold %d indices and %d distances",
			l.n, l.stride, len(l.index), len(l.dist))
	}
	bad := parallel.Max(workers, l.n, rowGrain, func(lo, hi int) float64 {
		for i := lo; i < hi; i++ {
			last := 0.0
			for t := range l.stride {
				j, d := l.index[i*l.stride+t], l.dist[i*l.stride+t]
				if j < 0 || int(j) >= l.n || int(j) == i || !(d > 0) || d < last || d > math.MaxFloat64 {
					return float64(l.n - i)
				}
				last = d
			}
		}
		return 0
	})
	if bad > 0 {
		return fmt.Errorf("neighbour list of vertex %d is not a list of other vertices at positive ascending distances", l.n-int(bad))
	}
	return nil
}
