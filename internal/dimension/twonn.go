package dimension

import (
	"math"
	"slices"

	"pinfill/internal/neighbors"
)

// keptShare of the ratios takes part in the fit of twoNN; the largest, from outliers and noise, are left out, as in
// Facco et al. (2017).
const keptShare = 0.9

// twoNN estimates the dimension from mu = T_2/T_1, whose distribution is F(mu) = 1 - mu^(-d) where the density is even
// over two neighbours: -ln(1-F) = d ln mu, a line through the origin fitted by least squares on the smallest
// nine tenths (Facco, d'Errico, Rodriguez and Laio, Scientific Reports 7, 2017). It also gives the share of vertices
// with mu = 1.
func twoNN(l *neighbors.Lists, workers int) (f Figure, tied float64) {
	type mark struct {
		log   float64 // ln mu
		block int32
	}
	marks := make([]mark, l.N)
	count := blocks(l.N)
	ties := make([]int, count)
	forBlocks(l.N, workers, func(b, lo, hi int) {
		for i := lo; i < hi; i++ {
			first, second := l.Dist[i*l.K], l.Dist[i*l.K+1]
			if second-first <= tieTolerance*second {
				ties[b]++
			}
			marks[i] = mark{math.Log(second / first), int32(b)}
		}
	})
	for _, c := range ties {
		tied += float64(c) / float64(l.N)
	}
	slices.SortFunc(marks, func(x, y mark) int {
		if x.log < y.log {
			return -1
		}
		if x.log > y.log {
			return 1
		}
		return int(x.block) - int(y.block)
	})
	size := make([]int, count)
	for _, m := range marks {
		size[m.block]++
	}
	// fit gives the slope with one block left out, or with all for -1.
	fit := func(leave int32) float64 {
		n := l.N
		if leave >= 0 {
			n -= size[leave]
		}
		keep := int(keptShare * float64(n))
		var xy, xx float64
		seen := 0
		for _, m := range marks {
			if m.block == leave {
				continue
			}
			seen++
			if seen > keep || seen == n { // 1 - F is zero at the last
				break
			}
			y := -math.Log1p(-float64(seen) / float64(n))
			xy += float64(m.log * y)
			xx += float64(m.log * m.log)
		}
		return ratio(xy, xx)
	}
	without := make([]float64, count)
	forBlocks(l.N, workers, func(b, _, _ int) { without[b] = fit(int32(b)) })
	return Figure{K: 2, Value: fit(-1), StdError: jackknife(without)}, tied
}
