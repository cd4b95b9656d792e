package job

import (
	"context"
	"errors"
	"fmt"
	"math"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/parallel"
	"pinfill/internal/solve"
	"pinfill/internal/trust"
)

// TrustFigures say how far the labels can be trusted, and what that rests on.
type TrustFigures struct {
	Promise    string     `json:"promise"`
	Labels     int        `json:"labels_left_out"`
	Floor      Number     `json:"smallest_promisable_miss"`
	Accuracy   *Number    `json:"left_out_accuracy,omitempty"`
	LogLoss    *Number    `json:"left_out_log_loss,omitempty"`
	Brier      *Number    `json:"left_out_brier,omitempty"`
	ECE        *Number    `json:"calibration_error,omitempty"`
	ECEFloor   *Number    `json:"calibration_error_of_chance,omitempty"`
	RMSE       *Number    `json:"left_out_rmse,omitempty"`
	MAE        *Number    `json:"left_out_mae,omitempty"`
	Size       Number     `json:"mean_set_size_or_width"`
	Calibrated []BinPoint `json:"calibration,omitempty"`
	Note       string     `json:"note"`
}

// BinPoint is a point of the calibration plot.
type BinPoint struct {
	Count      int    `json:"labels"`
	Confidence Number `json:"confidence"`
	Accuracy   Number `json:"accuracy"`
}

// leftOutNote says what the figures are honest about.
const leftOutNote = "measured on labels answered without their own; the setting was chosen on the same labels, which flatters the figures slightly"

func (t *TrustFigures) sentence() string {
	s := t.Promise
	if t.Accuracy != nil {
		s += fmt.Sprintf("; left-out accuracy %.2f, calibration error %.2f", float64(*t.Accuracy), float64(*t.ECE))
	}
	if t.RMSE != nil {
		s += fmt.Sprintf("; left-out RMSE %.3g", float64(*t.RMSE))
	}
	return s
}

// figure gives a pointer to a number, for figures that only one task has.
func figure(v float64) *Number { n := Number(v); return &n }

var drawn = map[Drawn]trust.Drawn{DrawnRandom: trust.Random, DrawnPerClass: trust.PerClass, DrawnChosen: trust.Chosen}

// judge turns scores into labels with their confidence, sets and intervals, and leaves out what is too doubtful.
func (r *run) judge(ctx context.Context, l *labelled) error {
	var err error
	if l.data.labels.Task == encode.Classes {
		err = r.judgeClasses(l)
	} else {
		err = r.judgeNumbers(ctx, l)
	}
	if errors.Is(err, trust.ErrNoEvidence) || (err == nil && l.keep == nil) {
		r.warnf("", "too few labels to leave some out: confidence, sets and intervals stay empty")
		err = nil
	}
	if err != nil {
		return err
	}
	return r.abstain(l)
}

// evidence gives the left-out scores of each label on the scale on which classes are compared.
func evidence(s *choose.Score, l choose.Labels) trust.ClassEvidence {
	e := trust.ClassEvidence{Classes: len(l.Target)}
	left := s.Left()
	weights := s.LeftOutWeights(l)
	for k := range l.Vertex {
		w := weights[left.Fold[k]]
		e.LeftOut = append(e.LeftOut, weighted(make([]float64, len(w)), w, func(c int) float64 { return left.Score[k][c] }))
		e.Given = append(e.Given, l.Class(k))
	}
	return e
}

// weighted puts class scores on the scale on which they are compared.
func weighted(dst []float64, w choose.Weights, score func(int) float64) []float64 {
	for c := range dst {
		s := score(c)
		if s < 0 {
			s = 0
		}
		dst[c] = w[c] * s
	}
	return dst
}

