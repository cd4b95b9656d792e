package lexmin

import (
	"context"
	"testing"

	"pinfill/internal/testproblems"
)

func check(t *testing.T, pr testproblems.Problem, f []float64) Report {
	t.Helper()
	r, err := Check(context.Background(), pr.Graph, pr.Fixed, pr.Values, f)
	if err != nil {
		t.Fatalf("%s: %v", pr.Name, err)
	}
	return r
}

// tolerance of every figure of a Report: the residual asked of an exact solve.
const certified = 1e-12

func TestCheckPassesTheMinimiser(t *testing.T) {
	for seed := range uint64(200) {
		pr := testproblems.Random(seed, inf, mixed[seed%uint64(len(mixed))])
		for _, f := range [][]float64{solve(t, pr, 1), testproblems.SteepestPaths(pr)} {
			if r := check(t, pr, f); r.Imbalance > certified || r.Shift > certified || r.Path > certified {
				t.Errorf("%s: %+v", pr.Name, r)
			}
		}
	}
}

// One free value moved by 1e-6 of the range, or all of them p = 32's, must not pass.
func TestCheckRefusesWrongAnswers(t *testing.T) {
	for seed := range uint64(200) {
		pr := testproblems.Random(seed, inf, testproblems.Options{Branches: seed%2 == 0})
		f := solve(t, pr, 1)
		free := []int{}
		for v, y := range pr.Hold() {
			if y != y {
				free = append(free, v)
			}
		}
		v := free[int(seed)%len(free)]
		f[v] += 1e-6 * pr.Range()
		if r := check(t, pr, f); r.Shift < 1e-7 || r.Imbalance == 0 {
			t.Errorf("%s: vertex %d moved by 1e-6 and found %+v", pr.Name, v, r)
		}
		if seed%20 == 0 {
			pr.P = 32
			lo, _, _ := testproblems.Enclose(pr, 1e-9, 20000)
			if r := check(t, pr, lo); r.Shift < 1e-5 && r.Imbalance < 1e-5 {
				t.Errorf("%s: p = 32 passes: %+v", pr.Name, r)
			}
		}
	}
}

// The steepest edge of a wrong f is steeper than any path between labels calls for, and Path says so.
func TestCheckRefusesASteeperMinimax(t *testing.T) {
	pr := testproblems.Chain(inf, []float64{1, 1, 1, 1})
	f := []float64{0, .3, .6, .8, 1}
	if r := check(t, pr, f); r.Path < .09 {
		t.Errorf("slope .3 where .25 is possible: %+v", r)
	}
}
