package job

import (
	"encoding/json"
	"fmt"
	"math"

	"pinfill/internal/choose"
	"pinfill/internal/fault"
	"pinfill/internal/trust"
)

// kept is what a run keeps to judge rows: in memory for its own rows, in the model file for new ones.
type kept struct {
	Weights  choose.Weights        // classes
	Evidence *trust.ClassEvidence  // classes; nil when labels are too few
	Numbers  *trust.NumberEvidence // numbers; nil when labels are too few
	Coverage float64
	Drawn    trust.Drawn

	far         float64 // distance to the nearest vertex that 99% of the vertices keep, in units of the points
	calibration *trust.Calibration
	sets        *trust.Sets
	intervals   *trust.Intervals
	spread      []float64 // by vertex; numbers only
}

// ready fits what the evidence allows.
func (k *kept) ready() error {
	var err error
	if k.Numbers != nil {
		k.intervals, err = trust.NewIntervals(*k.Numbers, trust.IntervalSettings{Coverage: k.Coverage, Drawn: k.Drawn})
		return err
	}
	if k.Evidence == nil {
		return trust.ErrNoEvidence
	}
	if k.Evidence.Classes != len(k.Weights) {
		return fmt.Errorf("%d class weights for %d classes", len(k.Weights), k.Evidence.Classes)
	}
	if k.calibration, err = trust.FitCalibration(*k.Evidence); err != nil {
		return err
	}
	k.sets, err = trust.NewSets(k.calibration, trust.SetSettings{Coverage: k.Coverage, Drawn: k.Drawn})
	return err
}

// class gives the confidence and the set of one row from its class scores; prob is scratch, one a class.
func (k *kept) class(prob []float64, score func(int) float64) (confidence float64, set []int32) {
	weighted(prob, k.Weights, score)
	k.calibration.Probabilities(prob, prob)
	if math.IsNaN(prob[0]) {
		return math.NaN(), nil
	}
	for _, p := range prob {
		confidence = max(confidence, p)
	}
	return confidence, k.sets.Of(nil, prob)
}

// keptJSON is kept as a model file holds it: numbers that JSON has no word for (a label without a left-out answer)
// stand as null.
type keptJSON struct {
	Weights  []Number    `json:"weights,omitempty"`
	LeftOut  [][]Number  `json:"left_out,omitempty"`
	Given    []int       `json:"given,omitempty"`
	Values   []Number    `json:"values,omitempty"`
	Answers  []Number    `json:"answers,omitempty"`
	Spread   []Number    `json:"spread,omitempty"`
	Coverage float64     `json:"coverage"`
	Drawn    trust.Drawn `json:"drawn"`
	Far      Number      `json:"far"`
}

// MarshalJSON writes what is kept.
func (k *kept) MarshalJSON() ([]byte, error) {
	plain := keptJSON{Weights: numbers(k.Weights), Coverage: k.Coverage, Drawn: k.Drawn, Far: Number(k.far)}
	if e := k.Evidence; e != nil {
		plain.Given = e.Given
		for _, s := range e.LeftOut {
			plain.LeftOut = append(plain.LeftOut, numbers(s))
		}
	}
	if e := k.Numbers; e != nil {
		plain.Values, plain.Answers, plain.Spread = numbers(e.Given), numbers(e.LeftOut), numbers(e.Spread)
	}
	return json.Marshal(plain)
}

// UnmarshalJSON reads what MarshalJSON writes.
func (k *kept) UnmarshalJSON(b []byte) error {
	var plain keptJSON
	if err := json.Unmarshal(b, &plain); err != nil {
		return err
	}
	*k = kept{Weights: floats(plain.Weights), Coverage: plain.Coverage, Drawn: plain.Drawn, far: float64(plain.Far)}
	if plain.LeftOut != nil {
		k.Evidence = &trust.ClassEvidence{Classes: len(plain.Weights), Given: plain.Given}
		for _, s := range plain.LeftOut {
			k.Evidence.LeftOut = append(k.Evidence.LeftOut, floats(s))
		}
	}
	if plain.Values != nil {
		k.Numbers = &trust.NumberEvidence{Given: floats(plain.Values), LeftOut: floats(plain.Answers), Spread: floats(plain.Spread)}
	}
	return nil
}

func numbers(v []float64) []Number {
	out := make([]Number, len(v))
	for i, x := range v {
		out[i] = Number(x)
	}
	return out
}

func floats(v []Number) []float64 {
	out := make([]float64, len(v))
	for i, x := range v {
		out[i] = float64(x)
	}
	return out
}

// usageAbstain refuses a probability threshold for numbers, which have none.
func usageAbstain() error {
	return fault.Usagef("P09", "--abstain is a probability and the labels are numbers; --abstain-rate leaves the rows with the widest intervals empty")
}
