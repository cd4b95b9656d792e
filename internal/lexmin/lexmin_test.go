package lexmin

import (
	"context"
	"math"
	"testing"

	"pinfill/internal/testproblems"
)

func solve(t testing.TB, pr testproblems.Problem, workers int) []float64 {
	t.Helper()
	f, _, err := Solve(context.Background(), pr.Graph, pr.Fixed, pr.Values, Options{Workers: workers})
	if err != nil {
		t.Fatalf("%s: %v", pr.Name, err)
	}
	return f
}

// Closed forms of series, parallel, stars and stencils, see testproblems.
func TestClosedForms(t *testing.T) {
	for _, pr := range testproblems.Closed() {
		if !math.IsInf(pr.P, 1) {
			continue
		}
		tolerance := 1e-14 // a few roundings of values of the size of the range
		if pr.Printed() {
			tolerance = testproblems.PrintedTolerance
		}
		if e := pr.Error(solve(t, pr, 1)); !(e <= tolerance) {
			t.Errorf("%s: error %g", pr.Name, e)
		}
	}
}

var inf = math.Inf(1)

// mixed are the kinds of random problem that every property is tried on in turn.
var mixed = []testproblems.Options{
	{},
	{Branches: true},
	{Levels: 3},
	{Unit: true, Levels: 2},
	{Unit: true},
	{Components: 3},
	{Spread: 23.03},
	{Spread: 23.03, Levels: 2, Branches: true},
	{MaxLabels: 20},
	{MinN: 40, MaxN: 90},
}

// The least steepest slope any interpolation can have, by linear programming: SciPy 1.10.1's linprog, run once by
// internal/testproblems/testdata/scipy.py.
func TestSteepestSlopeIsSciPysMinimax(t *testing.T) {
	for _, r := range testproblems.SciPy() {
		got := r.Inf.SteepestSlope(solve(t, r.Inf, 1))
		if !(math.Abs(got/r.Minimax-1) <= testproblems.MinimaxTolerance) {
			t.Errorf("%s: steepest slope %v, linprog %v", r.Inf.Name, got, r.Minimax)
		}
	}
}
