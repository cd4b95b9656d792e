package graph

import (
	"fmt"
	"math"

	"pinfill/internal/sparse"
)

// Tether ties labels to the graph a (Val = ln w) by edges of weight T instead of holding their vertices: label t gets
// an extra vertex a.N+t, joined to vertex fixed[t] alone with ln w = logT, and the extra vertices are what is fixed.
// fixed may name a vertex several times: each labelled row on it pulls on its own. The old vertices keep their
// numbers and become free.
//
// The error says that a vertex is out of range or that logT is not finite.
func Tether(a *sparse.CSR, fixed []int32, logT float64) (tied *sparse.CSR, newFixed []int32, err error) {
	if math.IsNaN(logT) || math.IsInf(logT, 0) {
		return nil, nil, fmt.Errorf("tether weight has logarithm %v, not a finite number", logT)
	}
	n, l := a.N, len(fixed)
	if n+l > math.MaxInt32 {
		return nil, nil, fmt.Errorf("%d vertices and %d labels are more than a graph can hold", n, l)
	}
	count := make([]int32, n)
	newFixed = make([]int32, l)
	for t, v := range fixed {
		if v < 0 || int(v) >= n {
			return nil, nil, fmt.Errorf("labelled vertex %d of a graph of %d vertices", v, n)
		}
		count[v]++
		newFixed[t] = int32(n + t)
	}
	tied = &sparse.CSR{N: n + l, RowPtr: make([]int, n+l+1)}
	for v := range n {
		tied.RowPtr[v+1] = tied.RowPtr[v] + a.RowPtr[v+1] - a.RowPtr[v] + int(count[v])
	}
	for t := range l {
		tied.RowPtr[n+t+1] = tied.RowPtr[n+t] + 1
	}
	tied.Col = make([]int32, tied.RowPtr[n+l])
	tied.Val = make([]float64, tied.RowPtr[n+l])
	for v := range n {
		col, val := a.Row(v)
		copy(tied.Col[tied.RowPtr[v]:], col)
		copy(tied.Val[tied.RowPtr[v]:], val)
	}
	// Extra vertices follow all old ones and come in order of t, so each row stays sorted.
	for t, v := range fixed {
		slot := tied.RowPtr[v+1] - int(count[v])
		count[v]--
		tied.Col[slot], tied.Val[slot] = int32(n+t), logT
		tied.Col[tied.RowPtr[n+t]], tied.Val[tied.RowPtr[n+t]] = v, logT
	}
	return tied, newFixed, nil
}
