package laplace

import (
	"slices"

	"pinfill/internal/parallel"
)

const coarseChunk = 512 // coarse rows formed at a time

// members lists the vertices of each aggregate: those of aggregate I are list[ptr[I]:ptr[I+1]], increasing.
type members struct {
	ptr  []int32
	list []int32
}

func gather(agg []int32, count int) members {
	m := members{ptr: make([]int32, count+1)}
	for _, g := range agg {
		if g >= 0 {
			m.ptr[g+1]++
		}
	}
	for g := range count {
		m.ptr[g+1] += m.ptr[g]
	}
	m.list = make([]int32, m.ptr[count])
	at := slices.Clone(m.ptr[:count])
	for i, g := range agg {
		if g >= 0 {
			m.list[at[g]] = int32(i)
			at[g]++
		}
	}
	return m
}

// coarsen forms P^T A P for the piecewise constant P of the aggregates: W_IJ = sum w_ij, and the excess of I is that
// of its members and their ties to vertices of the ground.
func coarsen(a *sddm, agg []int32, m members, workers int) *sddm {
	count := len(m.ptr) - 1
	c := &sddm{n: count, ptr: make([]int, count+1), excess: make([]float64, count), diag: make([]float64, count)}
	chunks := (count + coarseChunk - 1) / coarseChunk
	type piece struct {
		col []int32
		w   []float64
	}
	pieces := make([]piece, chunks)
	markers := make([][]int32, workers) // of a coarse column: 1 + its place in the chunk's piece, stale if before the row
	parallel.ForChunk(workers, count, coarseChunk, func(worker, chunk, lo, hi int) {
		if markers[worker] == nil {
			markers[worker] = make([]int32, count)
		}
		mark := markers[worker]
		var room int
		for _, i := range m.list[m.ptr[lo]:m.ptr[hi]] {
			room += a.ptr[i+1] - a.ptr[i]
		}
		col, w := make([]int32, 0, room/2), make([]float64, 0, room/2)
		for g := lo; g < hi; g++ {
			first := int32(len(col))
			var e, d float64
			for _, i := range m.list[m.ptr[g]:m.ptr[g+1]] {
				e += a.excess[i]
				for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
					to := agg[a.col[k]]
					switch {
					case int(to) == g:
					case to < 0:
						e += a.w[k]
					default:
						at := mark[to] - 1
						if at < first || at >= int32(len(col)) || col[at] != to {
							col, w = append(col, to), append(w, a.w[k])
							mark[to] = int32(len(col))
						} else {
							w[at] += a.w[k]
						}
					}
				}
			}
			for _, v := range w[first:] {
				d += v
			}
			c.ptr[g+1] = len(col) - int(first)
			c.excess[g], c.diag[g] = e, d+e
		}
		pieces[chunk] = piece{col, w}
	})
	for g := range count {
		c.ptr[g+1] += c.ptr[g]
	}
	c.col, c.w = make([]int32, c.ptr[count]), make([]float64, c.ptr[count])
	parallel.ForChunk(workers, count, coarseChunk, func(_, chunk, lo, _ int) {
		copy(c.col[c.ptr[lo]:], pieces[chunk].col)
		copy(c.w[c.ptr[lo]:], pieces[chunk].w)
	})
	return c
}
