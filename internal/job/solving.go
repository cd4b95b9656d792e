package job

import (
	"context"
	"fmt"
	"math"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/graph"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// field is what is solved: a weighted graph with labels on it, and the answer.
type field struct {
	graph   *sparse.CSR // ln w
	fixed   []int32
	targets [][]float64 // one slice a class or one of numbers, by fixed vertex
	tether  float64     // 0 means held
	at      [][]int     // labels on each fixed vertex
	scores  [][]float64 // one slice a class or one of numbers, by vertex; NaN out of reach of any label
	solves  []SolveFigures
}

// solveField solves every class on every component at p. Components are solved apart, so that what one holds cannot
// change another's bits.
func (r *run) solveField(ctx context.Context, d *data, f *field, p float64) error {
	g, fixed, targets := f.graph, f.fixed, f.targets
	if f.tether > 0 {
		var err error
		if g, fixed, targets, err = tethered(d, f); err != nil {
			return err
		}
	}
	f.scores = make([][]float64, len(targets))
	for c := range f.scores {
		f.scores[c] = make([]float64, g.N)
		for i := range f.scores[c] {
			f.scores[c][i] = math.NaN()
		}
	}
	index := make([]int32, g.N) // vertex -> position in fixed, or -1
	for i := range index {
		index[i] = -1
	}
	for k, x := range fixed {
		index[x] = int32(k)
	}
	for part, piece := range sparse.Split(g) {
		if err := r.solvePart(ctx, d, f, part, piece, index, targets, p); err != nil {
			return err
		}
	}
	for c := range f.scores {
		f.scores[c] = f.scores[c][:f.graph.N]
	}
	return r.certified(f)
}

// tethered gives the graph with one extra vertex for each label, and what those are held at.
func tethered(d *data, f *field) (*sparse.CSR, []int32, [][]float64, error) {
	var ends []int32
	var labels []int
	for k, x := range f.fixed {
		for _, label := range f.at[k] {
			ends = append(ends, x)
			labels = append(labels, label)
		}
	}
	g, fixed, err := graph.Tether(f.graph, ends, math.Log(f.tether))
	if err != nil {
		return nil, nil, nil, err
	}
	targets := make([][]float64, len(f.targets))
	for c := range targets {
		targets[c] = make([]float64, len(labels))
		for t, k := range labels {
			switch {
			case d.labels.Task == encode.Numbers:
				targets[c][t] = d.labels.Value[k]
			case int(d.labels.Class[k]) == c:
				targets[c][t] = 1
			}
		}
	}
	return g, fixed, targets, nil
}

// solvePart solves one component.
func (r *run) solvePart(ctx context.Context, d *data, f *field, part int, piece sparse.Part, index []int32, targets [][]float64, p float64) error {
	prob := solve.Problem{Graph: piece.Graph, P: p, Energy: r.Energy}
	var held []int32
	for local, x := range piece.Vertices {
		if index[x] >= 0 {
			prob.Fixed = append(prob.Fixed, int32(local))
			held = append(held, index[x])
		}
	}
	if len(held) == 0 {
		return nil
	}
	values := make([][]float64, len(targets))
	for c := range targets {
		values[c] = make([]float64, len(held))
		for k, h := range held {
			values[c][k] = targets[c][h]
		}
	}
	results, err := solve.RunMany(ctx, prob, values, nil, solve.Settings{Tolerance: r.Tolerance, Workers: r.Workers, Progress: r.Progress})
	if err != nil {
		return err
	}
	for c, res := range results {
		for local, x := range piece.Vertices {
			f.scores[c][x] = res.Values[local]
		}
		what := r.Label
		if d.labels.Task == encode.Classes {
			what = d.labels.Names[c]
		}
		f.solves = append(f.solves, solveFigures(what, part, res))
	}
	return nil
}

func solveFigures(what string, part int, res solve.Result) SolveFigures {
	return SolveFigures{
		What: what, Component: part, Status: res.Status.String(),
		Gap: Number(res.Certificate.Gap), Imbalance: Number(res.Certificate.Imbalance), Width: Number(res.Certificate.Width),
		SlopeImbalance: Number(res.Certificate.SlopeImbalance),
		LinearSolves:   res.Counts.LinearSolves, Iterations: res.Counts.Iterations, Newton: res.Counts.Newton, Paths: res.Counts.Paths,
		missed: !res.Status.Proven(),
	}
}

// certified refuses a field in which a solve missed its tolerance, unless the user accepts that.
func (r *run) certified(f *field) error {
	var refused fault.List
	for _, s := range f.solves {
		if !s.missed {
			continue
		}
		text := fmt.Sprintf("solve of %s on component %d missed its tolerance: %s, value bound %.3g of the label range, gap %.3g, imbalance %.3g",
			fault.Quote(s.What), s.Component+1, s.Status, float64(s.Width), float64(s.Gap), worst(float64(s.Imbalance), float64(s.SlopeImbalance)))
		if r.AcceptUncertified {
			r.warn(encode.Warning{Code: "N01", Text: text})
			continue
		}
		refused.Add(&fault.Error{Exit: fault.Uncertified, Code: "N01", Message: text, Hint: "try a p nearer 2, a wider --bandwidth or a larger --tolerance; --accept-uncertified writes it all the same"})
	}
	return refused.Err()
}

// worst is the larger of two figures of which one may not apply.
func worst(a, b float64) float64 {
	switch {
	case math.IsNaN(a):
		return b
	case math.IsNaN(b):
		return a
	}
	return max(a, b)
}
