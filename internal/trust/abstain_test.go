package trust

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestAbstain(t *testing.T) {
	inf, nan := math.Inf(-1), math.NaN()
	s := []float64{.9, .5, nan, .5, .7, .2}
	for _, c := range []struct {
		threshold, rate float64
		want            []int
	}{
		{inf, 0, nil},
		{.6, 0, []int{1, 3, 5}},
		{inf, .2, []int{5}},
		{inf, .4, []int{5}}, // the next two are equal, and only one more may go
		{inf, .6, []int{1, 3, 5}},
		{inf, 1, []int{0, 1, 3, 4, 5}},
		{.8, .2, []int{1, 3, 4, 5}},
		{.1, .2, []int{5}},
	} {
		marked, err := Abstain(s, c.threshold, c.rate)
		if err != nil {
			t.Fatal(err)
		}
		var got []int
		for i, m := range marked {
			if m {
				got = append(got, i)
			}
		}
		if !slices.Equal(got, c.want) {
			t.Errorf("threshold %g, rate %g: rows %v, want %v", c.threshold, c.rate, got, c.want)
		}
	}
	for _, rate := range []float64{-.1, 1.1, nan} {
		if _, err := Abstain(s, 0, rate); err == nil {
			t.Errorf("rate %v accepted", rate)
		}
	}
}

func TestNovelty(t *testing.T) {
	n := NewNovelty([]float64{3, 1, 2, math.NaN(), 4})
	for _, c := range []struct{ distance, want float64 }{{0, 1}, {1, 1}, {1.5, .8}, {4, .4}, {5, .2}} {
		near(t, "share", n.Share(c.distance), c.want, 1e-15)
	}
	if !math.IsNaN(n.Share(math.NaN())) {
		t.Error("a share of nothing")
	}
}

func TestAccuracyEdges(t *testing.T) {
	// One class never predicted, another never true; stratum 1 checked once.
	s := Sample{Classes: 3, Predicted: []int{0, 0, 0, 1}, Truth: []int{0, 0, 2, 0}, Stratum: []int{0, 0, 0, 1}, StratumSize: []float64{30, 10, 5}}
	a, err := EstimateAccuracy(s)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "overall", a.Overall.Value, .75*2./3, 1e-15)
	// Only stratum 0 has a variance: W^2 p(1-p)/(n-1).
	near(t, "standard error", a.Overall.SE, .75*math.Sqrt(2./9/2), 1e-15)
	if !math.IsNaN(a.User[2].Value) || !math.IsNaN(a.Producer[1].Value) {
		t.Errorf("accuracy of a class without rows: %v, %v", a.User[2], a.Producer[1])
	}
	if !slices.Equal(a.Thin, []int{1, 2}) {
		t.Errorf("thin strata %v", a.Thin)
	}
	if a.Counts[0][2] != 1 || a.Counts[0][0] != 2 || a.Counts[1][0] != 1 {
		t.Errorf("counts %v", a.Counts)
	}
	for _, bad := range []Sample{
		{Classes: 2},
		{Classes: 2, Predicted: []int{0}, Truth: []int{2}},
		{Classes: 2, Predicted: []int{0, 1}, Truth: []int{1}},
		{Classes: 2, Predicted: []int{0}, Truth: []int{1}, Stratum: []int{0}},
		{Classes: 2, Predicted: []int{0}, Truth: []int{1}, Stratum: []int{1}, StratumSize: []float64{1}},
		{Classes: 2, Predicted: []int{0}, Truth: []int{1}, Stratum: []int{0}, StratumSize: []float64{-1}},
		{Classes: 2, Predicted: []int{0}, Truth: []int{1}, Stratum: []int{0}, StratumSize: []float64{0, 3}},
	} {
		if _, err := EstimateAccuracy(bad); err == nil {
			t.Errorf("%+v accepted", bad)
		}
	}
	if f := MeasureNumbers([]float64{1}, []float64{math.NaN()}); f.Count != 0 || !math.IsNaN(f.RMSE) {
		t.Errorf("%+v", f)
	}
	inf := math.Inf(1)
	if c := MeasureIntervals([]float64{0, -inf}, []float64{1, inf}, []float64{2, 2}); c.Covered.Value != .5 || !math.IsInf(c.Size, 1) {
		t.Errorf("%+v", c)
	}
}

// A stratified sample of a table that is known whole: estimates are right on average, and their standard errors are the
// spread of the estimates.
func TestStratifiedEstimatesAreHonest(t *testing.T) {
	// Strata are the predicted classes; truth by stratum as drawn with these shares.
	shares := [][]float64{{.8, .1, .1}, {.2, .7, .1}, {0, .3, .7}}
	size := []float64{6000, 3000, 1000}
	var wantArea, wantHit, trueOne float64
	for i, row := range shares {
		wantArea += size[i] / 1e4 * row[1]
		wantHit += size[i] / 1e4 * row[i]
		trueOne += size[i] / 1e4 * row[1]
	}
	wantProducer := size[1] / 1e4 * shares[1][1] / trueOne
	r := rand.New(rand.NewPCG(41, 0))
	const draws = 2000
	var area, hit, producer, areaSE, producerSE, square, producerSquare float64
	for range draws {
		var s Sample
		s.Classes, s.StratumSize = 3, size
		for i, row := range shares {
			for range 40 {
				u, c := r.Float64(), 0
				for ; c < 2; c++ {
					if u -= row[c]; u < 0 {
						break
					}
				}
				s.Predicted, s.Truth, s.Stratum = append(s.Predicted, i), append(s.Truth, c), append(s.Stratum, i)
			}
		}
		a, err := EstimateAccuracy(s)
		if err != nil {
			t.Fatal(err)
		}
		area += a.Area[1].Value / draws
		hit += a.Overall.Value / draws
		producer += a.Producer[1].Value / draws
		areaSE += a.Area[1].SE / draws
		producerSE += a.Producer[1].SE / draws
		square += (a.Area[1].Value - wantArea) * (a.Area[1].Value - wantArea) / draws
		producerSquare += (a.Producer[1].Value - wantProducer) * (a.Producer[1].Value - wantProducer) / draws
	}
	// Standard error of these means is about .001; the ratio has a small bias of its own.
	near(t, "area", area, wantArea, .004)
	near(t, "overall", hit, wantHit, .004)
	near(t, "producer's accuracy", producer, wantProducer, .02)
	near(t, "standard error of the area over its spread", areaSE/math.Sqrt(square), 1, .06)
	near(t, "standard error of producer's accuracy over its spread", producerSE/math.Sqrt(producerSquare), 1, .12)
}
