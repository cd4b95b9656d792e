package dimension

import (
	"math"

	"pinfill/internal/neighbors"
)

// likelihood estimates the dimension at each k. With T_j the distance to the j-th neighbour, ln(T_k/T_j) over j < k are
// the order statistics of k-1 exponentials of rate d where the density is even, so that
//
//	1/d = mean over vertices of 1/(k-1) sum over j<k of ln(T_k/T_j)
//
// without bias; Levina and Bickel (2004) average the inverses of the inner means instead, which is biased by
// (k-1)/(k-2) (MacKay and Ghahramani, comment on it, 2005).
func likelihood(l *neighbors.Lists, ks []int, workers int) []Figure {
	count := blocks(l.N)
	sum := make([][]float64, count) // of each block, for each k, over its vertices
	size := make([]float64, count)
	forBlocks(l.N, workers, func(b, lo, hi int) {
		sum[b] = make([]float64, len(ks))
		size[b] = float64(hi - lo)
		for i := lo; i < hi; i++ {
			dist := l.Dist[i*l.K : (i+1)*l.K]
			var logs float64 // sum of ln T_j over the neighbours before
			at := 0
			for j, k := range ks {
				for ; at < k-1; at++ {
					logs += math.Log(dist[at])
				}
				sum[b][j] += math.Log(dist[k-1]) - logs/float64(k-1)
			}
		}
	})
	figures := make([]Figure, len(ks))
	for j, k := range ks {
		var s, n float64
		for b := range count {
			s += sum[b][j]
			n += size[b]
		}
		without := make([]float64, count)
		for b := range count {
			without[b] = ratio(n-size[b], s-sum[b][j])
		}
		figures[j] = Figure{K: k, Value: ratio(n, s), StdError: jackknife(without)}
	}
	return figures
}

// ratio is a/b, or NaN where b is not above zero.
func ratio(a, b float64) float64 {
	if !(b > 0) {
		return math.NaN()
	}
	return a / b
}
