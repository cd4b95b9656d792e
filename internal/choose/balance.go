package choose

import (
	"fmt"
	"math"
)

// Mode says how class scores are made comparable before the largest is taken.
type Mode int

// Ways to balance classes.
const (
	AutoBalance Mode = iota // what the study found best; see Weigh
	NoBalance               // scores as they are
	Uniform                 // class-mass normalisation to equal shares
	FromLabels              // class-mass normalisation to the labels' own shares
	Given                   // class-mass normalisation to shares given
)

var modeNames = [...]string{"auto", "none", "uniform", "labels", "given"}

func (m Mode) String() string {
	if m < 0 || int(m) >= len(modeNames) {
		return fmt.Sprintf("Mode(%d)", int(m))
	}
	return modeNames[m]
}

// Balance is a mode with the shares of Given, one a class; only their ratios matter.
type Balance struct {
	Mode   Mode
	Shares []float64
}

// Validate checks the shares against the number of classes.
func (b Balance) Validate(classes int) error {
	if b.Mode < AutoBalance || b.Mode > Given {
		return fmt.Errorf("unknown balance %d", int(b.Mode))
	}
	if b.Mode != Given {
		return nil
	}
	if len(b.Shares) != classes {
		return fmt.Errorf("%d shares for %d classes", len(b.Shares), classes)
	}
	for c, s := range b.Shares {
		if !(s > 0) || math.IsInf(s, 0) {
			return fmt.Errorf("share %v of class %d is not positive and finite", s, c)
		}
	}
	return nil
}

// shares gives the class shares that the mode aims at, summing to one. The labels' shares carry one more label a class
// spread over all (Laplace's rule of succession), so that no class is aimed at zero.
func (b Balance) shares(perClass []int) []float64 {
	s := make([]float64, len(perClass))
	for c, n := range perClass {
		switch b.Mode {
		case FromLabels:
			s[c] = float64(n) + 1
		case Given:
			s[c] = b.Shares[c]
		default:
			s[c] = 1
		}
	}
	normalise(s)
	return s
}

func normalise(s []float64) {
	var t float64
	for _, v := range s {
		t += v
	}
	for c := range s {
		s[c] /= t
	}
}

// Weights are multipliers of class scores: a vertex takes the class with the largest Weights[c] * score. They hold for
// new rows too. They are positive, and scaled so that their logarithms sum to zero.
type Weights []float64

// Decide gives the class of a vertex from its scores, the first of equals. A score below zero counts as zero. -1 if any
// score is NaN.
func (w Weights) Decide(score func(c int) float64) int {
	best, at := math.Inf(-1), -1
	for c, m := range w {
		s := score(c)
		if math.IsNaN(s) {
			return -1
		}
		if t := m * max(s, 0); t > best {
			best, at = t, c
		}
	}
	return at
}

// Shares gives the balanced scores of a vertex as shares that sum to one; equal shares where all scores are zero.
func (w Weights) Shares(dst []float64, score func(c int) float64) []float64 {
	dst = dst[:0]
	var t float64
	for c, m := range w {
		v := float64(m * max(score(c), 0))
		dst = append(dst, v)
		t += v
	}
	for c := range dst {
		if t > 0 {
			dst[c] /= t
		} else {
			dst[c] = 1 / float64(len(w))
		}
	}
	return dst
}

// massWeights is class-mass normalisation (Zhu, Ghahramani and Lafferty 2003, section 4): weights share_c / mass_c.
// A class without mass keeps the weight of the least massive one that has some.
func massWeights(mass, share []float64) Weights {
	least := math.Inf(1)
	for _, m := range mass {
		if m > 0 {
			least = min(least, m)
		}
	}
	if math.IsInf(least, 1) {
		least = 1
	}
	logs := make([]float64, len(mass))
	for c, m := range mass {
		if !(m > 0) {
			m = least
		}
		logs[c] = math.Log(share[c]) - math.Log(m)
	}
	return fromLogs(logs)
}

// fromLogs gives weights from their logarithms, centred.
func fromLogs(logs []float64) Weights {
	var mean float64
	for _, a := range logs {
		mean += a
	}
	mean /= float64(len(logs))
	w := make(Weights, len(logs))
	for c, a := range logs {
		w[c] = math.Exp(min(max(a-mean, -700), 700))
	}
	return w
}

// Logs gives the logarithms of the weights.
func (w Weights) logs() []float64 {
	a := make([]float64, len(w))
	for c := range w {
		a[c] = math.Log(w[c])
	}
	return a
}

// equalWeights leaves scores as they are.
func equalWeights(classes int) Weights {
	w := make(Weights, classes)
	for c := range w {
		w[c] = 1
	}
	return w
}

// masses sums each class's scores over the vertices that no label holds, NaN left out.
func masses(scores [][]float64, l Labels) []float64 {
	held := make([]bool, len(scores[0]))
	for _, v := range l.Vertex {
		held[v] = true
	}
	m := make([]float64, len(scores))
	for c, s := range scores {
		for v, t := range s {
			if !held[v] && !math.IsNaN(t) {
				m[c] += max(t, 0)
			}
		}
	}
	return m
}

// Mass weighs by class-mass normalisation alone: what each mode but AutoBalance means. scores is class by vertex.
func (b Balance) Mass(scores [][]float64, l Labels) (Weights, error) {
	if err := b.Validate(len(scores)); err != nil {
		return nil, err
	}
	if len(scores) == 0 || len(scores) != len(l.Target) {
		return nil, fmt.Errorf("%d classes of scores, %d of labels", len(scores), len(l.Target))
	}
	if b.Mode == NoBalance || len(scores) == 1 {
		return equalWeights(len(scores)), nil
	}
	return massWeights(masses(scores, l), b.shares(l.PerClass())), nil
}
