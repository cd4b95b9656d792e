package dimension

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/neighbors"
	"pinfill/internal/points"
)

// The values follow from p_min = d ln n / ln(n/k) by hand, k = 10.
func TestPMin(t *testing.T) {
	for _, c := range []struct {
		n       int
		d, want float64
	}{{1000, 2, 3}, {10000, 2, 2.6667}, {10000, 3, 4}, {10000, 5, 6.6667}, {10000, 10, 13.3333}, {100000, 5, 6.25}} {
		if got := PMin(c.n, c.d, 10); math.Abs(got-c.want) > 1e-4 {
			t.Errorf("PMin(%d, %v, 10) = %v, want %v", c.n, c.d, got, c.want)
		}
	}
	if !math.IsInf(PMin(10, 2, 10), 1) || !math.IsInf(PMin(10, 2, 12), 1) {
		t.Error("k >= n allows some p")
	}
	r := rand.New(rand.NewPCG(3, 9))
	for range 1000 {
		n, d, k := 20+r.IntN(1e6), 0.5+10*r.Float64(), 1+18*r.Float64()
		p := PMin(n, d, k)
		if _, high := Range(n, d, p); math.Abs(high-k) > 1e-9*k || p < d {
			t.Fatalf("n %d d %v k %v: p_min %v has its upper end at %v", n, d, k, p, high)
		}
	}
}

func TestJudge(t *testing.T) {
	at := func(d, low, high float64) Result { return Result{Value: d, Low: low, High: high} }
	for _, c := range []struct {
		name    string
		n       int
		d       Result
		k, p    float64
		inside  bool
		reasons []Reason
	}{
		{"sound", 10000, at(2, 1.95, 2.05), 10, 3, true, nil},
		{"inf", 10000, at(5, 4.9, 5.1), 10, math.Inf(1), true, nil},
		{"few", 10000, at(2, 2, 2), 5, 3, false, []Reason{TooFewNeighbours}},
		{"many", 10000, at(2, 2, 2), 50, 3, false, []Reason{TooManyNeighbours}},
		{"p = 2 on a plane", 10000, at(2, 2, 2), 10, 2, false, []Reason{PBelowDimension}},
		{"both", 10000, at(2, 2, 2), 5, 1.5, false, []Reason{TooFewNeighbours, PBelowDimension}},
		{"just empty", 1000, at(5, 5, 5), 10, 6.75, false, []Reason{EmptyWindow}},
		{"just open", 1000, at(5, 5, 5), 7, 7.1, true, nil},
		{"empty", 1000, at(5, 5, 5), 10, 6, false, []Reason{EmptyWindow}},
		{"loose", 10000, at(2, 1.5, 3.5), 10, 3, true, []Reason{DimensionUncertain}},
	} {
		v := Judge(c.n, c.d, c.k, c.p)
		if v.Inside != c.inside || !slices.Equal(v.Reasons, c.reasons) {
			t.Errorf("%s: %+v", c.name, v)
		}
		for _, r := range v.Reasons {
			if r.String() == "" {
				t.Errorf("reason %d has no sentence", r)
			}
		}
	}
}

func BenchmarkEstimate(b *testing.B) {
	m := sample(1, 100000, 2, uniform)
	s, err := points.Prepare(context.Background(), m, points.Options{Scale: points.None})
	if err != nil {
		b.Fatal(err)
	}
	l, _, err := neighbors.KNearest(context.Background(), s.Points, 20, neighbors.Options{})
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if _, err := Estimate(l, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
