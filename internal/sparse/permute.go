package sparse

import (
	"slices"

	"pinfill/internal/parallel"
)

// rowGrain is the number of rows in a chunk of a parallel loop over rows.
const rowGrain = 4096

// Permute renumbers the vertices: vertex v of the answer is vertex order[v] of a. order is a permutation of 0..N-1
// (not checked). The answer does not depend on workers; 0 means GOMAXPROCS.
func Permute(a *CSR, order []int32, workers int) *CSR {
	place := Inverse(order)
	p := &CSR{N: a.N, RowPtr: make([]int, a.N+1), Col: make([]int32, a.NNZ()), Val: make([]float64, len(a.Val))}
	for v, old := range order {
		p.RowPtr[v+1] = p.RowPtr[v] + a.RowPtr[old+1] - a.RowPtr[old]
	}
	parallel.For(workers, a.N, rowGrain, func(lo, hi int) {
		for v := lo; v < hi; v++ {
			oldCol, oldVal := a.Row(int(order[v]))
			col, val := p.Row(v)
			for t, u := range oldCol {
				col[t] = place[u]
			}
			copy(val, oldVal)
			SortRow(col, val)
		}
	})
	return p
}

// Inverse gives the inverse permutation: Inverse(order)[order[v]] = v.
func Inverse(order []int32) []int32 {
	place := make([]int32, len(order))
	for v, old := range order {
		place[old] = int32(v)
	}
	return place
}

// shortRow is the longest row sorted by insertion; neighbour graphs have rows of 5 to 50 entries.
const shortRow = 32

// SortRow sorts the columns of a row, 0 or above, and their values with them; equal columns keep their order.
//
// What is sorted is the pair (column, place) packed into one word; the values move once, at the end.
func SortRow(col []int32, val []float64) {
	if len(col) > shortRow {
		sortLongRow(col, val)
		return
	}
	var key [shortRow]uint64
	var old [shortRow]float64
	copy(old[:], val)
	for t, c := range col {
		k := uint64(c)<<32 | uint64(t)
		j := t
		for ; j > 0 && key[j-1] > k; j-- {
			key[j] = key[j-1]
		}
		key[j] = k
	}
	for t, k := range key[:len(col)] {
		col[t], val[t] = int32(k>>32), old[k%shortRow]
	}
}

func sortLongRow(col []int32, val []float64) {
	key := make([]uint64, len(col))
	for t, c := range col {
		key[t] = uint64(c)<<32 | uint64(t)
	}
	slices.Sort(key)
	old := slices.Clone(val)
	for t, k := range key {
		col[t], val[t] = int32(k>>32), old[uint32(k)]
	}
}
