package study

import (
	"context"
	"fmt"
	"math/rand/v2"
	"testing"

	"pinfill/internal/advise"
	"pinfill/internal/choose"
	"pinfill/internal/trust"
)

// TestAudit flips a tenth of 100 labels to another class and prints how well the list of doubts finds them: area under
// the curve, and the share of the flipped among the first 6 and the first 10 named.
func TestAudit(t *testing.T) {
	if *drawings == 0 {
		t.Skip("a study: make coverage")
	}
	const count, flipped = 100, 10
	fmt.Printf("%-8s %6s %8s %9s %10s\n", "table", "AUC", "first 6", "first 10", "named<.05")
	names := []string{"digits", "clips", "seabed"}
	if quick() {
		names = names[:1]
	}
	for _, name := range names {
		l := get(t, name)
		var area, six, ten, named mean
		for d := range fewer(name, 2) {
			r := rand.New(rand.NewPCG(uint64(d), 77))
			at := l.draw(r, count)
			given := make([]int, count)
			bad := make([]bool, count)
			for k, v := range at {
				given[k] = l.class[v]
			}
			for _, k := range r.Perm(count)[:flipped] {
				given[k] = (given[k] + 1 + r.IntN(l.classes-1)) % l.classes
				bad[k] = true
			}
			a := l.solveClasses(t, l.labels(at, func(k int) int { return given[k] }), 2, choose.AutoBalance)
			cal, err := trust.FitCalibration(trust.ClassEvidence{Classes: l.classes, LeftOut: a.leftOut, Given: given})
			if err != nil {
				t.Fatal(err)
			}
			prob := make([][]float64, count)
			for k := range prob {
				prob[k] = cal.Probabilities(make([]float64, l.classes), a.leftOut[k])
			}
			schur, _, err := l.system(t, at).Harmonic(context.Background(), 1e-8, nil)
			if err != nil {
				t.Fatal(err)
			}
			doubts, err := advise.AuditClasses(given, prob, schur)
			if err != nil {
				t.Fatal(err)
			}
			above, pairs, seen := 0.0, 0.0, 0.0
			hits := 0.0
			for i, q := range doubts {
				if bad[q.Label] {
					hits++
					above += float64(count-flipped) - seen
					pairs += float64(count - flipped)
				} else {
					seen++
				}
				if i == 5 {
					six.add(hits / flipped)
				}
				if i == 9 {
					ten.add(hits / flipped)
				}
			}
			area.add(above / pairs)
			sure := 0.0
			for _, q := range doubts {
				if bad[q.Label] && q.Adjusted < .05 {
					sure++
				}
			}
			named.add(sure / flipped)
		}
		fmt.Printf("%-8s %6.4f %8.3f %9.3f %10.3f\n", name, area.value(), six.value(), ten.value(), named.value())
		if area.value() < .97-3*area.se() || six.value() < .5-3*six.se() {
			t.Errorf("%s: AUC %.3f and %.2f in the first 6, want .97 and half", name, area.value(), six.value())
		}
	}
}
