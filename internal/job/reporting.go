package job

import (
	"context"
	"math"
	"slices"
	"strings"

	"pinfill/internal/encode"
	"pinfill/internal/report"
)

// Above these sizes a report leaves out what would cost more than a few percent of the run.
const (
	mostAudited   = 200     // labels
	mostAuditedOn = 200_000 // vertices
)

// writeReport draws the run as one HTML file, if one was asked for.
func (r *run) writeReport(ctx context.Context, w *outputs, l *labelled) error {
	o := w.byRole["report"]
	if o == nil {
		return nil
	}
	return r.stage(ctx, "report", func() error {
		written, err := w.sums("table", "model")
		if err != nil {
			return err
		}
		page, err := r.reportOf(ctx, l)
		if err != nil {
			return err
		}
		page.Files = append(page.Files, reportFiles(written)...)
		return report.Write(o, page)
	})
}

// reportHead is what both kinds of report begin with.
func (r *run) reportHead(l *labelled) report.Head {
	rec := l.record
	h := report.Head{
		Program: rec.Program + " " + rec.Version, Table: r.Table, Label: r.Label, Task: report.Task(rec.Table.Task), Rows: rec.Table.Rows,
		Labelled: rec.Table.Labelled, Features: rec.Table.Features, Caution: rec.Caution, Command: r.commandText(rec), Files: reportFiles(rec.Inputs),
	}
	if h.Task == report.Classes {
		h.Names = l.data.labels.Names
	}
	if rec.Choice != nil {
		h.Reason = rec.Choice.Reason
	}
	for _, warning := range rec.Warnings {
		h.Warnings = append(h.Warnings, report.Warning(warning))
	}
	return h
}

func reportFiles(sums []FileSum) []report.File {
	var files []report.File
	for _, s := range sums {
		files = append(files, report.File(s))
	}
	return files
}

// commandText is what to type in a shell to get the same bytes.
func (r *run) commandText(rec *Record) string {
	var b strings.Builder
	b.WriteString("pinfill " + rec.Command + " " + shellWord(r.Table))
	for _, name := range rec.FlagNames() {
		b.WriteString(" " + shellWord("--"+name+"="+rec.Flags[name]))
	}
	out := r.Output
	if out == "" {
		out = "OUT"
	}
	b.WriteString(" -o " + shellWord(out))
	if r.Record != "" && rec.Command == "label" {
		b.WriteString("\npinfill label " + shellWord(r.Table) + " --repeat " + shellWord(r.Record) + "   # runs it again and compares the bytes")
	}
	return b.String()
}

// shellWord quotes a word for a POSIX shell where it needs to be.
func shellWord(s string) string {
	plain := func(c rune) bool {
		return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c >= '0' && c <= '9' || strings.ContainsRune("-_=./:,+@%", c)
	}
	if s != "" && strings.IndexFunc(s, func(c rune) bool { return !plain(c) }) < 0 {
		return s
	}
	return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
}

// reportOf fills the report of label.
func (r *run) reportOf(ctx context.Context, l *labelled) (*report.Run, error) {
	rec := l.record
	page := &report.Run{
		Head: r.reportHead(l), Vertices: rec.Table.Vertices, Constant: rec.Table.Dropped, Answers: r.reportAnswers(l), Trust: r.reportTrust(l),
		Bridges: r.reportBridges(l), P: l.setting.P, Settings: r.reportSettings(rec.Settings), Graph: reportGraph(rec.Graph),
	}
	if rec.Choice != nil {
		page.Trials = reportTrials(rec.Choice.Candidates)
	}
	for _, s := range rec.Solves {
		page.Solves = append(page.Solves, report.Solve{
			What: s.What, Component: s.Component, Status: s.Status, Gap: float64(s.Gap), Imbalance: float64(s.Imbalance), Width: float64(s.Width),
			SlopeImbalance: float64(s.SlopeImbalance), LinearSolves: s.LinearSolves, Iterations: s.Iterations,
		})
	}
	if l.network.lists != nil {
		page.Neighbors = l.setting.Neighbors
		if err := r.reportWindows(l, page); err != nil {
			return nil, err
		}
	}
	page.Map, page.NoMap = r.reportMap(l)
	var err error
	page.Doubts, err = r.reportDoubts(ctx, l)
	return page, err
}

