package report

import (
	"fmt"
	"math"
	"slices"
)

// weakRow is a row whose answer is least sure.
type weakRow struct {
	Row, Answer, Sure, Set, Origin string
}

// mostWeak is how many of the weakest rows are listed.
const mostWeak = 12

// mostClosest is how many labels are listed that stand but come closest to being disputed.
const mostClosest = 3

// unsureBelow is the confidence below which an answer is counted as doubtful: not clearly better than the toss of a
// coin (common practice).
const unsureBelow = 0.6

// howSure draws confidence, sets and intervals.
func (p *runPage) howSure() {
	a := &p.Answers
	if a.Confidence != nil {
		h := binned(a.Confidence, a.answered, 0, 1, 20)
		f := h.draw("sure", "Confidence of the answers", "confidence", "rows", percent)
		f.Desc = fmt.Sprintf("%s in twenty bars from 0 to 100%%.", plural(h.total, "answer"))
		f.Caption = "The calibrated probability that a row's label is right."
		p.SureHist = f.drawing
	}
	if a.SetSize != nil {
		p.SetHist = p.setSizes()
	}
	if a.Low != nil {
		w := make([]float64, len(a.Low))
		for row := range w {
			w[row] = a.High[row] - a.Low[row]
		}
		h := binned(w, a.answered, 0, 0, 20)
		f := h.draw("widths", "Width of the intervals", "width of the interval, in units of "+p.Label, "rows", figure)
		f.Desc = fmt.Sprintf("%s in bars of %s.", plural(h.total, "interval"), figure(h.step))
		f.Caption = fmt.Sprintf("Each interval is meant to hold the true value with probability %s.", percent(p.coverage()))
		if h.endless > 0 {
			f.Caption += fmt.Sprintf(" %s without end: too few labels for this coverage.", plural(h.endless, "interval"))
		}
		p.SetHist = f.drawing
	}
	t := p.Trust
	if t == nil {
		return
	}
	if len(t.Bins) > 0 {
		p.Calibrate = calibrationPlot(t.Bins)
	} else if p.Task == Numbers {
		p.Calibrate = leftOutPlot(t.Given, t.LeftOut)
	}
	for _, r := range []struct {
		name, note string
		v          float64
		text       func(float64) string
	}{
		{"accuracy", "share of left-out labels decided right", t.Accuracy, percent},
		{"log loss", "mean of −ln of the probability of the right class; 0 is perfect", t.LogLoss, figure},
		{"Brier score", "squared error of the probabilities; 0 is perfect", t.Brier, figure},
		{"calibration error", "how far confidence and share right differ, on average; chance alone would give " + percent(t.ECEFloor), t.ECE, percent},
		{"root mean square error", "of left-out labels, in units of the label", t.RMSE, figure},
		{"mean absolute error", "the same, without squaring", t.MAE, figure},
	} {
		if finite(r.v) {
			p.TrustRows = append(p.TrustRows, row{r.name, r.text(r.v), r.note})
		}
	}
}

func (p *runPage) coverage() float64 {
	if p.Trust == nil {
		return math.NaN()
	}
	return p.Trust.Coverage
}

// setSizes draws how many rows have a set of each size.
func (p *runPage) setSizes() *drawing {
	a := &p.Answers
	bySize := make([]float64, 0, 8)
	total, single := 0, 0
	for row, s := range a.SetSize {
		if !a.answered(row) {
			continue
		}
		for int(s) >= len(bySize) {
			bySize = append(bySize, 0)
		}
		bySize[s]++
		total++
		if s == 1 {
			single++
		}
	}
	if total == 0 {
		return nil
	}
	values := make([]float64, 0, total)
	for row, s := range a.SetSize {
		if a.answered(row) {
			values = append(values, float64(s))
		}
	}
	n := float64(len(bySize))
	h := binned(values, func(int) bool { return true }, -.5, n-.5, len(bySize))
	h.whole = true
	f := h.draw("sets", "Size of the sets", "classes in the set", "rows", func(v float64) string { return count(int(v)) })
	f.Desc = fmt.Sprintf("%s of %s hold one class.", count(single), plural(total, "set"))
	f.Caption = fmt.Sprintf("Each set is meant to hold the true class with probability %s. %s of the sets name a single class.", percent(p.coverage()), percent(float64(single)/float64(total)))
	if bySize[0] > 0 {
		f.Caption += fmt.Sprintf(" %s hold none: no class is as likely there as labels usually were, which is a doubt of its own.", percent(bySize[0]/float64(total)))
	}
	return f.drawing
}

