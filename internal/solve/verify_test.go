package solve

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"pinfill/internal/testproblems"
)

var exponents = []float64{1.5, 2, 2.5, 3, 4, 8, 32, math.Inf(1)}

// solved runs a random problem and fails the test where it is not certified.
func solved(t *testing.T, p Problem) Result {
	t.Helper()
	r, err := Run(context.Background(), p, Settings{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	if !r.Status.Proven() {
		t.Fatalf("p=%v: %v, %+v", p.P, r.Status, r.Certificate)
	}
	return r
}

// TestCertificateRefusesWrongAnswers plants errors: one vertex moved by 1e-6 of the range, two values swapped, the
// answer for another p, a label changed, a constant. None may pass.
func TestCertificateRefusesWrongAnswers(t *testing.T) {
	for _, p := range exponents {
		for seed := range uint64(12) {
			pr := problemOf(testproblems.Random(500+seed, p, testproblems.Options{}))
			good := solved(t, pr).Values
			c, err := Verify(context.Background(), pr, good, Settings{})
			if err != nil {
				t.Fatal(err)
			}
			if c.status(DefaultTolerance) != Certified {
				t.Errorf("p=%v seed %d: the answer itself is refused: %+v", p, seed, c)
			}
			size := testproblems.Problem{Values: pr.Values}.Range()
			rng := rand.New(rand.NewPCG(seed, 5))
			held := map[int]bool{}
			for _, v := range pr.Fixed {
				held[int(v)] = true
			}
			var free []int
			for v := range good {
				if !held[v] {
					free = append(free, v)
				}
			}
			plant := func(name string, change func(f []float64)) {
				f := append([]float64(nil), good...)
				change(f)
				if testproblems.Distance(f, good) < 1e-7*size {
					return // nothing was changed: a swap of equal values
				}
				c, err := Verify(context.Background(), pr, f, Settings{})
				if err != nil {
					t.Fatal(err)
				}
				if c.status(DefaultTolerance) != Missed {
					t.Errorf("p=%v seed %d: %s passes, %+v", p, seed, name, c)
				}
				if off := testproblems.Distance(f, good) / size; !math.IsNaN(c.Width) && c.Width < 0.99*off {
					t.Errorf("p=%v seed %d: %s is %.3g off, width says %.3g", p, seed, name, off, c.Width)
				}
			}
			a, b := free[rng.IntN(len(free))], free[rng.IntN(len(free))]
			plant("one vertex moved up", func(f []float64) { f[a] += 1e-6 * size })
			plant("one vertex moved down", func(f []float64) { f[b] -= 1e-6 * size })
			plant("two values swapped", func(f []float64) { f[a], f[b] = f[b], f[a] })
			plant("a changed label", func(f []float64) { f[pr.Fixed[0]] += 1e-6 * size })
			plant("a constant", func(f []float64) {
				for _, v := range free {
					f[v] = pr.Values[0]
				}
			})
			if !math.IsInf(p, 1) {
				other := pr
				other.P = 1.2 * p
				g := solved(t, other).Values
				plant("the answer for another p", func(f []float64) { copy(f, g) })
			}
		}
	}
}
