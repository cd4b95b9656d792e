package solve

import (
	"context"
	"flag"
	"fmt"
	"math"
	"strings"
	"testing"

	"pinfill/internal/testproblems"
)

var proofCount = flag.Int("proof", 0, "random graphs for each p in TestProof; 0 means 300, or 24 with -short")

// problemOf turns a test problem into one of this package's.
func problemOf(t testproblems.Problem) Problem {
	return Problem{Graph: t.Graph, Fixed: t.Fixed, Values: t.Values, P: t.P}
}

// oracle gives the answer of an independent slow method and how far it can be from the minimiser, a share of the range.
func oracle(t testproblems.Problem) (f []float64, uncertain float64) {
	switch {
	case math.IsInf(t.P, 1):
		return testproblems.SteepestPaths(t), 1e-12
	case t.P < 2:
		f, moved := testproblems.Reweight(t)
		return f, moved / t.Range()
	default:
		lo, hi, width := testproblems.Enclose(t, 1e-10, 3000)
		f := make([]float64, len(lo))
		for v := range f {
			f[v] = 0.5 * (lo[v] + hi[v])
		}
		return f, width
	}
}

// TestProof runs random graphs of 8 to 40 vertices, weights spread over e^3, against independent oracles: monotone
// nodal sweeps from both sides for p >= 2, dense reweighting below, repeated steepest paths at infinity. A certified
// answer farther than 1e-9 of the range from the oracle (and its uncertainty) is a silent miss, the worst that can
// happen; every graph must be certified.
func TestProof(t *testing.T) {
	count := *proofCount
	if count == 0 {
		count = 300
		if testing.Short() {
			count = 24
		}
	}
	for _, p := range []float64{1.5, 2, 2.5, 3, 4, 8, 32, math.Inf(1)} {
		t.Run(fmt.Sprintf("p=%v", p), func(t *testing.T) {
			t.Parallel()
			var worst, uncertain, width float64
			missed, silent, unsure := 0, 0, 0
			for seed := range count {
				o := testproblems.Options{}
				if *proofCount == 0 && p >= 2 {
					o.MaxN = 14 // the sweeps of the oracle take about n^2 passes
				}
				switch seed % 6 {
				case 1:
					o.Levels = 2
				case 2:
					o.Branches = true
				case 3:
					o.Unit = true
				case 4:
					o.Levels, o.Components = 3, 2
				}
				tp := testproblems.Random(uint64(seed), p, o)
				r, err := Run(context.Background(), problemOf(tp), Settings{Workers: 1})
				if err != nil {
					t.Fatalf("seed %d: %v", seed, err)
				}
				if !r.Status.Proven() {
					missed++
					t.Errorf("seed %d: missed, %+v", seed, r.Certificate)
					continue
				}
				want, u := oracle(tp)
				e := testproblems.Distance(r.Values, want) / tp.Range()
				if u > 1e-9 {
					unsure++ // the oracle ran out of sweeps: it can only say that the answer lies in its band
				} else {
					worst = max(worst, e)
					uncertain = max(uncertain, u)
				}
				if !(e <= 1e-9+u) {
					silent++
					t.Errorf("seed %d: silent miss, %.3g from the oracle (itself within %.2g), width %.2g", seed, e, u, r.Certificate.Width)
				}
				if !math.IsNaN(r.Certificate.Width) {
					width = max(width, r.Certificate.Width)
				}
			}
			t.Logf("%d graphs: largest error %.2g (oracle within %.2g; wider on %d), largest width %.2g, %d missed, %d silent",
				count, worst, uncertain, unsure, width, missed, silent)
		})
	}
}

func TestClosedForms(t *testing.T) {
	for _, tp := range testproblems.Closed() {
		r, err := Run(context.Background(), problemOf(tp), Settings{})
		if err != nil {
			t.Errorf("%s: %v", tp.Name, err)
			continue
		}
		tolerance := 1e-9
		if strings.HasPrefix(tp.Name, "printed") {
			tolerance = 1e-5 // printed to five or six digits
		}
		if e := tp.Error(r.Values); !(e <= tolerance) {
			t.Errorf("%s: error %.3g of the range, %v %+v", tp.Name, e, r.Status, r.Certificate)
		}
		if !r.Status.Proven() {
			t.Errorf("%s: %v, %+v", tp.Name, r.Status, r.Certificate)
		}
	}
}
