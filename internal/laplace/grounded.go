package laplace

import (
	"math"

	"pinfill/internal/parallel"
)

const (
	rowChunk = 2048 // rows that one worker takes at a time in a pass over the matrix
	sumChunk = 8192 // rows of one partial sum; a reduction adds partial sums in order
)

// sddm is a symmetric diagonally dominant M-matrix: row i has the off-diagonal entries -w at columns col, in
// ptr[i]:ptr[i+1], and the diagonal diag_i = excess_i + sum of its w, with w >= 0 and excess >= 0.
type sddm struct {
	n      int
	ptr    []int
	col    []int32
	w      []float64
	excess []float64
	diag   []float64
}

// grounded is L_UU for the free vertices, numbered 0..n-1 in the order of the network; excess_i is the sum of the
// conductances to fixed vertices.
type grounded struct {
	sddm

	// Edges to fixed vertices: free row edgeRow[k] carries edges edgePtr[k]..edgePtr[k+1].
	edgeRow []int32
	edgePtr []int
	edgeFix []int32 // position in fixed
	edgeW   []float64
}

// fill copies the conductances of the network into the grounded form. With pattern it lays out the rows first and
// checks that every free vertex is connected to a fixed one.
func (s *System) fill(pattern bool) error {
	workers := s.options.Workers
	c := s.network
	largest, zeros := 0.0, false
	bad := make([]bool, (c.NNZ()+chunkNNZ-1)/chunkNNZ)
	zero := make([]bool, len(bad))
	largest = parallel.Max(workers, c.NNZ(), chunkNNZ, func(lo, hi int) float64 {
		m, wrong, none := 0.0, false, false
		for _, v := range c.Val[lo:hi] {
			if !(v >= 0 && v <= math.MaxFloat64) {
				wrong = true
			}
			if v == 0 {
				none = true
			}
			m = max(m, v)
		}
		bad[lo/chunkNNZ], zero[lo/chunkNNZ] = wrong, none
		return m
	})
	for k := range bad {
		if bad[k] {
			return ErrNegative
		}
		zeros = zeros || zero[k]
	}
	s.scale = 1
	if largest > 0 {
		_, e := math.Frexp(largest)
		s.scale = math.Ldexp(1, max(min(-e, 1000), -1000))
	}
	a := &s.a
	if pattern {
		s.layout()
	}
	edgeStart := func(i int) int { // first edge record at or after free row i
		lo, hi := 0, len(a.edgeRow)
		for lo < hi {
			m := (lo + hi) / 2
			if int(a.edgeRow[m]) < i {
				lo = m + 1
			} else {
				hi = m
			}
		}
		return lo
	}
	parallel.For(workers, a.n, rowChunk, func(lo, hi int) {
		e := edgeStart(lo)
		for i := lo; i < hi; i++ {
			cols, vals := c.Row(int(s.free[i]))
			at := a.ptr[i]
			bound := 0
			if e < len(a.edgeRow) && int(a.edgeRow[e]) == i {
				bound = a.edgePtr[e]
				e++
			}
			var d, x float64
			for k, j := range cols {
				v := vals[k] * s.scale
				if p := s.place[j]; p >= 0 {
					a.col[at], a.w[at] = p, v
					at++
					d += v
				} else {
					a.edgeFix[bound], a.edgeW[bound] = -1-p, v
					bound++
					x += v
				}
			}
			a.excess[i], a.diag[i] = x, d+x
		}
	})
	if pattern || zeros {
		if i := a.ungrounded(); i >= 0 {
			return &UngroundedError{Vertex: int(s.free[i])}
		}
	}
	return nil
}

const chunkNNZ = 1 << 16

// layout counts the entries of each free row and allocates the grounded form.
func (s *System) layout() {
	c, a := s.network, &s.a
	a.n = len(s.free)
	a.ptr = make([]int, a.n+1)
	bound := make([]int32, a.n)
	parallel.For(s.options.Workers, a.n, rowChunk, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			cols, _ := c.Row(int(s.free[i]))
			var b int32
			for _, j := range cols {
				b += int32(uint32(s.place[j]) >> 31)
			}
			bound[i] = b
			a.ptr[i+1] = len(cols) - int(b)
		}
	})
	a.edgePtr = append(a.edgePtr, 0)
	edges := 0
	for i := range a.n {
		a.ptr[i+1] += a.ptr[i]
		if bound[i] > 0 {
			edges += int(bound[i])
			a.edgeRow = append(a.edgeRow, int32(i))
			a.edgePtr = append(a.edgePtr, edges)
		}
	}
	nnz := a.ptr[a.n]
	a.col, a.w = make([]int32, nnz), make([]float64, nnz)
	a.excess, a.diag = make([]float64, a.n), make([]float64, a.n)
	a.edgeFix, a.edgeW = make([]int32, edges), make([]float64, edges)
}

// inject sets b_i = sum over fixed neighbours of e_ij t_j, the right-hand side for values t at the fixed vertices.
func (a *grounded) inject(t, b []float64) {
	clear(b)
	for k, i := range a.edgeRow {
		var v float64
		for e := a.edgePtr[k]; e < a.edgePtr[k+1]; e++ {
			v += float64(a.edgeW[e] * t[a.edgeFix[e]])
		}
		b[i] = v
	}
}
