package trust

import (
	"fmt"
	"math"
	"slices"
)

// SetSettings steer NewSets.
type SetSettings struct {
	Coverage float64 // share of rows whose set is to hold the right class, in (0, 1)
	Drawn    Drawn
	// Shares are the classes' shares among all rows, one a class, for labels drawn per class; nil if not known. Known
	// shares give sets for all rows together, where otherwise each class needs labels enough of its own.
	Shares []float64
	// KeepFirst puts the most likely class into every set, also where Coverage can be had without it. Coverage is
	// then at least what was asked for and may be well above it.
	KeepFirst bool
}

// Sets are conformal sets of classes: the score of class c at a row is 1 - p_c, and c is in the row's set if no more
// than a share Coverage of the labels, asked of the others, scored better. A row of which even the most likely class
// scores worse has the empty set: at this coverage it is one of the rows that are given up.
//
//   - Drawn at random: one threshold, the ceil(Coverage (l+1))-th smallest left-out score. Vovk, Gammerman and Shafer
//     (2005); score of Sadinle, Lei and Wasserman (2019). The left-out score stands in for that of a row apart from
//     its label, as in the jackknife; the row's own score uses all labels.
//   - Drawn per class, shares unknown: one threshold a class from its own labels (class-conditional).
//   - Drawn per class, shares known: labels weighed by share over drawn share (Podkopaev and Ramdas 2021, section 3).
//   - Chosen: as drawn at random, without a promise.
//
// Where there are too few labels for the coverage (1/(l+1) > 1 - Coverage) the threshold is infinite: the class is in
// every set.
type Sets struct {
	threshold []float64 // one a class
	keepFirst bool
	info      Promise
}

// Promise says what sets or intervals promise, and on what it rests.
type Promise struct {
	Coverage  float64
	Drawn     Drawn
	Labels    int     // labels with a left-out answer
	Floor     float64 // smallest share of misses that can be promised: 1/(l+1), l the labels of the least labelled class where each stands alone
	Unbounded int     // classes that are in every set; 1 for intervals that are infinite
	Void      bool    // labels chosen otherwise than at random: no promise
}

// Sentence says it in words.
func (p Promise) Sentence() string {
	switch {
	case p.Void:
		return "the labelled rows were not drawn at random, so no coverage is promised"
	case p.Unbounded > 0:
		return fmt.Sprintf("%d labels are too few to promise %g: at best %.3f", p.Labels, p.Coverage, 1-p.Floor)
	case p.Drawn == PerClass:
		return fmt.Sprintf("coverage %g, if the labelled rows of each class were drawn at random from it", p.Coverage)
	}
	return fmt.Sprintf("coverage %g, if the labelled rows were drawn at random", p.Coverage)
}

// NewSets makes the rule from the calibration's own left-out answers.
func NewSets(c *Calibration, s SetSettings) (*Sets, error) {
	if err := checkCoverage(s.Coverage); err != nil {
		return nil, err
	}
	if s.Shares != nil && len(s.Shares) != c.classes {
		return nil, fmt.Errorf("%d shares for %d classes", len(s.Shares), c.classes)
	}
	score, given := c.leftOutScores()
	out := &Sets{threshold: make([]float64, c.classes), keepFirst: s.KeepFirst}
	out.info = Promise{Coverage: s.Coverage, Drawn: s.Drawn, Labels: len(score), Floor: 1 / float64(len(score)+1), Void: s.Drawn == Chosen}
	switch {
	case s.Drawn == PerClass && s.Shares == nil:
		out.info.Floor = 0
		for class := range out.threshold {
			var own []float64
			for i, g := range given {
				if g == class {
					own = append(own, score[i])
				}
			}
			out.threshold[class] = quantile(own, s.Coverage)
			out.info.Floor = max(out.info.Floor, 1/float64(len(own)+1))
		}
	case s.Drawn == PerClass:
		out.weighted(score, given, s)
	default:
		t := quantile(score, s.Coverage)
		for class := range out.threshold {
			out.threshold[class] = t
		}
	}
	for _, t := range out.threshold {
		if math.IsInf(t, 1) {
			out.info.Unbounded++
		}
	}
	return out, nil
}

// leftOutScores gives 1 - p of the given class at each label that has a left-out answer.
func (c *Calibration) leftOutScores() (score []float64, given []int) {
	p := make([]float64, c.classes)
	for i, s := range c.evid.LeftOut {
		if known(s) {
			score = append(score, 1-c.Probabilities(p, s)[c.evid.Given[i]])
			given = append(given, c.evid.Given[i])
		}
	}
	return score, given
}

// quantile is the order statistic of the conformal rank, or infinity.
func quantile(score []float64, coverage float64) float64 {
	r := rank(len(score), coverage)
	if r > len(score) {
		return math.Inf(1)
	}
	s := slices.Clone(score)
	slices.Sort(s)
	return s[r-1]
}

// weighted sets thresholds from labels weighed by how much rarer or commoner their class is among the rows than among
// the labels. A candidate class carries its own weight at infinity.
func (s *Sets) weighted(score []float64, given []int, set SetSettings) {
	count := make([]float64, len(s.threshold))
	for _, g := range given {
		count[g]++
	}
	order := make([]int, len(score))
	var total float64
	weight := func(class int) float64 {
		if count[class] == 0 {
			return math.Inf(1)
		}
		return set.Shares[class] / count[class]
	}
	for i := range order {
		order[i] = i
		total += weight(given[i])
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case score[a] < score[b]:
			return -1
		case score[a] > score[b]:
			return 1
		}
		return 0
	})
	for class := range s.threshold {
		s.threshold[class] = math.Inf(1)
		own := weight(class)
		if math.IsInf(own, 1) {
			continue
		}
		need := set.Coverage * (total + own) * (1 - 1e-12)
		var sum float64
		for _, i := range order {
			if sum += weight(given[i]); sum >= need {
				s.threshold[class] = score[i]
				break
			}
		}
	}
}

// Of appends the classes of a row's set to dst, most likely first (the lower class first among equals), given its
// probabilities. A row without an answer (NaN) has every class: nothing is known of it.
func (s *Sets) Of(dst []int32, prob []float64) []int32 {
	start := len(dst)
	best := 0
	for c, p := range prob {
		if p > prob[best] {
			best = c
		}
		if !(1-p > s.threshold[c]) {
			dst = append(dst, int32(c))
		}
	}
	if s.keepFirst && !slices.Contains(dst[start:], int32(best)) {
		dst = append(dst, int32(best))
	}
	slices.SortStableFunc(dst[start:], func(a, b int32) int {
		switch pa, pb := prob[a], prob[b]; {
		case pa > pb:
			return -1
		case pa < pb:
			return 1
		}
		return int(a) - int(b)
	})
	return dst
}

// Promise says what the sets promise.
func (s *Sets) Promise() Promise { return s.info }