func (r *run) reportAnswers(l *labelled) report.Answers {
	res := l.result
	a := report.Answers{
		Origin: make([]report.Origin, len(res.Origin)), Class: res.Class, Value: res.Value, Confidence: res.Confidence, Low: res.Low, High: res.High,
		RowName: l.data.rowName,
	}
	for row, o := range res.Origin {
		a.Origin[row] = reportOrigins[o]
	}
	if res.Set != nil {
		a.SetSize = make([]int32, len(res.Set))
		for row, set := range res.Set {
			a.SetSize[row] = int32(len(set))
		}
		a.SetText = func(row int) string {
			var names []string
			for _, c := range res.Set[row] {
				names = append(names, res.Names[c])
			}
			return strings.Join(names, ", ")
		}
	}
	return a
}

var reportOrigins = [...]report.Origin{
	encode.Inferred: report.Inferred, encode.Given: report.Given, encode.Bridged: report.Bridged, encode.Abstained: report.Abstained, encode.OriginBlank: report.Blank,
}

func (r *run) reportTrust(l *labelled) *report.Trust {
	t := l.record.Trust
	if t == nil {
		return nil
	}
	value := func(n *Number) float64 {
		if n == nil {
			return math.NaN()
		}
		return float64(*n)
	}
	out := &report.Trust{
		Promise: t.Promise, Note: t.Note, Coverage: r.Coverage, Labels: t.Labels, Accuracy: value(t.Accuracy), LogLoss: value(t.LogLoss), Brier: value(t.Brier),
		ECE: value(t.ECE), ECEFloor: value(t.ECEFloor), RMSE: value(t.RMSE), MAE: value(t.MAE),
	}
	for _, b := range t.Calibrated {
		out.Bins = append(out.Bins, report.Bin{Count: b.Count, Confidence: float64(b.Confidence), Accuracy: float64(b.Accuracy)})
	}
	if l.keep != nil && l.keep.Numbers != nil {
		out.Given, out.LeftOut = l.keep.Numbers.Given, l.keep.Numbers.LeftOut
	}
	return out
}

// reportSettings lists the settings in the order of the record. What was typed is told from what was chosen.
func (r *run) reportSettings(s Settings) []report.Setting {
	list := []report.Setting{
		{Name: "p", Value: PText(float64(s.P))},
		{Name: "energy", Value: s.Energy},
		{Name: "balance", Value: s.Balance},
		{Name: "kernel", Value: s.Kernel},
		{Name: "bandwidth", Value: s.Bandwidth},
		{Name: "neighbors", Value: positive(float64(s.Neighbors))},
		{Name: "radius", Value: positive(float64(s.Radius))},
		{Name: "scale", Value: s.Scale},
		{Name: "metric", Value: s.Metric},
		{Name: "tether", Value: positive(float64(s.Tether))},
		{Name: "unreachable", Value: s.Unreachable},
		{Name: "coverage", Value: positive(float64(s.Coverage))},
		{Name: "drawn", Value: s.Drawn},
		{Name: "tolerance", Value: positive(float64(s.Tolerance))},
		{Name: "solve-on", Value: positive(float64(s.SolveOn))},
		{Name: "seed", Value: positive(float64(s.Seed))},
	}
	var out []report.Setting
	for _, set := range list {
		if set.Value == "" {
			continue
		}
		_, set.Given = r.Flags[set.Name]
		out = append(out, set)
	}
	return out
}

// positive writes a number that means nothing at 0.
func positive(v float64) string {
	if v == 0 {
		return ""
	}
	return string(encode.AppendNumber(nil, v))
}

func reportGraph(g GraphFigures) report.Graph {
	return report.Graph{
		Vertices: g.Vertices, Edges: g.Edges, Components: g.Components, UnlabelledParts: g.UnlabelledParts, UnlabelledRows: g.UnlabelledRows,
		BridgedParts: g.BridgedParts, MinDegree: g.MinDegree, MedianDegree: g.MedianDegree, MaxDegree: g.MaxDegree,
		LogWeightLow: float64(g.LogWeightLow), LogWeightHigh: float64(g.LogWeightHigh), Search: g.Search, Recall: float64(g.Recall),
	}
}

