package job

import (
	"fmt"
	"strings"

	"pinfill/internal/encode"
	"pinfill/internal/graph"
	"pinfill/internal/sparse"
)

// Version of the program; it stands in records and model files.
const Version = "0.1.0"

// newRecord starts the record of a command.
func (r *run) newRecord(command string, d *data) *Record {
	return &Record{
		Program: "pinfill", Version: Version, Modules: modules(), Format: recordFormat, Command: command, Flags: r.Flags,
		Table: TableFigures{Rows: d.table.Rows(), Columns: d.table.Columns()}, Caution: Caution,
	}
}

// fillRecord puts in what is known once the result is.
func (r *run) fillRecord(l *labelled) {
	rec, d := l.record, l.data
	rec.Inputs = d.inputs
	rec.tableFigures(d, l.network.vertices)
	rec.Settings = r.settingFigures(l)
	if l.network.given == nil {
		rec.Graph.Search = l.network.search.Engine
		rec.Graph.Recall = Number(l.network.search.Recall)
	}
	rec.Solves = l.field.solves
	rec.Result = resultFigures(l.result)
	rec.Warnings = r.warnings
	if rec.Warnings == nil {
		rec.Warnings = []encode.Warning{} // an empty list, never null
	}
}

func (rec *Record) tableFigures(d *data, v *vertices) {
	t := &rec.Table
	t.Memory = d.memory
	t.Vertices, t.Labelled, t.Task = v.n, len(d.labels.Rows), string(d.labels.Task)
	if d.features != nil {
		t.Features = d.features.Names
		for _, c := range v.space.Constant {
			t.Dropped = append(t.Dropped, d.features.Names[c])
		}
	}
	if d.labels.Task == encode.Classes {
		byClass := make([]int, len(d.labels.Names))
		for _, c := range d.labels.Class {
			byClass[c]++
		}
		for c, n := range byClass {
			t.Classes = append(t.Classes, ClassCount{d.labels.Names[c], n})
		}
		return
	}
	lo, hi := d.labels.Value[0], d.labels.Value[0]
	for _, v := range d.labels.Value {
		lo, hi = min(lo, v), max(hi, v)
	}
	a, b := Number(lo), Number(hi)
	t.Low, t.High = &a, &b
}

// measure fills in the graph's health.
func (g *GraphFigures) measure(w *sparse.CSR, workers int) graph.Health {
	h := graph.Measure(w, workers)
	g.Vertices, g.Edges = h.Vertices, h.Edges
	g.MinDegree, g.MedianDegree, g.MaxDegree = h.DegreeMin, h.DegreeMedian, h.DegreeMax
	g.LogWeightLow, g.LogWeightHigh = Number(h.LogMin), Number(h.LogMax)
	return h
}

// summary says in a few lines what came out, at most twelve.
func (r *run) summary(l *labelled) {
	rec := l.record
	res := rec.Result
	r.note("%s: %d rows, %d labelled (%s), %d features, %d edges", r.Table, rec.Table.Rows, rec.Table.Labelled, labelText(rec.Table), len(rec.Table.Features), rec.Graph.Edges)
	r.note("settings: %s", settingText(rec.Settings))
	if rec.Choice != nil {
		r.note("chosen: %s", rec.Choice.Reason)
	}
	line := fmt.Sprintf("result: %d given, %d inferred", res.Given, res.Inferred)
	for _, part := range []struct {
		n    int
		what string
	}{{res.Bridged, "bridged"}, {res.Abstained, "abstained"}, {res.Blank, "blank"}} {
		if part.n > 0 {
			line += fmt.Sprintf(", %d %s", part.n, part.what)
		}
	}
	r.note("%s", line)
	if rec.Trust != nil {
		r.note("trust: %s", rec.Trust.sentence())
	}
	r.note("certified: values within %.1g of the label range of the minimiser in every solve (%s)", rec.worstWidth(), plural(len(rec.Solves), "solve"))
	var files []string
	for _, o := range rec.Outputs {
		if o.Name != "-" {
			files = append(files, o.Name)
		}
	}
	if r.Record != "" {
		files = append(files, r.Record)
	}
	if len(files) > 0 {
		r.note("written: %s", strings.Join(files, ", "))
	}
}

// plural writes a number of things.
func plural(n int, thing string) string {
	if n == 1 {
		return "1 " + thing
	}
	return fmt.Sprintf("%d %ss", n, thing)
}

func labelText(t TableFigures) string {
	if t.Task == string(encode.Classes) {
		return fmt.Sprintf("%d classes", len(t.Classes))
	}
	return fmt.Sprintf("numbers from %s to %s", encode.AppendNumber(nil, float64(*t.Low)), encode.AppendNumber(nil, float64(*t.High)))
}

func settingText(s Settings) string {
	text := "p=" + PText(float64(s.P)) + ", " + s.Energy
	switch {
	case s.Radius > 0:
		text += fmt.Sprintf(", radius %v", float64(s.Radius))
	case s.Neighbors > 0:
		text += fmt.Sprintf(", %d neighbours", s.Neighbors)
	default:
		return text + ", given graph" + balanceText(s)
	}
	return text + fmt.Sprintf(", %s kernel, bandwidth %s", s.Kernel, s.Bandwidth) + balanceText(s)
}

func balanceText(s Settings) string {
	if s.Balance == "" {
		return ""
	}
	return ", balance " + s.Balance
}

// worstWidth is the largest value bound of the record's solves (the slope imbalance at p = inf).
func (rec *Record) worstWidth() float64 {
	w := 0.0
	for _, s := range rec.Solves {
		if v := float64(s.Width); v > w {
			w = v
		} else if v != v && float64(s.SlopeImbalance) > w {
			w = float64(s.SlopeImbalance)
		}
	}
	return w
}
