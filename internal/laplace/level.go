package laplace

import (
	"math"

	"pinfill/internal/parallel"
)

// quad is four entries of a row: 32 bytes. Rows are padded with entries of weight 0 in their own column.
type quad struct {
	col [4]int32
	w   [4]float32
}

// level is one level of the hierarchy in single precision. Rows are divided by their diagonal, so that everything
// stays in the units of x whatever the size of the conductances: A' = D^-1 A,
//
//	(A' x)_i = tie_i x_i + sum_j w_ij (x_i - x_j),   tie_i + sum_j w_ij = 1,
//
// and a right-hand side is g = D^-1 b. The coarse one is then g_I = sum_i share_i g_i with share_i = d_i / D_I.
type level struct {
	n     int
	start []int32 // row i is quads[start[i]:start[i+1]]
	quads []quad
	tie   []float32
	d     []float64

	agg   []int32 // to the next level; nil on the coarsest
	m     members
	share []float32 // in the order of m.list

	work [6][]float32 // vectors of the cycle, interleaved by right-hand side
}

const largestShare = 1e30 // keeps a tightly bound aggregate that hardly hangs on the rest within single precision

func newLevel(a *sddm, workers int) *level {
	l := &level{n: a.n, start: make([]int32, a.n+1), tie: make([]float32, a.n), d: a.diag}
	for i := range a.n {
		l.start[i+1] = l.start[i] + int32(a.ptr[i+1]-a.ptr[i]+3)/4
	}
	l.quads = make([]quad, l.start[a.n])
	l.set(a, workers)
	return l
}

// set copies the conductances of a, whose pattern is that of the level.
func (l *level) set(a *sddm, workers int) {
	l.d = a.diag
	parallel.For(workers, a.n, rowChunk, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			inv := 1 / a.diag[i]
			l.tie[i] = float32(a.excess[i] * inv)
			q := l.quads[l.start[i]:l.start[i+1]]
			for k, at := a.ptr[i], 0; at < 4*len(q); at++ {
				to := &q[at/4]
				if k < a.ptr[i+1] {
					to.col[at%4], to.w[at%4] = a.col[k], float32(a.w[k]*inv)
					k++
				} else {
					to.col[at%4], to.w[at%4] = int32(i), 0
				}
			}
		}
	})
}

// setShares sets share, in the order of m.list, from the coarse diagonal.
func (l *level) setShares(coarse *sddm, workers int) {
	if l.share == nil {
		l.share = make([]float32, len(l.m.list))
	}
	parallel.For(workers, coarse.n, coarseChunk, func(lo, hi int) {
		for g := lo; g < hi; g++ {
			for k := l.m.ptr[g]; k < l.m.ptr[g+1]; k++ {
				l.share[k] = float32(math.Min(l.d[l.m.list[k]]/coarse.diag[g], largestShare))
			}
		}
	})
}