func reportTrials(scores []ScoreFigures) []report.Trial {
	var out []report.Trial
	for _, s := range scores {
		t := report.Trial{
			P: float64(s.P), Neighbors: s.Neighbors, Kernel: s.Kernel, Bandwidth: s.Bandwidth, Error: float64(s.Error), StdError: float64(s.StdError),
			LogLoss: float64(s.LogLoss), LabelDrop: float64(s.LabelDrop), Bulk: float64(s.Bulk), AtLabels: float64(s.AtLabels),
			SmallShare: math.NaN(), LargeShare: math.NaN(), Width: float64(s.Width), Gap: float64(s.Gap), Solves: s.Solves, Iterations: s.Iterations,
			Certified: s.Certified, Advised: s.Advised,
		}
		for i, share := range s.Shares {
			v := float64(share.Share)
			if i == 0 {
				t.SmallShare, t.LargeShare = v, v
			}
			t.SmallShare, t.LargeShare = min(t.SmallShare, v), max(t.LargeShare, v)
		}
		out = append(out, t)
	}
	return out
}

func (r *run) reportWindows(l *labelled, page *report.Run) error {
	ps := slices.Clone(windowPs)
	if !slices.Contains(ps, l.setting.P) {
		ps = append(ps, l.setting.P)
		slices.Sort(ps)
	}
	d, windows, err := r.dimensionFigures(l, ps, l.network.n <= mostAuditedOn)
	if err != nil || d == nil {
		return err
	}
	page.Dimension = &report.Dimension{Value: float64(d.Value), Low: float64(d.Low), High: float64(d.High), Columns: l.network.space.Points.D}
	switch {
	case d.Rounded:
		page.Dimension.Note = "The coordinates are rounded, which blurs the estimate."
	case d.BiasedLow:
		page.Dimension.Note = "The true dimension is likely higher: in so many dimensions the estimate falls short."
	}
	for _, w := range windows {
		page.Windows = append(page.Windows, report.Window{
			P: float64(w.P), NeighborsLow: float64(w.NeighborsLow), NeighborsHigh: float64(w.NeighborsHigh), BandwidthLow: float64(w.BandwidthLow),
			BandwidthHigh: float64(w.BandwidthHigh), Inside: w.Inside, Reasons: w.Reasons,
		})
	}
	return nil
}

// reportDoubts audits the labels where that is cheap.
func (r *run) reportDoubts(ctx context.Context, l *labelled) (report.Doubts, error) {
	labels := l.field.labels.Count()
	if labels > mostAudited || l.network.n > mostAuditedOn {
		return report.Doubts{Skipped: "this run is large, and asking every label what the others say would slow it down. pinfill audit does it."}, nil
	}
	doubts, err := r.doubts(ctx, l)
	if err != nil {
		if s := stopped(ctx); s != nil {
			return report.Doubts{}, s
		}
		return report.Doubts{Skipped: "the labels do not reach each other (" + err.Error() + ")."}, nil
	}
	out := report.Doubts{Audited: labels}
	const most = 12
	for _, doubt := range doubts[:min(len(doubts), most)] {
		if math.IsNaN(doubt.Says) {
			continue
		}
		k := r.rowsBehind(l, doubt.Label)[0]
		d := report.Dispute{
			Row: l.data.rowName(l.data.labels.Rows[k]), Given: string(l.data.labels.Text[k]), Says: r.answerText(l.data, doubt.Says),
			Adjusted: doubt.Adjusted, Disputed: doubt.Adjusted < disputedAt,
		}
		if l.data.labels.Task == encode.Numbers {
			d.Says = figureText(doubt.Says)
		}
		for _, v := range doubt.Voices {
			d.Because = append(d.Because, l.data.rowName(l.data.labels.Rows[r.rowsBehind(l, v.Label)[0]]))
		}
		out.List = append(out.List, d)
	}
	return out, nil
}
