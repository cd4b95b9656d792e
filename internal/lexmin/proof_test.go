package lexmin

import (
	"flag"
	"testing"

	"pinfill/internal/testproblems"
)

var proofs = flag.Int("proof", 300, "number of random graphs to compare with the slow oracle")

// Every graph is solved a second time by repeated removal of the steepest path, found by a search from every held
// vertex (testproblems.SteepestPaths, which shares no code with this package), and must agree within 1e-9 of the label
// range; Check must pass it too.
func TestProof(t *testing.T) {
	var worst float64
	var figures Report
	for seed := range uint64(*proofs) {
		pr := testproblems.Random(seed, inf, mixed[seed%uint64(len(mixed))])
		want := testproblems.SteepestPaths(pr)
		got := solve(t, pr, 2)
		e := testproblems.Distance(got, want) / pr.Range()
		if !(e <= 1e-9) {
			t.Errorf("%s: %g off", pr.Name, e)
		}
		r := check(t, pr, got)
		if r.Imbalance > certified || r.Shift > certified || r.Path > certified {
			t.Errorf("%s: %+v", pr.Name, r)
		}
		worst = max(worst, e)
		figures = Report{max(figures.Imbalance, r.Imbalance), max(figures.Shift, r.Shift), max(figures.Path, r.Path), 0}
	}
	t.Logf("%d graphs at p = inf: largest error %.1e of the label range, imbalance %.1e, shift %.1e, path %.1e",
		*proofs, worst, figures.Imbalance, figures.Shift, figures.Path)
}
