package trust

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestRank(t *testing.T) {
	for _, c := range []struct {
		l        int
		coverage float64
		want     int
	}{
		{19, .95, 19}, {18, .95, 19}, {49, .9, 45}, {9, .9, 9}, {8, .9, 9}, {99, .99, 99}, {98, .99, 99}, {40, .9, 37}, {1, .5, 1},
	} {
		if got := rank(c.l, c.coverage); got != c.want {
			t.Errorf("rank(%d, %g) = %d, want %d", c.l, c.coverage, got, c.want)
		}
	}
}

// world draws rows whose scores carry a known amount of truth: the class is drawn from softmax(beta q) of the scores.
func world(r *rand.Rand, n, classes int, beta float64) (scores [][]float64, class []int) {
	for range n {
		s := make([]float64, classes)
		var sum float64
		for c := range s {
			s[c] = -math.Log(1 - r.Float64())
			s[c] *= s[c]
			sum += s[c]
		}
		q := feature(make([]float64, classes), s)
		u, c := r.Float64(), 0
		for ; c < classes-1; c++ {
			if u -= math.Exp(logSoftmax(q, beta, c)); u < 0 {
				break
			}
		}
		scores, class = append(scores, s), append(class, c)
	}
	return scores, class
}

func evidence(scores [][]float64, class []int, classes int) ClassEvidence {
	return ClassEvidence{Classes: classes, LeftOut: scores, Given: class}
}

func TestProbabilitiesAreProbabilities(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 0))
	for _, classes := range []int{2, 5, 40} {
		s, g := world(r, 50, classes, 5)
		c, err := FitCalibration(evidence(s, g, classes))
		if err != nil {
			t.Fatal(err)
		}
		p, scaled := make([]float64, classes), make([]float64, classes)
		for _, row := range s {
			c.Probabilities(p, row)
			var sum float64
			for k, v := range p {
				sum += v
				if v <= 0 || v > 1 {
					t.Fatalf("probability %v", v)
				}
				for j := range p {
					if row[k] > row[j] && p[k] < p[j] {
						t.Fatalf("scores %v and %v became %v and %v", row[k], row[j], p[k], p[j])
					}
				}
			}
			near(t, "sum", sum, 1, 1e-12)
			for k := range row {
				scaled[k] = 8 * row[k]
			}
			if q := c.Probabilities(scaled, scaled); !slices.Equal(q, p) {
				t.Fatal("probabilities depend on the scale of scores, or the answer may not overwrite them")
			}
		}
	}
}

// Rows drawn from the model itself: the calibration finds it, and its own figures agree with those of fresh rows.
func TestCalibrationFindsTheTruth(t *testing.T) {
	r := rand.New(rand.NewPCG(12, 0))
	s, g := world(r, 2000, 4, 6)
	c, err := FitCalibration(evidence(s, g, 4))
	if err != nil {
		t.Fatal(err)
	}
	// 2,000 rows settle beta to about 3 %.
	near(t, "1/temperature", 1/c.Temperature(), 6, .5)
	fresh, right := world(r, 4000, 4, 6)
	var prob [][]float64
	for _, row := range fresh {
		prob = append(prob, c.Probabilities(make([]float64, 4), row))
	}
	m := MeasureClasses(prob, right)
	if m.ECE > 2*m.ECEFloor || m.ECEFloor > .02 {
		t.Errorf("calibration error %.4f where chance makes %.4f", m.ECE, m.ECEFloor)
	}
	near(t, "log loss by leave-one-out", c.Figures().LogLoss, m.LogLoss, .03)
	near(t, "Brier score by leave-one-out", c.Figures().Brier, m.Brier, .02)
	// Planted: overconfident probabilities are seen.
	for _, p := range prob {
		for k := range p {
			p[k] = p[k] * p[k] * p[k]
		}
		var sum float64
		for _, v := range p {
			sum += v
		}
		for k := range p {
			p[k] /= sum
		}
	}
	if m := MeasureClasses(prob, right); m.ECE < 5*m.ECEFloor {
		t.Errorf("overconfident probabilities pass with calibration error %.4f, chance %.4f", m.ECE, m.ECEFloor)
	}
}

// Where every label is answered rightly the best temperature is 0; the average stays short of certainty.
func TestNoCertaintyFromFewLabels(t *testing.T) {
	s, g := [][]float64{}, []int{}
	for i := range 12 {
		row := []float64{.1, .1, .1}
		row[i%3] = .8
		s, g = append(s, row), append(g, i%3)
	}
	c, err := FitCalibration(evidence(s, g, 3))
	if err != nil {
		t.Fatal(err)
	}
	p := c.Probabilities(make([]float64, 3), s[0])
	if p[0] < .9 || p[0] > .9999 {
		t.Errorf("twelve labels give a probability of %v", p[0])
	}
}

