package trust

import (
	"fmt"
	"math"
	"slices"
)

// NumberEvidence is what the labels say of each other.
type NumberEvidence struct {
	Given   []float64 // value of each label
	LeftOut []float64 // answer at each label without it; NaN is no answer
	Spread  []float64 // left-out spread at each label, >= 0, from Spread; nil means the same everywhere
}

// IntervalSettings steer NewIntervals.
type IntervalSettings struct {
	Coverage float64 // share of rows whose interval is to hold the right value, in (0, 1)
	Drawn    Drawn
}

// Intervals are conformal intervals for numbers. With r_i the left-out residual |y_i - f^(-i)_i| of label i, divided by
// the scale sigma_i = sqrt(V_i^2 + mean V^2 / 2) of the spread V there:
//
//   - At: f(x) -+ sigma(x) times the ceil(Coverage (l+1))-th smallest r_i (jackknife);
//   - Plus: from the floor((1-Coverage)(l+1))-th smallest of f^(-i)(x) - r_i sigma(x) to the ceil(Coverage (l+1))-th
//     smallest of f^(-i)(x) + r_i sigma(x), the jackknife+ of Barber, Candes, Ramdas and Tibshirani (2021), equation
//     1.5, with the residuals normalised. Its coverage is at least 1 - 2 (1 - Coverage) whatever the data, and near
//     Coverage in practice.
//
// The interval is infinite where there are too few labels for the coverage.
type Intervals struct {
	residual []float64 // normalised, by label with an answer
	place    []int     // of each residual among the labels
	labels   int
	base     float64 // square added to every spread's
	flat     bool    // no spread: sigma = 1
	width    float64 // multiplier of sigma in At
	coverage float64
	info     Promise
	figures  NumberFigures
}

// NewIntervals makes the rule. ErrNoEvidence if no label has a left-out answer.
func NewIntervals(e NumberEvidence, s IntervalSettings) (*Intervals, error) {
	if err := checkCoverage(s.Coverage); err != nil {
		return nil, err
	}
	l := len(e.Given)
	if len(e.LeftOut) != l || e.Spread != nil && len(e.Spread) != l {
		return nil, fmt.Errorf("%d left-out answers and %d spreads for %d labels", len(e.LeftOut), len(e.Spread), l)
	}
	v := &Intervals{coverage: s.Coverage, labels: l, flat: e.Spread == nil}
	var pred, given []float64
	for i, f := range e.LeftOut {
		if math.IsNaN(f) {
			continue
		}
		v.place = append(v.place, i)
		pred, given = append(pred, f), append(given, e.Given[i])
		if !v.flat {
			v.base += float64(e.Spread[i] * e.Spread[i])
		}
	}
	if len(v.place) == 0 {
		return nil, ErrNoEvidence
	}
	v.base /= 2 * float64(len(v.place))
	if !(v.base > 0) || math.IsInf(v.base, 1) {
		v.flat = true
	}
	for k, i := range v.place {
		scale := 1.0
		if !v.flat {
			scale = v.scale(e.Spread[i])
		}
		v.residual = append(v.residual, math.Abs(given[k]-pred[k])/scale)
	}
	v.width = quantile(v.residual, s.Coverage)
	v.info = Promise{Coverage: s.Coverage, Drawn: s.Drawn, Labels: len(v.place), Floor: 1 / float64(len(v.place)+1), Void: s.Drawn == Chosen}
	if math.IsInf(v.width, 1) {
		v.info.Unbounded = 1
	}
	v.figures = MeasureNumbers(pred, given)
	return v, nil
}

func (v *Intervals) scale(spread float64) float64 {
	if v.flat {
		return 1
	}
	return math.Sqrt(float64(spread*spread) + v.base)
}

// At gives the interval of a row from its answer f and its spread. NaN where f is NaN.
func (v *Intervals) At(f, spread float64) (low, high float64) {
	half := v.width * v.scale(spread)
	return f - half, f + half
}

// Plus gives the interval of a row from its left-out answers, leftOut[i] without label i (all labels, in order), and
// its spread. work is scratch of at least as many values; it may be nil.
func (v *Intervals) Plus(leftOut []float64, spread float64, work []float64) (low, high float64) {
	up := rank(len(v.residual), v.coverage)
	if up > len(v.residual) {
		return math.Inf(-1), math.Inf(1)
	}
	sigma := v.scale(spread)
	work = work[:0]
	for k, i := range v.place {
		work = append(work, leftOut[i]+float64(v.residual[k]*sigma))
	}
	slices.Sort(work)
	high = work[up-1]
	// floor((1-Coverage)(l+1)) = l + 1 - ceil(Coverage (l+1)).
	for k, i := range v.place {
		work[k] = leftOut[i] - float64(v.residual[k]*sigma)
	}
	slices.Sort(work)
	return work[len(work)-up], high
}

// Labels is the number of labels that Plus expects left-out answers of.
func (v *Intervals) Labels() int { return v.labels }

// Promise says what the intervals promise.
func (v *Intervals) Promise() Promise { return v.info }

// Figures are the left-out errors.
func (v *Intervals) Figures() NumberFigures { return v.figures }
