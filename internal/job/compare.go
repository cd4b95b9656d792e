package job

import (
	"context"
	"fmt"
	"math"
	"strings"
	"text/tabwriter"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/sparse"
)

// CompareOptions are the options of compare.
type CompareOptions struct {
	*Options
	Part, Parts int      // part of the sweep to run; Parts 0 means all of it
	Join        []string // outputs of all parts to join instead of running
	Terminal    bool     // a terminal is there to show a table on
}

// comparePs are the powers compared when none is given.
var comparePs = []float64{1.7, 2, 3, 4, 6, 8, 16, math.Inf(1)}

// compared is a sweep: one row a setting.
type compared struct {
	settings []choose.Setting
	scores   []*choose.Score // nil for settings of other parts
	answers  []choose.Answers
	labels   choose.Labels
	names    []string // classes
	given    bool     // the graph was given
}

// Compare writes one row a setting.
func Compare(ctx context.Context, c *CompareOptions) error {
	r, ctx, cancel := start(ctx, c.Options)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	d, err := r.load(ctx)
	if err != nil {
		return err
	}
	l := &labelled{data: d, record: r.newRecord("compare", d)}
	if l.network, err = r.findNetwork(ctx, d); err != nil {
		return err
	}
	if err := r.placeLabels(d, l.network.vertices); err != nil {
		return err
	}
	sweep := &compared{names: d.labels.Names, given: l.network.given != nil}
	if sweep.labels, err = r.chosenLabels(l); err != nil {
		return err
	}
	sweep.settings = r.compareSettings(l)
	if len(c.Join) > 0 {
		err = r.stage(ctx, "join", func() error { return r.joinParts(ctx, sweep, c.Join) })
	} else {
		err = r.stage(ctx, "solve", func() error { return r.sweep(ctx, l, sweep, c) })
	}
	if err != nil {
		return err
	}
	err = r.stage(ctx, "write", func() error {
		if c.Parts > 0 {
			return r.writePart(w.byRole["table"], sweep, c)
		}
		return r.writeComparison(w.byRole["table"], sweep)
	})
	if err != nil {
		return err
	}
	if err := r.compareRecord(l, sweep, c); err != nil {
		return err
	}
	if err := r.writeCompareReport(ctx, w, l, sweep); err != nil {
		return err
	}
	if c.Terminal && c.Parts == 0 {
		r.note("%s", sweep.text())
	}
	return r.finish(w, l.record)
}

// compareSettings lists what to compare: every combination of what was given, and powers from 1.7 to inf.
func (r *run) compareSettings(l *labelled) []choose.Setting {
	a := r.asked(l.data, l.network)
	if len(a.P) == 0 {
		a.P = comparePs
	}
	task := choose.Classes
	if l.data.labels.Task == encode.Numbers {
		task = choose.Numbers
	}
	return a.Settings(task)
}

// sweep solves the settings of this part.
func (r *run) sweep(ctx context.Context, l *labelled, sweep *compared, c *CompareOptions) error {
	var want []bool
	if c.Parts > 0 {
		want = make([]bool, len(sweep.settings))
		for i := range want {
			want[i] = i%c.Parts == c.Part-1
		}
	}
	source := func(ctx context.Context, s choose.Setting) (*sparse.CSR, error) {
		out, err := r.layField(ctx, l, s)
		if err != nil {
			return nil, err
		}
		if l.field == nil {
			r.warn(out.warnings...)
			out.figures.measure(out.weights, r.Workers)
			l.record.Graph = out.figures
			l.field = out.field
		}
		return out.field.graph, nil
	}
	found, err := choose.Sweep(ctx, source, sweep.labels, sweep.settings, choose.Options{
		Energy: r.Energy, Tolerance: r.Tolerance, Workers: r.Workers, Seed: r.Seed, Progress: r.progressFor("compare"), Scores: true, Want: want,
	})
	if err != nil {
		return err
	}
	sweep.scores = found.Scores
	sweep.answers = make([]choose.Answers, len(found.Scores))
	for i, s := range found.Scores {
		if s == nil {
			continue
		}
		sweep.answers[i] = s.Answers(sweep.labels)
		if !s.Certified {
			if err := r.missed(s); err != nil {
				return err
			}
		}
	}
	return nil
}

// missed says that a setting was not certified: an error, unless the user accepts that.
func (r *run) missed(s *choose.Score) error {
	text := fmt.Sprintf("p=%s missed its tolerance: value bound %.3g of the label range, gap %.3g", PText(s.P), s.Certificate.Width, s.Certificate.Gap)
	if r.AcceptUncertified {
		r.warn(encode.Warning{Code: "N01", Text: text})
		return nil
	}
	return &fault.Error{Exit: fault.Uncertified, Code: "N01", Message: text, Hint: "leave it out of --p, or pass --accept-uncertified"}
}

// advised marks the setting to use.
func (sweep *compared) advised(task choose.Task) int {
	best, _ := choose.Advise(sweep.scores, task)
	return best
}

// compareRecord fills the record.
func (r *run) compareRecord(l *labelled, sweep *compared, c *CompareOptions) error {
	rec := l.record
	rec.Inputs = l.data.inputs
	rec.tableFigures(l.data, l.network.vertices)
	rec.Warnings = append([]encode.Warning{}, r.warnings...)
	rec.Choice = &ChoiceFigures{}
	best := -1
	if c.Parts == 0 {
		best = sweep.advised(sweep.labels.Task)
		rec.Choice.Reason = "advised: p=" + PText(sweep.settings[best].P)
		l.setting = sweep.settings[best]
		rec.Settings = r.settingFigures(l)
	}
	for i, s := range sweep.scores {
		if s != nil {
			f := scoreFigures(s, l)
			f.Advised = i == best
			rec.Choice.Candidates = append(rec.Choice.Candidates, f)
		}
	}
	return nil
}

// text is the comparison for a terminal.
func (sweep *compared) text() string {
	var b strings.Builder
	tw := tabwriter.NewWriter(&b, 0, 0, 2, ' ', tabwriter.AlignRight)
	best := sweep.advised(sweep.labels.Task)
	fmt.Fprint(tw, "\tp\tneighbours\tbandwidth\tleft-out error\t±\tlabel drop\tbulk\tat labels\t\n")
	for i, s := range sweep.scores {
		mark := ""
		if i == best {
			mark = "advised"
		}
		fmt.Fprintf(tw, "%s\t%s\t%d\t%s\t%s\t%s\t%.3f\t%.3f\t%.3f\t\n", mark, PText(s.P), s.Neighbors, bandwidthText(s.Bandwidth),
			numberText(s.Error), numberText(s.StdError), s.Spike, s.Bulk, s.Kappa)
	}
	tw.Flush()
	return strings.TrimRight(b.String(), "\n")
}