func (r *run) judgeClasses(l *labelled) error {
	w, scores := l.chosen.Weights, l.field.scores
	l.result = r.newResult(l, func(x int32) int32 {
		return int32(w.Decide(func(c int) float64 { return scores[c][x] }))
	})
	if l.chosen.Left() == nil || len(scores) < 2 {
		return nil
	}
	e := evidence(l.chosen, l.field.labels)
	keep := &kept{Weights: w, Evidence: &e, Coverage: r.Coverage, Drawn: drawn[r.Drawn]}
	if err := keep.ready(); err != nil {
		return err
	}
	l.keep = keep
	f := keep.calibration.Figures()
	p := keep.sets.Promise()
	t := &TrustFigures{
		Promise: p.Sentence(), Labels: p.Labels, Floor: Number(p.Floor), Accuracy: figure(f.Accuracy), LogLoss: figure(f.LogLoss),
		Brier: figure(f.Brier), ECE: figure(f.ECE), ECEFloor: figure(f.ECEFloor), Note: leftOutNote,
	}
	for _, b := range f.Bins {
		t.Calibrated = append(t.Calibrated, BinPoint{b.Count, Number(b.Confidence), Number(b.Accuracy)})
	}
	l.record.Trust = t
	r.fillClasses(l, keep)
	return nil
}

// fillClasses gives each inferred row its confidence and set. Rows of one vertex are judged once.
func (r *run) fillClasses(l *labelled, keep *kept) {
	n, scores := l.field.n, l.field.scores
	confidence := make([]float64, n)
	sets := make([][]int32, n)
	const grain = 4096
	parallel.For(r.Workers, n, grain, func(lo, hi int) {
		prob := make([]float64, len(scores))
		for x := lo; x < hi; x++ {
			confidence[x], sets[x] = keep.class(prob, func(c int) float64 { return scores[c][x] })
		}
	})
	res := l.result
	res.Confidence = make([]float64, len(res.Origin))
	res.Set = make([][]int32, len(res.Origin))
	var sum float64
	count := 0
	for row, origin := range res.Origin {
		res.Confidence[row] = math.NaN()
		if origin == encode.Inferred || origin == encode.Bridged {
			x := l.network.of[row]
			res.Confidence[row], res.Set[row] = confidence[x], sets[x]
			sum += float64(len(sets[x]))
			count++
		}
	}
	l.record.Trust.Size = Number(sum / float64(count))
}

func (r *run) judgeNumbers(ctx context.Context, l *labelled) error {
	l.result = r.newResult(l, nil)
	y := l.field.labels.Target[0]
	left := l.chosen.Left()
	var fold []int32
	switch {
	case left != nil:
		fold = left.Fold
	case r.byMoments(l) && len(y) >= fewestNumbers:
		fold = choose.FoldsOf(l.field.labels, choose.Folds(l.field.graph, 1), r.Seed)
	default:
		return nil
	}
	spread, leftSpread, means, err := r.spreads(ctx, l, fold)
	if err != nil {
		return err
	}
	e := trust.NumberEvidence{Given: y, Spread: leftSpread, LeftOut: means}
	if left != nil {
		for k := range y {
			e.LeftOut[k] = left.Score[k][0]
		}
	}
	keep := &kept{Numbers: &e, Coverage: r.Coverage, Drawn: drawn[r.Drawn], spread: spread}
	if err := keep.ready(); err != nil {
		return err
	}
	l.keep = keep
	p, f := keep.intervals.Promise(), keep.intervals.Figures()
	if left == nil {
		l.record.Choice.Candidates[0].Error, l.record.Choice.Candidates[0].LeftOut = Number(f.RMSE), p.Labels
	}
	t := &TrustFigures{Promise: p.Sentence(), Labels: p.Labels, Floor: Number(p.Floor), RMSE: figure(f.RMSE), MAE: figure(f.MAE), Note: leftOutNote}
	res := l.result
	res.Low, res.High = make([]float64, len(res.Origin)), make([]float64, len(res.Origin))
	var sum float64
	count := 0
	for row, origin := range res.Origin {
		res.Low[row], res.High[row] = math.NaN(), math.NaN()
		if origin == encode.Inferred || origin == encode.Bridged {
			x := l.network.of[row]
			res.Low[row], res.High[row] = keep.intervals.At(res.Value[row], spread[x])
			sum += res.High[row] - res.Low[row]
			count++
		}
	}
	t.Size = Number(sum / float64(count))
	l.record.Trust = t
	return nil
}

