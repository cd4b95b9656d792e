// Package sparse holds symmetric sparse matrices in compressed sparse row form and the few operations on them
// that graphs and solvers share: products, permutation, components, orderings.
package sparse

// CSR is a symmetric n by n matrix without diagonal, the adjacency structure of an undirected graph with one value
// an edge. Row i holds columns Col[RowPtr[i]:RowPtr[i+1]], 0-based, strictly increasing, never i itself; both
// triangles are stored, so each edge stands twice with equal values. What Val means is said where a CSR is passed:
// a distance, a logarithm of a weight (ln w), or a conductance. Several CSR may share RowPtr and Col; none of the
// slices is changed after it is built.
type CSR struct {
	N      int
	RowPtr []int
	Col    []int32
	Val    []float64
}

// NNZ is the number of stored entries, twice the number of edges.
func (a *CSR) NNZ() int { return len(a.Col) }

// Row gives the columns and values of row i, to be read only.
func (a *CSR) Row(i int) ([]int32, []float64) {
	lo, hi := a.RowPtr[i], a.RowPtr[i+1]
	return a.Col[lo:hi], a.Val[lo:hi]
}

// WithValues gives a matrix of the same pattern with other values.
func (a *CSR) WithValues(val []float64) *CSR {
	return &CSR{N: a.N, RowPtr: a.RowPtr, Col: a.Col, Val: val}
}
