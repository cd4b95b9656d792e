package job

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"sync/atomic"

	"pinfill/internal/encode"
	"pinfill/internal/extend"
	"pinfill/internal/trust"
)

// rowJudge gives new rows the same confidence, sets and intervals as label gave the model's own.
type rowJudge struct {
	keep    kept
	sure    bool // confidence, sets or intervals can be had
	abstain float64
	novel   atomic.Int64 // rows far from every vertex
}

// newRowJudge reads what the model keeps; --coverage and --drawn on the command line stand above it.
func newRowJudge(m *extend.Model, e *ExtendOptions) (*rowJudge, error) {
	j := &rowJudge{abstain: e.Abstain}
	if err := json.Unmarshal(m.Trust, &j.keep); err != nil {
		return nil, fmt.Errorf("the model's evidence cannot be read: %w", err)
	}
	if len(m.Classes) > 0 && len(j.keep.Weights) != len(m.Classes) {
		return nil, fmt.Errorf("%d class weights for %d classes", len(j.keep.Weights), len(m.Classes))
	}
	if len(m.Classes) == 0 && e.Abstain > 0 {
		return nil, usageAbstain()
	}
	if e.Given("coverage") {
		j.keep.Coverage = e.Coverage
	}
	if e.Given("drawn") {
		j.keep.Drawn = drawn[e.Drawn]
	}
	err := j.keep.ready()
	if errors.Is(err, trust.ErrNoEvidence) {
		return j, nil
	}
	j.sure = err == nil
	return j, err
}

// newResult makes room for the rows of a batch.
func (j *rowJudge) newResult(m *extend.Model, rows int, scores bool) *encode.Result {
	res := &encode.Result{Task: encode.Numbers, Names: m.Classes, Origin: make([]encode.Origin, rows)}
	if len(m.Classes) > 0 {
		res.Task, res.Class = encode.Classes, make([]int32, rows)
		if j.sure {
			res.Confidence, res.Set = make([]float64, rows), make([][]int32, rows)
		}
	} else {
		res.Value = make([]float64, rows)
		if j.sure {
			res.Low, res.High = make([]float64, rows), make([]float64, rows)
		}
	}
	if scores {
		res.Scores = make([][]float64, len(m.Scores))
		for c := range res.Scores {
			res.Scores[c] = make([]float64, rows)
		}
	}
	return res
}

// blank leaves a row empty.
func (j *rowJudge) blank(res *encode.Result, row int) {
	res.Origin[row] = encode.OriginBlank
	nan := math.NaN()
	if res.Task == encode.Classes {
		res.Class[row] = -1
		if res.Confidence != nil {
			res.Confidence[row] = nan
		}
	} else {
		res.Value[row] = nan
		if res.Low != nil {
			res.Low[row], res.High[row] = nan, nan
		}
	}
	for c := range res.Scores {
		res.Scores[c][row] = nan
	}
}

// row judges one row; rows of different numbers may be judged at the same time.
func (j *rowJudge) row(res *encode.Result, row int, scores []float64, at extend.Near) {
	if math.IsNaN(scores[0]) {
		j.blank(res, row)
		return
	}
	if at.Distance > j.keep.far {
		j.novel.Add(1)
	}
	for c := range res.Scores {
		res.Scores[c][row] = scores[c]
	}
	if res.Task == encode.Numbers {
		res.Value[row] = scores[0]
		if j.sure {
			res.Low[row], res.High[row] = j.keep.intervals.At(scores[0], at.Spread)
		}
		return
	}
	res.Class[row] = int32(j.keep.Weights.Decide(func(c int) float64 { return scores[c] }))
	if !j.sure {
		return
	}
	res.Confidence[row], res.Set[row] = j.keep.class(make([]float64, len(scores)), func(c int) float64 { return scores[c] })
	if res.Confidence[row] < j.abstain {
		res.Origin[row] = encode.Abstained
	}
}