// fewestNumbers is the least number of labels from which intervals are drawn.
const fewestNumbers = 10

// spreads gives how far the labels around each vertex disagree, and the same at each label with its fold left out:
// the harmonic extensions (p = 2) of the labels and of their squares, taken about their mean so that no digits cancel.
//
// means are the left-out answers at p = 2.
func (r *run) spreads(ctx context.Context, l *labelled, fold []int32) (field, left, means []float64, err error) {
	labels := l.field.labels
	y := labels.Target[0]
	var mean float64
	for _, v := range y {
		mean += (v - y[0]) / float64(len(y))
	}
	mean += y[0]
	moments := choose.Labels{Task: choose.Classes, Vertex: labels.Vertex, Group: labels.Group, Target: [][]float64{make([]float64, len(y)), make([]float64, len(y))}}
	for k, v := range y {
		moments.Target[0][k], moments.Target[1][k] = v-mean, (v-mean)*(v-mean)
	}
	problem := r.problem(l.field, 2)
	rough := r.solveSettings()
	rough.Rough = true // a scale for intervals, not an answer
	fields, err := r.momentFields(ctx, l, problem, moments, mean, rough)
	if err != nil {
		return nil, nil, nil, err
	}
	out, err := choose.LeaveOut(ctx, problem, moments, choose.LeaveOptions{Fold: fold, Workers: r.Workers, Start: fields, Rough: true})
	if err != nil {
		return nil, nil, nil, err
	}
	if field, err = trust.Spread(fields[0][:l.field.n], fields[1][:l.field.n]); err != nil {
		return nil, nil, nil, err
	}
	m, sq := make([]float64, len(y)), make([]float64, len(y))
	means = make([]float64, len(y))
	for k := range y {
		m[k], sq[k] = out.Score[k][0], out.Score[k][1]
		means[k] = mean + m[k]
	}
	left, err = trust.Spread(m, sq)
	for k, v := range left {
		if math.IsNaN(v) {
			left[k] = 0 // its left-out answer is missing too
		}
	}
	return field, left, means, err
}

// momentFields are the harmonic extensions of the moments. At p = 2 the first is the answer itself.
func (r *run) momentFields(ctx context.Context, l *labelled, problem solve.Problem, moments choose.Labels, mean float64, rough solve.Settings) ([][]float64, error) {
	if l.setting.P != 2 || l.field.n != l.field.graph.N {
		fields, _, err := choose.Solve(ctx, problem, moments, nil, rough)
		return fields, err
	}
	squares := moments
	squares.Target = moments.Target[1:]
	fields, _, err := choose.Solve(ctx, problem, squares, nil, rough)
	if err != nil {
		return nil, err
	}
	first := make([]float64, l.field.n)
	for v, f := range l.field.scores[0] {
		first[v] = f - mean
	}
	return [][]float64{first, fields[0]}, nil
}

// abstain empties the rows that are too doubtful.
func (r *run) abstain(l *labelled) error {
	if r.Abstain == 0 && r.AbstainRate == 0 {
		return nil
	}
	res := l.result
	sure := make([]float64, len(res.Origin))
	for row := range sure {
		sure[row] = math.NaN()
		switch {
		case res.Origin[row] != encode.Inferred && res.Origin[row] != encode.Bridged:
		case res.Confidence != nil:
			sure[row] = res.Confidence[row]
		case res.Low != nil:
			sure[row] = -(res.High[row] - res.Low[row])
		}
	}
	threshold := math.Inf(-1)
	if r.Abstain > 0 {
		if res.Task == encode.Numbers {
			return usageAbstain()
		}
		threshold = r.Abstain
	}
	out, err := trust.Abstain(sure, threshold, r.AbstainRate)
	if err != nil {
		return err
	}
	for row, empty := range out {
		if empty {
			res.Origin[row] = encode.Abstained
		}
	}
	return nil
}
