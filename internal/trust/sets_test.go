package trust

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// Exchangeable rows: coverage averages between what is asked for and 1/(l+1) above it, however wrong the scores.
func TestSetsCover(t *testing.T) {
	const draws, fresh = 300, 200
	for _, c := range []struct {
		labels   int
		coverage float64
		settings SetSettings
	}{
		{40, .9, SetSettings{}}, {60, .9, SetSettings{}}, {25, .8, SetSettings{}}, {60, .9, SetSettings{KeepFirst: true}},
	} {
		r := rand.New(rand.NewPCG(21, uint64(c.labels)))
		c.settings.Coverage = c.coverage
		var sum float64
		for range draws {
			s, g := world(r, c.labels+fresh, 4, 5)
			cal, err := FitCalibration(evidence(s[:c.labels], g[:c.labels], 4))
			if err != nil {
				t.Fatal(err)
			}
			sets, err := NewSets(cal, c.settings)
			if err != nil {
				t.Fatal(err)
			}
			var in [][]int32
			for _, row := range s[c.labels:] {
				in = append(in, sets.Of(nil, cal.Probabilities(make([]float64, 4), row)))
			}
			sum += MeasureSets(in, g[c.labels:]).Covered.Value / draws
		}
		// 300 drawings of 25 to 60 labels: standard error about .003.
		if sum < c.coverage-.01 || sum > c.coverage+1/float64(c.labels+1)+.012 {
			t.Errorf("%d labels: sets meant to hold the truth at %g hold it at %.4f", c.labels, c.coverage, sum)
		}
	}
}

func calibrated(t *testing.T, labels, classes int) (*Calibration, [][]float64, []int) {
	t.Helper()
	s, g := world(rand.New(rand.NewPCG(22, uint64(labels))), labels, classes, 5)
	c, err := FitCalibration(evidence(s, g, classes))
	if err != nil {
		t.Fatal(err)
	}
	return c, s, g
}

func TestTooFewLabels(t *testing.T) {
	c, s, _ := calibrated(t, 8, 3)
	sets, err := NewSets(c, SetSettings{Coverage: .9})
	if err != nil {
		t.Fatal(err)
	}
	p := sets.Promise()
	if got := sets.Of(nil, c.Probabilities(make([]float64, 3), s[0])); len(got) != 3 {
		t.Errorf("8 labels promise 0.9 with the set %v", got)
	}
	if p.Unbounded != 3 || p.Floor != 1./9 || p.Sentence() != "8 labels are too few to promise 0.9: at best 0.889" {
		t.Errorf("%+v: %s", p, p.Sentence())
	}
	if sets, _ = NewSets(c, SetSettings{Coverage: .88}); sets.Promise().Unbounded != 0 {
		t.Error("8 labels are enough for .88")
	}
}

func TestPerClassSets(t *testing.T) {
	c, _, g := calibrated(t, 60, 3)
	sets, err := NewSets(c, SetSettings{Coverage: .9, Drawn: PerClass})
	if err != nil {
		t.Fatal(err)
	}
	score, _ := c.leftOutScores()
	for class, threshold := range sets.threshold {
		var own []float64
		for i, v := range g {
			if v == class {
				own = append(own, score[i])
			}
		}
		covered := 0
		for _, v := range own {
			if v <= threshold {
				covered++
			}
		}
		if need := rank(len(own), .9); !math.IsInf(threshold, 1) && covered != need {
			t.Errorf("class %d: %d of %d labels within the threshold, want %d", class, covered, len(own), need)
		}
	}
	// Shares in proportion to the labels: the same threshold as random drawing, but for the candidate's own class.
	count := make([]float64, 3)
	for _, v := range g {
		count[v]++
	}
	weighted, err := NewSets(c, SetSettings{Coverage: .9, Drawn: PerClass, Shares: count})
	if err != nil {
		t.Fatal(err)
	}
	random, err := NewSets(c, SetSettings{Coverage: .9})
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(weighted.threshold, random.threshold) {
		t.Errorf("thresholds %v and %v", weighted.threshold, random.threshold)
	}
	if _, err := NewSets(c, SetSettings{Coverage: .9, Shares: []float64{1}}); err == nil {
		t.Error("one share for three classes accepted")
	}
	if _, err := NewSets(c, SetSettings{Coverage: 1}); err == nil {
		t.Error("coverage 1 accepted")
	}
}

// Labels drawn per class from classes of unequal size, shares known: the coverage over all rows is as asked for.
func TestWeightedSetsCover(t *testing.T) {
	r := rand.New(rand.NewPCG(23, 0))
	share := []float64{.7, .2, .1}
	const draws, each = 200, 20
	var weighted, plain float64
	for range draws {
		s, g := world(r, 3000, 3, 4)
		var byClass [3][][]float64
		for i, c := range g {
			byClass[c] = append(byClass[c], s[i])
		}
		var e ClassEvidence
		e.Classes = 3
		var fresh [][]float64
		var right []int
		for c := range byClass {
			e.LeftOut = append(e.LeftOut, byClass[c][:each]...)
			for range each {
				e.Given = append(e.Given, c)
			}
			for _, row := range byClass[c][each : each+int(300*share[c])] {
				fresh, right = append(fresh, row), append(right, c)
			}
		}
		cal, err := FitCalibration(e)
		if err != nil {
			t.Fatal(err)
		}
		for i, set := range []SetSettings{{Drawn: PerClass, Shares: share}, {}} {
			set.Coverage = .8
			sets, err := NewSets(cal, set)
			if err != nil {
				t.Fatal(err)
			}
			var in [][]int32
			for _, row := range fresh {
				in = append(in, sets.Of(nil, cal.Probabilities(make([]float64, 3), row)))
			}
			v := MeasureSets(in, right).Covered.Value / draws
			if i == 0 {
				weighted += v
			} else {
				plain += v
			}
		}
	}
	if weighted < .79 || weighted > .83 {
		t.Errorf("sets meant to hold the truth at .8 hold it at %.3f (%.3f unweighted)", weighted, plain)
	}
}

func TestSetOrder(t *testing.T) {
	s := &Sets{threshold: []float64{.9, .9, .9, .5}, keepFirst: true}
	if got := s.Of([]int32{7}, []float64{.2, .3, .2, .3}); !slices.Equal(got, []int32{7, 1, 0, 2}) {
		t.Errorf("set %v", got)
	}
	s = &Sets{threshold: []float64{.1, .1}, keepFirst: true}
	if got := s.Of(nil, []float64{.4, .6}); !slices.Equal(got, []int32{1}) {
		t.Errorf("set %v", got)
	}
	nan := math.NaN()
	if got := s.Of(nil, []float64{nan, nan}); !slices.Equal(got, []int32{0, 1}) {
		t.Errorf("nothing known: set %v", got)
	}
	for _, p := range []Promise{{Void: true}, {Coverage: .9}, {Coverage: .9, Drawn: PerClass}} {
		if p.Sentence() == "" {
			t.Error("no sentence")
		}
	}
	if PerClass.String() != "per-class" || Drawn(9).String() != "Drawn(9)" {
		t.Error("names")
	}
}
