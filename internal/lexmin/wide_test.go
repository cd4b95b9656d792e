package lexmin

import (
	"math"
	"testing"

	"pinfill/internal/testproblems"
)

// Weights that span e^100, e^1200 and e^20000: where lengths leave the range of float64 the answer is that of the
// strongest edges, and ties between weak ones are still settled by their ratio.
func TestWideWeights(t *testing.T) {
	for seed := range uint64(120) {
		pr := testproblems.Random(seed, inf, testproblems.Options{Spread: 100, Branches: seed%2 == 0})
		want := testproblems.SteepestPaths(pr) // e^100 is within float64
		if e := testproblems.Distance(solve(t, pr, 1), want) / pr.Range(); !(e <= 1e-9) {
			t.Errorf("%s: %g off", pr.Name, e)
		}
		for _, spread := range []float64{1200, 2500, 20000} {
			pr := testproblems.Random(seed, inf, testproblems.Options{Spread: spread, Components: 2})
			if r := check(t, pr, solve(t, pr, 1)); r.Shift > certified {
				t.Errorf("%s, weights over e^%g: %+v", pr.Name, spread, r)
			}
		}
	}
}

// A cluster of strong edges joined to labels 0 and 1 by edges of ln w = -a and -b only: its value is e^a/(e^a+e^b).
func TestWeakTiesOfAStrongCluster(t *testing.T) {
	for _, base := range []float64{0, 1000, 5000, 1e6} {
		pr := testproblems.Problem{
			Graph: testproblems.Graph(5, []testproblems.Edge{
				{I: 0, J: 1, LogW: -base - 2}, {I: 1, J: 2}, {I: 2, J: 3, LogW: .5}, {I: 3, J: 4, LogW: -base - 3},
			}),
			Fixed: []int32{0, 4}, Values: []float64{0, 1}, P: inf,
		}
		// A chain: the drop over an edge is its share of the length.
		l := []float64{math.Exp(2), math.Exp(-base), math.Exp(-base - .5), math.Exp(3)}
		want := (l[0] + l[1]) / (l[0] + l[1] + l[2] + l[3])
		f := solve(t, pr, 1)
		if !(math.Abs(f[2]-want) <= 1e-14) {
			t.Errorf("base %g: %v, want %v", base, f[2], want)
		}
	}
}
