package job

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"sync/atomic"

	"pinfill/internal/encode"
	"pinfill/internal/extend"
	"pinfill/internal/parallel"
	"pinfill/internal/trust"
)

// rowJudge gives new rows the same confidence, sets and intervals as label gave the model's own.
type rowJudge struct {
	keep    kept
	sure    bool         // confidence, sets or intervals can be had
	least   float64      // rows less sure than this are left empty
	bridged []bool       // by vertex; nil when none is
	novel   atomic.Int64 // rows far from every vertex
}

// newRowJudge reads what the model keeps; --coverage and --drawn on the command line stand above it.
func newRowJudge(x *extend.Extender, e *ExtendOptions) (*rowJudge, error) {
	m := x.Model
	j := &rowJudge{least: math.Inf(-1)}
	if e.Abstain > 0 {
		j.least = e.Abstain
	}
	if len(m.Bridged) > 0 {
		j.bridged = make([]bool, m.Points.N)
		for _, v := range m.Bridged {
			j.bridged[v] = true
		}
	}
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
	if err != nil {
		return j, err
	}
	j.sure = true
	if e.AbstainRate > 0 {
		j.least, err = j.leastSure(m, e.AbstainRate, e.Workers)
	}
	return j, err
}

// leastSure is the sureness below which a share of the model's own free vertices would be left empty. A stream cannot
// rank its rows before it has seen them all, so new rows are held against those that were solved.
func (j *rowJudge) leastSure(m *extend.Model, rate float64, workers int) (float64, error) {
	sure := make([]float64, m.Points.N)
	const grain = 2048
	parallel.For(workers, len(sure), grain, func(lo, hi int) {
		scores, prob := make([]float64, len(m.Scores)), make([]float64, len(m.Scores))
		for v := lo; v < hi; v++ {
			for c := range scores {
				scores[c] = m.Scores[c][v]
			}
			var spread float64
			if m.Spread != nil {
				spread = m.Spread[v]
			}
			sure[v], _, _, _ = j.sureness(scores, spread, prob)
		}
	})
	for _, v := range m.Labelled {
		sure[v] = math.NaN()
	}
	marked, err := trust.Abstain(sure, math.Inf(-1), rate)
	least := math.Inf(1)
	for v, s := range sure {
		if !marked[v] && s < least {
			least = s
		}
	}
	return least, err
}

// sureness is the confidence of a class, or minus the width of a number's interval, with the set or the interval.
func (j *rowJudge) sureness(scores []float64, spread float64, prob []float64) (sure float64, set []int32, low, high float64) {
	if j.keep.intervals != nil {
		low, high = j.keep.intervals.At(scores[0], spread)
		return low - high, nil, low, high
	}
	sure, set = j.keep.class(prob, func(c int) float64 { return scores[c] })
	return sure, set, 0, 0
}

// decide gives the class of a row.
func (j *rowJudge) decide(scores []float64) int32 {
	return int32(j.keep.Weights.Decide(func(c int) float64 { return scores[c] }))
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

// row judges one row; rows of different numbers may be judged at the same time. prob is scratch, one a class.
func (j *rowJudge) row(res *encode.Result, row int, scores []float64, at extend.Near, prob []float64) {
	if math.IsNaN(scores[0]) {
		j.blank(res, row)
		return
	}
	if at.Distance > j.keep.far {
		j.novel.Add(1)
	}
	if j.bridged != nil && j.bridged[at.Vertex] {
		res.Origin[row] = encode.Bridged
	}
	for c := range res.Scores {
		res.Scores[c][row] = scores[c]
	}
	if res.Task == encode.Numbers {
		res.Value[row] = scores[0]
	} else {
		res.Class[row] = j.decide(scores)
	}
	if !j.sure {
		return
	}
	sure, set, low, high := j.sureness(scores, at.Spread, prob)
	if res.Task == encode.Numbers {
		res.Low[row], res.High[row] = low, high
	} else {
		res.Confidence[row], res.Set[row] = sure, set
	}
	if sure < j.least {
		res.Origin[row] = encode.Abstained
	}
}