// The figures take each label's own part out of the weights: the same as weighing the temperatures without it.
func TestFiguresAreLeftOut(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 0))
	s, g := world(r, 25, 3, 4)
	c, err := FitCalibration(evidence(s, g, 3))
	if err != nil {
		t.Fatal(err)
	}
	var q [][]float64
	for _, row := range s {
		q = append(q, feature(make([]float64, 3), row))
	}
	grid, prior, like := weigh(q, g)
	var loss float64
	for i := range s {
		post := slices.Clone(prior)
		for j := range s {
			if j != i {
				for k := range post {
					post[k] += like[j][k]
				}
			}
		}
		var p float64
		for k, w := range normalise(post) {
			p += w * math.Exp(logSoftmax(q[i], grid[k], g[i]))
		}
		loss -= math.Log(p) / float64(len(s))
	}
	near(t, "log loss", c.Figures().LogLoss, loss, 1e-9) // points of no weight are passed over
}

// The few nodes that score rows stand for the whole grid of temperatures.
func TestNodesStandForTheGrid(t *testing.T) {
	r := rand.New(rand.NewPCG(14, 0))
	s, g := world(r, 30, 5, 8)
	c, err := FitCalibration(evidence(s, g, 5))
	if err != nil {
		t.Fatal(err)
	}
	var q [][]float64
	for _, row := range s {
		q = append(q, feature(make([]float64, 5), row))
	}
	grid, post, like := weigh(q, g)
	for _, l := range like {
		for k := range post {
			post[k] += l[k]
		}
	}
	w := normalise(post)
	for i, row := range s {
		p := c.Probabilities(make([]float64, 5), row)
		for class, v := range p {
			var want float64
			for k, b := range grid {
				want += w[k] * math.Exp(logSoftmax(q[i], b, class))
			}
			near(t, "probability", v, want, 3e-3)
		}
	}
}

func TestNoEvidence(t *testing.T) {
	nan := math.NaN()
	if _, err := FitCalibration(ClassEvidence{Classes: 2, LeftOut: [][]float64{{nan, nan}}, Given: []int{0}}); err != ErrNoEvidence {
		t.Errorf("error %v", err)
	}
	for _, e := range []ClassEvidence{
		{Classes: 1}, {Classes: 2, Given: []int{0}}, {Classes: 2, LeftOut: [][]float64{{1, 0}}, Given: []int{2}}, {Classes: 2, LeftOut: [][]float64{{1}}, Given: []int{0}},
	} {
		if _, err := FitCalibration(e); err == nil {
			t.Errorf("%+v accepted", e)
		}
	}
	c, err := FitCalibration(ClassEvidence{Classes: 2, LeftOut: [][]float64{{nan, 1}, {0, 0}, {.7, .3}}, Given: []int{0, 1, 0}})
	if err != nil {
		t.Fatal(err)
	}
	if p := c.Probabilities(make([]float64, 2), []float64{nan, 1}); !math.IsNaN(p[0]) || !math.IsNaN(p[1]) {
		t.Errorf("no answer became %v", p)
	}
	if p := c.Probabilities(make([]float64, 2), []float64{0, 0}); math.Abs(p[0]-.5) > 1e-15 || p[0] != p[1] {
		t.Errorf("a row without a score became %v", p)
	}
}

func TestNestedChoosesWithoutTheLabel(t *testing.T) {
	a := [][]float64{{1, 0}, {1, 0}, {1, 0}}
	b := [][]float64{{0, 1}, {0, 1}, {0, 1}}
	nan := math.NaN()
	// Candidate 0 is better in sum (1.5 against 1.8), but not without label 2, where only candidate 1 fails.
	got, pick := Nested([][][]float64{a, b}, [][]float64{{.7, .7, .1}, {.4, .4, 1}})
	if !slices.Equal(pick, []int{0, 0, 1}) || got[2][1] != 1 || got[0][0] != 1 {
		t.Errorf("picked %v", pick)
	}
	if _, pick := Nested([][][]float64{a, b}, [][]float64{{nan, .1, .1}, {.4, .4, .4}}); !slices.Equal(pick, []int{0, 1, 1}) {
		t.Errorf("a loss that is not a number: picked %v", pick)
	}
}
