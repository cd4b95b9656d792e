package job

import (
	"context"
	"math"
	"strconv"
	"strings"

	"pinfill/internal/advise"
	"pinfill/internal/encode"
	"pinfill/internal/table"
)

// disputedAt is the corrected p-value below which a label counts as disputed (common practice).
const disputedAt = 0.05

// maxVoices is the number of rows named as the reason for a doubt.
const maxVoices = 5

// Audit writes the given labels, most suspicious first.
func Audit(ctx context.Context, o *Options) error {
	r, ctx, cancel := start(ctx, o)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	if r.Conflicts == encode.ConflictsStop {
		r.Conflicts = encode.ConflictsMajority // disputes are what is asked for, not a reason to stop
	}
	l, err := r.solved(ctx, "audit")
	if err != nil {
		return err
	}
	var doubts []advise.Doubt
	err = r.stage(ctx, "audit", func() error {
		doubts, err = r.doubts(ctx, l)
		return err
	})
	if err != nil {
		return err
	}
	r.fillRecord(l)
	disputed := 0
	err = r.stage(ctx, "write", func() error {
		if disputed, err = r.writeDoubts(w.byRole["table"], l, doubts); err != nil {
			return err
		}
		return r.finish(w, l.record)
	})
	if err != nil {
		return err
	}
	r.note("%s: %d labels audited at p=%s, %d disputed (corrected p below %g)", r.Table, len(l.data.labels.Rows), PText(l.setting.P), disputed, disputedAt)
	return r.steepestNote(l)
}

// doubts ranks the labelled vertices.
func (r *run) doubts(ctx context.Context, l *labelled) ([]advise.Doubt, error) {
	schur, err := r.schur(ctx, l.field)
	if err != nil {
		return nil, err
	}
	labels := l.field.labels
	if l.data.labels.Task == encode.Numbers {
		return advise.AuditNumbers(labels.Target[0], schur)
	}
	given := make([]int, labels.Count())
	prob := make([][]float64, labels.Count())
	for k := range given {
		given[k] = labels.Class(k)
		prob[k] = make([]float64, len(labels.Target))
		for c := range prob[k] {
			prob[k][c] = math.NaN()
		}
		if l.keep != nil {
			l.keep.calibration.Probabilities(prob[k], l.keep.Evidence.LeftOut[k])
		}
	}
	return advise.AuditClasses(given, prob, schur)
}

// writeDoubts writes one row a labelled table row, in the order of doubt; rows of one vertex follow each other.
func (r *run) writeDoubts(out *table.Output, l *labelled, doubts []advise.Doubt) (disputed int, err error) {
	d := l.data
	w := table.NewWriter(out, ',')
	head := []string{"row", "given", "suggested", "support", "strength", "p_value", "corrected_p", "disputed", "rows_that_say_so", "conflict"}
	if d.id >= 0 {
		head = append([]string{r.ID}, head...)
	}
	if err := w.Row(head...); err != nil {
		return 0, err
	}
	for _, doubt := range doubts {
		for _, k := range r.rowsBehind(l, doubt.Label) {
			row := d.labels.Rows[k]
			conflict := r.conflictText(l, doubt.Label, k)
			verdict := "no"
			if doubt.Adjusted < disputedAt || conflict != "" {
				verdict = "yes"
				disputed++
			}
			cells := []string{
				strconv.Itoa(row + 1), string(d.labels.Text[k]), r.answerText(d, doubt.Says), numberText(doubt.Support), numberText(doubt.Strength),
				numberText(doubt.P), numberText(doubt.Adjusted), verdict, r.voices(l, doubt), conflict,
			}
			if d.id >= 0 {
				cells = append([]string{d.table.Text(row, d.id)}, cells...)
			}
			if err := w.Row(cells...); err != nil {
				return 0, err
			}
		}
	}
	return disputed, w.Flush()
}

// rowsBehind gives the labels (indices into labels.Rows) behind a label of the field.
func (r *run) rowsBehind(l *labelled, label int) []int {
	if r.Tether == 0 {
		return l.network.at[label]
	}
	for _, ks := range l.network.at { // with tethers each label stands alone, in this order
		if label < len(ks) {
			return ks[label : label+1]
		}
		label -= len(ks)
	}
	return nil
}

// answerText writes a class or a number.
func (r *run) answerText(d *data, says float64) string {
	switch {
	case math.IsNaN(says):
		return ""
	case d.labels.Task == encode.Classes:
		return d.labels.Names[int(says)]
	}
	return string(encode.AppendNumber(nil, says))
}

// voices names the rows that say so, strongest first.
func (r *run) voices(l *labelled, doubt advise.Doubt) string {
	var names []string
	for _, v := range doubt.Voices[:min(len(doubt.Voices), maxVoices)] {
		k := r.rowsBehind(l, v.Label)[0]
		names = append(names, encode.EscapeSetName(l.data.rowName(l.data.labels.Rows[k])))
	}
	return strings.Join(names, "|")
}

// conflictText names a row that is identical in the features and has another label.
func (r *run) conflictText(l *labelled, label, k int) string {
	for _, other := range r.rowsBehind(l, label) {
		if labelLess(l.data.labels, other, k) || labelLess(l.data.labels, k, other) {
			return l.data.rowName(l.data.labels.Rows[other])
		}
	}
	return ""
}

// steepestNote names, for numbers, the two labels that force the steepest slope of any answer.
func (r *run) steepestNote(l *labelled) error {
	if l.data.labels.Task != encode.Numbers {
		return nil
	}
	f := l.field
	pair, ok, err := advise.SteepestPair(f.graph, f.labels.Vertex, f.labels.Target[0])
	if err != nil || !ok {
		return err
	}
	name := func(label int) string { return l.data.rowName(l.data.labels.Rows[r.rowsBehind(l, label)[0]]) }
	r.note("rows %s and %s force the steepest slope, %s from %s to %s", name(pair.Low), name(pair.High), figureText(pair.Slope),
		r.answerText(l.data, f.labels.Target[0][pair.Low]), r.answerText(l.data, f.labels.Target[0][pair.High]))
	return nil
}

// figureText writes a figure with four significant digits.
func figureText(v float64) string {
	if math.IsInf(v, 0) {
		return string(encode.AppendNumber(nil, v))
	}
	return strconv.FormatFloat(v, 'g', 4, 64)
}
