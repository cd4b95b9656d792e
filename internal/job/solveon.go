package job

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"

	"pinfill/internal/encode"
	"pinfill/internal/extend"
	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// FewerFigures say what label --solve-on did: how many rows were solved, and how far the rest may stray.
type FewerFigures struct {
	Solved   int          `json:"rows_solved"`
	Extended int          `json:"rows_extended"`
	Novel    int          `json:"rows_far_from_solved"`
	HeldOut  *StrayFigure `json:"held_out,omitempty"` // nil with --tether or --radius, or when every row was solved
}

// labelOnFewer is label with --solve-on, in two passes over the table and memory for the drawn rows alone. The first
// pass draws rows (sample.go); these and the labelled ones are a table of their own, on which label runs as ever. The
// second streams every row through extension: a row that was solved stands on its own vertex and takes its value.
func (r *run) labelOnFewer(ctx context.Context, w *outputs) error {
	if err := r.canSolveOnFewer(); err != nil {
		return err
	}
	var s *sample
	err := r.stage(ctx, "sample", func() (err error) {
		s, err = r.drawSample(ctx)
		return err
	})
	if err != nil {
		return err
	}
	l, err := r.labelSample(ctx, s)
	if err != nil {
		return s.relocate(err, r.Table)
	}
	x, err := r.fewerExtension(ctx, l, s)
	if err != nil {
		return err
	}
	figures := &FewerFigures{Solved: len(s.rows)}
	err = r.stage(ctx, "held out", func() (err error) {
		figures.HeldOut, err = r.heldOut(ctx, x, s)
		return err
	})
	if err != nil {
		return err
	}
	err = r.stage(ctx, "extend", func() error { return r.secondPass(ctx, x, s, w) })
	if err != nil {
		return err
	}
	figures.Extended, figures.Novel = x.rows-figures.Solved, int(x.judge.novel.Load())
	x.warnNovel()
	return r.finishFewer(ctx, w, l, x, s, figures)
}

// canSolveOnFewer refuses what two passes and an extension cannot do.
func (r *run) canSolveOnFewer() error {
	switch {
	case r.Table == "-" || r.LabelsFile == "-":
		return fault.Usagef("P09", "--solve-on reads the table twice, and standard input can be read once; name a file")
	case r.Edges != "":
		return fault.Usagef("P09", "--solve-on needs features: with --edges the rows that are not solved have no distances")
	case r.Abstain > 0 && r.Task == encode.Numbers:
		return usageAbstain()
	}
	return nil
}

// labelSample runs label on the drawn rows.
func (r *run) labelSample(ctx context.Context, s *sample) (*labelled, error) {
	o := *r.Options
	o.Table, o.Stdin, o.NoHeader, o.Delimiter = "-", bytes.NewReader(s.text), false, s.delimiter
	o.Abstain, o.AbstainRate = 0, 0 // rows are left empty in the second pass
	inner := &run{Options: &o}
	l, err := inner.label(ctx)
	r.warnings = append(r.warnings, inner.warnings...)
	r.timings = append(r.timings, inner.timings...)
	return l, err
}

// relocate says of a refusal of the drawn rows where in the table it is.
func (s *sample) relocate(err error, name string) error {
	var list *fault.List
	var one *fault.Error
	switch {
	case errors.As(err, &list):
		for _, e := range list.First {
			s.move(e, name)
		}
	case errors.As(err, &one):
		s.move(one, name)
	}
	return err
}

var lineNumber = regexp.MustCompile(`\bline \d+`)

func (s *sample) move(e *fault.Error, name string) {
	if e.File == "-" {
		e.File = name
		if e.Line > 1 {
			e.Line = s.line(e.Line)
		}
	}
	e.Message = lineNumber.ReplaceAllStringFunc(e.Message, func(m string) string {
		n, err := strconv.Atoi(m[len("line "):])
		if err != nil {
			return m
		}
		return fmt.Sprintf("line %d", s.line(n))
	})
	e.Message = strings.Replace(e.Message, "-: ", fault.Name(name)+": ", 1)
}

