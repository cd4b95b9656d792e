package job

import (
	"fmt"
	"math"
	"slices"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/graph"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// field is what is solved: a weighted graph with labels on it, and the answer.
type field struct {
	graph  *sparse.CSR   // ln w, components without a label settled, tethers added
	labels choose.Labels // on the graph's vertices; with tethers on the extra vertices that stand for the labels
	n      int           // vertices of the table; the graph has more with tethers
	scores [][]float64   // one slice a class or one of numbers, by vertex; NaN out of reach of any label
	solves []SolveFigures
}

// labelsOf gives the labels on the vertices they are held at.
func (r *run) labelsOf(d *data, v *vertices) choose.Labels {
	l := choose.Labels{Task: choose.Classes, Vertex: v.fixed, Target: v.targets}
	if d.labels.Task == encode.Numbers {
		l.Task = choose.Numbers
	}
	if d.group != nil {
		l.Group = groupsOf(d, v.at)
	}
	return l
}

// groupsOf numbers the group of each labelled vertex; labels of one vertex are of one group.
func groupsOf(d *data, at [][]int) []int32 {
	names := slices.Clone(d.group)
	slices.Sort(names)
	names = slices.Compact(names)
	groups := make([]int32, len(at))
	for f, ks := range at {
		g, _ := slices.BinarySearch(names, d.group[ks[0]])
		groups[f] = int32(g)
	}
	return groups
}

// tethered gives the graph with one extra vertex for each label, and the labels on those.
func (r *run) tethered(d *data, v *vertices, w *sparse.CSR) (*sparse.CSR, choose.Labels, error) {
	l := r.labelsOf(d, v)
	var ends []int32
	var from, which []int // fixed vertex and label behind each tether
	for f, x := range v.fixed {
		for _, k := range v.at[f] {
			ends = append(ends, x)
			from = append(from, f)
			which = append(which, k)
		}
	}
	g, fixed, err := graph.Tether(w, ends, math.Log(r.Tether))
	if err != nil {
		return nil, l, err
	}
	t := choose.Labels{Task: l.Task, Vertex: fixed, Target: make([][]float64, len(l.Target))}
	for c := range t.Target {
		t.Target[c] = make([]float64, len(which))
		for i, k := range which {
			switch {
			case l.Task == choose.Numbers:
				t.Target[c][i] = d.labels.Value[k]
			case int(d.labels.Class[k]) == c:
				t.Target[c][i] = 1
			}
		}
	}
	if l.Group != nil {
		for _, f := range from {
			t.Group = append(t.Group, l.Group[f])
		}
	}
	return g, t, nil
}

// problem is the solver's view of a field.
func (r *run) problem(f *field, p float64) solve.Problem {
	return solve.Problem{Graph: f.graph, P: p, Energy: r.Energy}
}

func (r *run) solveSettings() solve.Settings {
	return solve.Settings{Tolerance: r.Tolerance, Workers: r.Workers}
}

// takeScores keeps the chosen solution and its certificates.
func (r *run) takeScores(d *data, f *field, s *choose.Score) error {
	f.scores = make([][]float64, len(s.Fields))
	for c := range f.scores {
		f.scores[c] = s.Fields[c][:f.n]
	}
	classes := len(s.Fields)
	for i, res := range s.Solves {
		what := r.Label
		if d.labels.Task == encode.Classes {
			what = d.labels.Names[i%classes]
		}
		f.solves = append(f.solves, solveFigures(what, i/classes, res))
	}
	return r.certified(f)
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
