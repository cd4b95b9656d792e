package trust

import (
	"fmt"
	"math"
	"slices"
)

// Abstain marks the rows to leave empty: those whose sureness is below threshold and, beyond them, the least sure, at
// most a share rate of the rows that have a sureness (NaN has none and is never marked). Rows of equal sureness are
// treated alike, so that the order of rows does not matter; where the cut falls within equals they are all kept.
// sureness is the confidence for classes; for numbers any decreasing function of the interval's width will do.
// threshold <= -Inf and rate = 0 mark nothing.
func Abstain(sureness []float64, threshold, rate float64) ([]bool, error) {
	if math.IsNaN(threshold) || !(rate >= 0 && rate <= 1) {
		return nil, fmt.Errorf("threshold %v, rate %v", threshold, rate)
	}
	marked := make([]bool, len(sureness))
	var sorted []float64
	for _, s := range sureness {
		if !math.IsNaN(s) {
			sorted = append(sorted, s)
		}
	}
	cut := threshold
	if budget := int(math.Floor(float64(rate*float64(len(sorted))) + 1e-9)); budget > 0 {
		slices.Sort(sorted)
		if budget == len(sorted) {
			cut = math.Inf(1)
		} else {
			cut = max(cut, sorted[budget])
		}
	}
	for i, s := range sureness {
		marked[i] = s < cut
	}
	return marked, nil
}

// Novelty judges how far a row is from everything that was labelled, against how far labelled rows are from each other.
type Novelty struct {
	reference []float64 // increasing
}

// NewNovelty takes, for each labelled row, its distance to the nearest other labelled row, in the units of later
// distances. Distances that are not numbers are passed over.
func NewNovelty(distance []float64) *Novelty {
	n := &Novelty{}
	for _, d := range distance {
		if !math.IsNaN(d) {
			n.reference = append(n.reference, d)
		}
	}
	slices.Sort(n.reference)
	return n
}

// Share is the conformal p-value of a row at a distance from its nearest labelled row: the share of labelled rows at
// least as far from theirs, counting the row itself, (1 + #{d_i >= d}) / (l + 1). Small means unlike anything
// labelled. Under random drawing a share of at most a has probability at most a.
func (n *Novelty) Share(distance float64) float64 {
	if math.IsNaN(distance) {
		return math.NaN()
	}
	at, _ := slices.BinarySearch(n.reference, distance)
	return float64(1+len(n.reference)-at) / float64(len(n.reference)+1)
}
