package choose

import (
	"math"
	"testing"
)

// By hand: four free vertices, masses 3 and 1; uniform weights 1/6 and 1/2, so a score of .7 against .3 goes to the
// second class (.117 against .15).
func TestMassByHand(t *testing.T) {
	scores := [][]float64{{1, 0, .9, .7, .8, .6}, {0, 1, .1, .3, .2, .4}}
	l := Labels{Vertex: []int32{0, 1}, Target: [][]float64{{1, 0}, {0, 1}}}
	for _, c := range []struct {
		b     Balance
		ratio float64 // weight of the second class over that of the first
		want  []int
	}{
		{Balance{Mode: NoBalance}, 1, []int{0, 1, 0, 0, 0, 0}},
		{Balance{Mode: Uniform}, 3, []int{0, 1, 0, 1, 0, 1}},
		{Balance{Mode: FromLabels}, 3, []int{0, 1, 0, 1, 0, 1}},
		{Balance{Mode: Given, Shares: []float64{5, 2}}, 1.2, []int{0, 1, 0, 0, 0, 0}},
	} {
		w, err := c.b.Mass(scores, l)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(w[1]/w[0]-c.ratio) > 1e-12 {
			t.Errorf("%v: weights %v, ratio not %v", c.b.Mode, w, c.ratio)
		}
		for v, want := range c.want {
			if got := w.Decide(func(c int) float64 { return scores[c][v] }); got != want {
				t.Errorf("%v: vertex %d is class %d, want %d", c.b.Mode, v, got, want)
			}
		}
	}
}

// The labels' shares by hand: 3 and 1 labels, one more each: 4/6 and 2/6.
func TestLabelShares(t *testing.T) {
	s := Balance{Mode: FromLabels}.shares([]int{3, 1})
	if math.Abs(s[0]-2./3) > 1e-15 || math.Abs(s[1]-1./3) > 1e-15 {
		t.Errorf("shares %v", s)
	}
}

func TestBalanceRefuses(t *testing.T) {
	for _, b := range []Balance{{Mode: Given}, {Mode: Given, Shares: []float64{1, 0}}, {Mode: Given, Shares: []float64{1, math.NaN()}}, {Mode: 9}} {
		if b.Validate(2) == nil {
			t.Errorf("%v accepted", b)
		}
	}
}

func TestDecideEdges(t *testing.T) {
	w := Weights{1, 1, 2}
	at := func(s ...float64) func(int) float64 { return func(c int) float64 { return s[c] } }
	if got := w.Decide(at(.5, .5, .1)); got != 0 {
		t.Errorf("of equals the first: %d", got)
	}
	if got := w.Decide(at(.5, math.NaN(), .1)); got != -1 {
		t.Errorf("without a score there is no class: %d", got)
	}
	if got := w.Decide(at(-1e-17, 0, 0)); got != 0 {
		t.Errorf("rounding below zero: %d", got)
	}
	if s := w.Shares(nil, at(0, 0, 0)); s[0] != 1./3 {
		t.Errorf("no scores: shares %v", s)
	}
}
