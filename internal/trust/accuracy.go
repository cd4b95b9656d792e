package trust

import (
	"errors"
	"fmt"
	"math"
)

// Sample is a set of rows whose truth was checked.
type Sample struct {
	Classes   int
	Predicted []int // class that the completed table gives each checked row
	Truth     []int // class found by checking
	Stratum   []int // stratum of each checked row, in [0, len(StratumSize)); nil means one stratum
	// StratumSize is the number of rows of the whole table in each stratum, checked or not. nil means that the sample
	// is the whole population or a simple random sample of it.
	StratumSize []float64
}

// Estimate is a value with its standard error, NaN where it cannot be had.
type Estimate struct{ Value, SE float64 }

// Accuracy is what a checked sample says of a completed table.
type Accuracy struct {
	Count    int
	Counts   [][]int     // Counts[i][j]: checked rows predicted i, truly j
	Share    [][]float64 // the same as estimated shares of the whole table, sum 1
	Overall  Estimate    // share of rows that are right
	User     []Estimate  // by class: share of the rows given the class that truly have it
	Producer []Estimate  // by class: share of the rows that truly have the class that were given it
	Area     []Estimate  // by class: share of rows that truly have it
	Kappa    float64     // Cohen's kappa of Share
	Thin     []int       // strata with rows in the table but fewer than two checked: their part of the errors is missing
}

// EstimateAccuracy estimates the accuracy of the whole table from a stratified sample: each share is a weighted mean
// of stratum means, user's and producer's accuracy are ratios of such, with the variance of the combined ratio
// estimator (Stehman 2014, equations 25 to 28; Cochran 1977, section 6.11), without finite population correction.
// Where the strata are the predicted classes these are the estimators of Olofsson et al. (2014), equations 1 to 11.
func EstimateAccuracy(s Sample) (*Accuracy, error) {
	h, err := s.strata()
	if err != nil {
		return nil, err
	}
	a := &Accuracy{Count: len(s.Truth), Counts: make([][]int, s.Classes), Share: make([][]float64, s.Classes)}
	for i := range s.Classes {
		a.Counts[i], a.Share[i] = make([]int, s.Classes), make([]float64, s.Classes)
	}
	for k, t := range s.Truth {
		i := s.Predicted[k]
		a.Counts[i][t]++
		a.Share[i][t] += h.weight[h.of[k]] / float64(h.count[h.of[k]])
	}
	for st, n := range h.count {
		if n < 2 && h.weight[st] > 0 {
			a.Thin = append(a.Thin, st)
		}
	}
	one := func(int) float64 { return 1 }
	hit := func(k int) float64 { return indicator(s.Predicted[k] == s.Truth[k]) }
	a.Overall = h.ratio(hit, one)
	for c := range s.Classes {
		both := func(k int) float64 { return indicator(s.Predicted[k] == c && s.Truth[k] == c) }
		given := func(k int) float64 { return indicator(s.Predicted[k] == c) }
		truly := func(k int) float64 { return indicator(s.Truth[k] == c) }
		a.User = append(a.User, h.ratio(both, given))
		a.Producer = append(a.Producer, h.ratio(both, truly))
		a.Area = append(a.Area, h.ratio(truly, one))
	}
	a.Kappa = kappa(a.Share)
	return a, nil
}

func indicator(b bool) float64 {
	if b {
		return 1
	}
	return 0
}

// strata are a sample's strata: of[k] the stratum of checked row k, count the rows checked, weight the share of the
// table; strata without a checked row share out their weight over the others.
type strata struct {
	of     []int
	count  []int
	weight []float64
}

func (s Sample) strata() (*strata, error) {
	n := len(s.Truth)
	if n == 0 {
		return nil, errors.New("no checked row")
	}
	if len(s.Predicted) != n || s.Stratum != nil && len(s.Stratum) != n {
		return nil, fmt.Errorf("%d predictions and %d strata for %d checked rows", len(s.Predicted), len(s.Stratum), n)
	}
	for k, t := range s.Truth {
		if t < 0 || t >= s.Classes || s.Predicted[k] < 0 || s.Predicted[k] >= s.Classes {
			return nil, fmt.Errorf("checked row %d: predicted %d, truth %d, of %d classes", k, s.Predicted[k], t, s.Classes)
		}
	}
	h := &strata{of: s.Stratum, weight: append([]float64(nil), s.StratumSize...)}
	if s.Stratum == nil {
		h.of, h.weight = make([]int, n), []float64{1}
	}
	if s.Stratum != nil && s.StratumSize == nil {
		return nil, errors.New("strata without sizes")
	}
	h.count = make([]int, len(h.weight))
	for k, st := range h.of {
		if st < 0 || st >= len(h.weight) {
			return nil, fmt.Errorf("checked row %d: stratum %d of %d", k, st, len(h.weight))
		}
		h.count[st]++
	}
	var total float64
	for st, w := range h.weight {
		if !(w >= 0) || math.IsInf(w, 1) {
			return nil, fmt.Errorf("stratum %d has size %v", st, w)
		}
		if h.count[st] > 0 {
			total += w
		}
	}
	if !(total > 0) {
		return nil, errors.New("no checked row lies in a stratum of positive size")
	}
	for st := range h.weight {
		h.weight[st] /= total
	}
	return h, nil
}

// ratio estimates R = mean y / mean x over the table and its standard error:
// V(R) = (1/X^2) sum_h W_h^2 (s_y^2 + R^2 s_x^2 - 2 R s_xy) / n_h.
func (h *strata) ratio(y, x func(k int) float64) Estimate {
	m := len(h.weight)
	sy, sx := make([]float64, m), make([]float64, m)
	for k, st := range h.of {
		sy[st] += y(k)
		sx[st] += x(k)
	}
	var totalY, totalX float64
	for st, n := range h.count {
		if n > 0 {
			sy[st] /= float64(n)
			sx[st] /= float64(n)
			totalY += float64(h.weight[st] * sy[st])
			totalX += float64(h.weight[st] * sx[st])
		}
	}
	if totalX == 0 {
		return Estimate{math.NaN(), math.NaN()}
	}
	r := totalY / totalX
	// The residual y - R x has the variance of the bracket.
	square := make([]float64, m)
	for k, st := range h.of {
		d := y(k) - sy[st] - r*(x(k)-sx[st])
		square[st] += d * d
	}
	var v float64
	measured := false
	for st, n := range h.count {
		if n >= 2 {
			v += h.weight[st] * h.weight[st] * square[st] / float64(n-1) / float64(n)
			measured = true
		}
	}
	if !measured {
		return Estimate{r, math.NaN()}
	}
	return Estimate{r, math.Sqrt(v) / totalX}
}

// kappa is (p_o - p_e) / (1 - p_e) of a table of shares (Cohen 1960); NaN where agreement by chance is certain.
func kappa(share [][]float64) float64 {
	var agree, chance float64
	for i := range share {
		var row, col float64
		for j := range share {
			row += share[i][j]
			col += share[j][i]
		}
		agree += share[i][i]
		chance += float64(row * col)
	}
	if chance >= 1 {
		return math.NaN()
	}
	return (agree - chance) / (1 - chance)
}
