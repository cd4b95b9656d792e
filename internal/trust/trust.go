// Package trust says how far an answer can be trusted. It knows scores, labels and left-out answers as plain slices,
// and nothing of graphs or files.
//
// For classes: FitCalibration turns scores into probabilities that mean what they say, NewSets into sets of classes
// that hold the truth at a given rate. For numbers: Spread measures how far the labels around a row disagree,
// NewIntervals turns that into intervals that hold the truth at a given rate. Abstain and Novelty pick the rows to
// leave empty. Against rows whose truth is known, EstimateAccuracy and NumberAccuracy say how right the answers are.
//
// Everything rests on the left-out answers: what the other labels say of a labelled row when its own label is hidden.
// A left-out row stands to the remaining labels as an unlabelled row stands to all of them, as long as the labelled
// rows were drawn at random. Drawn says whether they were.
package trust

import (
	"errors"
	"fmt"
	"math"
)

// Drawn says how the labelled rows were picked; the promise of sets and intervals rests on it.
type Drawn int

const (
	Random   Drawn = iota // each row as likely as any other
	PerClass              // at random within each class, so many a class
	Chosen                // in any other way: by hand, by ease, by what a program proposed
)

var drawnNames = [...]string{"random", "per-class", "chosen"}

func (d Drawn) String() string {
	if d < 0 || int(d) >= len(drawnNames) {
		return fmt.Sprintf("Drawn(%d)", int(d))
	}
	return drawnNames[d]
}

// ErrNoEvidence means that no label has a left-out answer: nothing can be said of trust.
var ErrNoEvidence = errors.New("no label has a left-out answer")

// ClassEvidence is what the labels say of each other.
type ClassEvidence struct {
	Classes int         // number of classes C >= 2
	LeftOut [][]float64 // l by C: score >= 0 of each class at each label without that label, any common scale; a row with NaN is no answer
	Given   []int       // class of each label, in [0, C)
}

func (e ClassEvidence) validate() error {
	if e.Classes < 2 {
		return fmt.Errorf("%d classes", e.Classes)
	}
	if len(e.LeftOut) != len(e.Given) {
		return fmt.Errorf("%d left-out answers for %d labels", len(e.LeftOut), len(e.Given))
	}
	for i, g := range e.Given {
		if g < 0 || g >= e.Classes {
			return fmt.Errorf("label %d: class %d of %d", i, g, e.Classes)
		}
		if len(e.LeftOut[i]) != e.Classes {
			return fmt.Errorf("label %d: %d scores for %d classes", i, len(e.LeftOut[i]), e.Classes)
		}
	}
	return nil
}

// known says whether a row of scores is an answer.
func known(scores []float64) bool {
	for _, s := range scores {
		if math.IsNaN(s) {
			return false
		}
	}
	return true
}

// rank gives the position, counted from 1, of the order statistic of l left-out scores below which a new one falls
// with probability at least coverage: ceil(coverage (l+1)). The answer exceeds l where l is too small for coverage.
func rank(l int, coverage float64) int {
	r := coverage * float64(l+1)
	// 0.9 * 50 must be 45 and not 45.00000000000001.
	if near := math.Round(r); math.Abs(r-near) < 1e-9*near {
		return int(near)
	}
	return int(math.Ceil(r))
}

func checkCoverage(coverage float64) error {
	if !(coverage > 0 && coverage < 1) {
		return fmt.Errorf("coverage %v is not between 0 and 1", coverage)
	}
	return nil
}