// whatToDoubt lists the weakest rows.
func (p *runPage) whatToDoubt() {
	for _, d := range p.Doubts.List {
		if d.Disputed {
			p.Disputed++
			p.Closest = append(p.Closest, d)
		}
	}
	for _, d := range p.Doubts.List { // a few more that the others would give another label
		if !d.Disputed && d.Given != d.Says && len(p.Closest) < p.Disputed+mostClosest {
			p.Closest = append(p.Closest, d)
		}
	}
	a := &p.Answers
	p.WeakNote = "no measure of doubt"
	sure := func(row int) float64 { return math.NaN() }
	switch {
	case a.Confidence != nil:
		sure = func(row int) float64 { return a.Confidence[row] }
		low, total := 0, 0
		for row := range a.Origin {
			if a.answered(row) && !math.IsNaN(a.Confidence[row]) {
				total++
				if a.Confidence[row] < unsureBelow {
					low++
				}
			}
		}
		p.WeakNote = fmt.Sprintf("%s under %s sure", plural(low, "row"), percent(unsureBelow))
	case a.Low != nil:
		sure = func(row int) float64 { return a.Low[row] - a.High[row] } // minus the width
		p.WeakNote = "intervals " + figure(p.medianWidth()) + " wide"
	default:
		return
	}
	for _, r := range leastSure(len(a.Origin), mostWeak, func(row int) float64 {
		if !a.answered(row) {
			return math.NaN()
		}
		return sure(row)
	}) {
		p.Weak = append(p.Weak, p.weakRow(r))
	}
}

func (p *runPage) weakRow(r int) weakRow {
	a := &p.Answers
	w := weakRow{Row: count(r + 1), Origin: originWords[a.Origin[r]].name}
	if a.RowName != nil {
		w.Row = a.RowName(r)
	}
	if p.Task == Classes {
		w.Answer, w.Sure = p.Names[a.Class[r]], percent(a.Confidence[r])
		if a.SetText != nil {
			w.Set = a.SetText(r)
		}
		return w
	}
	w.Answer, w.Sure = figure(a.Value[r]), figure(a.Low[r])+" to "+figure(a.High[r])
	return w
}

// medianWidth is the median width of the intervals, of a thinned list where there are many.
func (p *runPage) medianWidth() float64 {
	a := &p.Answers
	var w []float64
	every := 1 + len(a.Low)/100_000
	for row := 0; row < len(a.Low); row += every {
		if v := a.High[row] - a.Low[row]; a.answered(row) && !math.IsNaN(v) {
			w = append(w, v)
		}
	}
	if len(w) == 0 {
		return math.NaN()
	}
	slices.Sort(w)
	return w[len(w)/2]
}

// leastSure gives the rows with the least of a figure, least first and equals by row; NaN is left out.
func leastSure(n, most int, sure func(row int) float64) []int {
	var rows []int
	var keys []float64
	for r := range n {
		k := sure(r)
		if math.IsNaN(k) || len(rows) == most && k >= keys[most-1] {
			continue
		}
		at := len(rows)
		for at > 0 && keys[at-1] > k {
			at--
		}
		rows, keys = slices.Insert(rows, at, r), slices.Insert(keys, at, k)
		if len(rows) > most {
			rows, keys = rows[:most], keys[:most]
		}
	}
	return rows
}
