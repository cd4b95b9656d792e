package choose

import (
	"math"
	"slices"

	"pinfill/internal/parallel"
)

const (
	scoreFloor  = 1e-12 // scores count as at least this before their logarithm
	matchSample = 1 << 16
)

// matchWeights finds the weights under which the hard decisions of the free vertices fall to the classes in the given
// shares: an assignment with fixed class sizes. Logarithms of weights are the dual prices of that transport problem;
// they are found by Sinkhorn's iteration at falling temperature (Cuturi 2013), which also settles what share of a tied
// crowd goes where. free lists the vertices; of more than matchSample every so-many-th is looked at.
func matchWeights(scores [][]float64, free []int32, share []float64, workers int) Weights {
	classes := len(scores)
	if len(free) > matchSample {
		step := (len(free) + matchSample - 1) / matchSample
		var some []int32
		for i := 0; i < len(free); i += step {
			some = append(some, free[i])
		}
		free = some
	}
	if len(free) == 0 {
		return equalWeights(classes)
	}
	logs := make([]float64, len(free)*classes) // row by vertex
	parallel.For(workers, len(free), 4096, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			for c := range classes {
				logs[i*classes+c] = math.Log(max(scores[c][free[i]], scoreFloor))
			}
		}
	})
	a := make([]float64, classes)
	for i := range free {
		for c := range classes {
			a[c] -= logs[i*classes+c]
		}
	}
	for c := range a {
		a[c] /= float64(len(free))
	}
	spread := make([]float64, len(free))
	for i := range free {
		row := logs[i*classes : (i+1)*classes]
		lo, hi := math.Inf(1), math.Inf(-1)
		for c, v := range row {
			lo, hi = min(lo, v+a[c]), max(hi, v+a[c])
		}
		spread[i] = hi - lo
	}
	slices.Sort(spread)
	scale := spread[len(spread)/2] + scoreFloor
	for _, cool := range []float64{1, .4, .15, .06, .03} {
		for range 8 {
			sinkhorn(logs, a, share, cool*scale, workers)
		}
	}
	return fromLogs(a)
}

// sinkhorn moves the prices a once towards soft shares at one temperature.
func sinkhorn(logs, a, share []float64, temperature float64, workers int) {
	classes := len(a)
	n := len(logs) / classes
	const grain = 4096
	sums := make([][]float64, (n+grain-1)/grain)
	parallel.ForChunk(workers, n, grain, func(_, chunk, lo, hi int) {
		sum, q := make([]float64, classes), make([]float64, classes)
		for i := lo; i < hi; i++ {
			row := logs[i*classes : (i+1)*classes]
			top := math.Inf(-1)
			for c, v := range row {
				q[c] = (v + a[c]) / temperature
				top = max(top, q[c])
			}
			var t float64
			for c := range q {
				q[c] = math.Exp(q[c] - top)
				t += q[c]
			}
			for c := range q {
				sum[c] += q[c] / t
			}
		}
		sums[chunk] = sum
	})
	for c := range a {
		var m float64
		for _, s := range sums {
			m += s[c]
		}
		a[c] += temperature * (math.Log(share[c]) - math.Log(m/float64(n)+scoreFloor))
	}
}