// fewerExtension makes the solved rows ready to extend from.
func (r *run) fewerExtension(ctx context.Context, l *labelled, s *sample) (*extension, error) {
	x := &extension{run: r, given: map[int]givenLabel{}}
	err := r.stage(ctx, "model", func() error {
		m, err := r.newModel(l)
		if err != nil {
			return err
		}
		if x.model, err = extend.NewExtender(ctx, m, r.Workers); err != nil {
			return err
		}
		x.judge, err = newRowJudge(x.model, &ExtendOptions{Options: r.Options, Given: func(string) bool { return false }})
		return err
	})
	for k, row := range l.data.labels.Rows {
		g := givenLabel{text: l.data.labels.Text[k]}
		if l.data.labels.Task == encode.Classes {
			g.class = l.data.labels.Class[k]
		} else {
			g.value = l.data.labels.Value[k]
		}
		x.given[s.rows[row]] = g
	}
	return x, err
}

// heldOut solves again with rows that were drawn and left out of the solve, and says how far extension strays there.
func (r *run) heldOut(ctx context.Context, x *extension, s *sample) (*StrayFigure, error) {
	if len(s.heldOut) == 0 || !canRecheck(x.model.Model) {
		return nil, nil
	}
	check := &recheck{}
	scores := make([]float64, len(x.model.Scores))
	work := x.model.NewWork()
	for _, features := range s.heldOut {
		if _, err := x.model.Row(features, scores, work); err != nil || math.IsNaN(scores[0]) {
			continue
		}
		p := pick{features: features, value: scores[0]}
		if len(x.model.Classes) > 0 {
			p.class = x.judge.decide(scores)
		}
		check.picks = append(check.picks, p)
	}
	return check.measure(ctx, x)
}

// secondPass labels every row.
func (r *run) secondPass(ctx context.Context, x *extension, s *sample, w *outputs) error {
	t, err := table.OpenStream(ctx, r.Table, r.Stdin, r.streamOptions())
	if err != nil {
		return err
	}
	defer t.Close()
	if err := x.findColumns(t.Head()); err != nil {
		return err
	}
	if err := x.stream(ctx, t, w.byRole["table"]); err != nil {
		return err
	}
	if t.SHA256() != s.sum {
		return &fault.Error{Exit: fault.File, File: r.Table, Message: "changed between the two times --solve-on read it", Hint: "run again when nothing writes to it"}
	}
	return nil
}

// finishFewer writes record, report and model of the whole table, and says what came out.
func (r *run) finishFewer(ctx context.Context, w *outputs, l *labelled, x *extension, s *sample, f *FewerFigures) error {
	rec := l.record
	for i := range rec.Inputs {
		if rec.Inputs[i].Role == "table" {
			rec.Inputs[i] = FileSum{Role: "table", Name: r.Table, Bytes: s.bytes, SHA256: fmt.Sprintf("%x", s.sum)}
		}
	}
	if r.Report != "" {
		r.warnf("", "the report draws the %d rows that were solved; the other %d are extended from them", f.Solved, f.Extended)
	}
	rec.Warnings = r.warnings
	if rec.Warnings == nil {
		rec.Warnings = []encode.Warning{}
	}
	if err := r.writeReport(ctx, w, l); err != nil {
		return err
	}
	rec.Table.Rows, rec.Fewer, rec.Result = x.rows, f, x.figures()
	if o := w.byRole["model"]; o != nil {
		if _, err := x.model.WriteTo(o); err != nil {
			return err
		}
	}
	if err := r.finish(w, rec); err != nil {
		return err
	}
	r.summary(l)
	r.note("solved on %d rows, the other %d extended from them", f.Solved, f.Extended)
	if f.HeldOut != nil {
		r.note("%s", f.HeldOut.sentence("held out", "held-out rows"))
	}
	return nil
}
