// Package study measures what trust and advise promise, on whole tables whose every label is known: coverage, set sizes,
// calibration, audits and what naming rows gains. Its tests print the figures of docs/trust.md and fail outside the
// bounds given there. -draws says over how many drawings of labels: by default a few and the small tables alone, 200 for
// the documented figures.
package study

import (
	"bytes"
	"context"
	"encoding/csv"
	"flag"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"testing"

	"pinfill/internal/choose"
	"pinfill/internal/demo"
	"pinfill/internal/graph"
	"pinfill/internal/laplace"
	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

var drawings = flag.Int("draws", 0, "drawings of labels that figures are averaged over; 0 skips the study")

// quick says that this is a run among other tests: a few drawings, the small tables alone.
func quick() bool { return *drawings < 8 }

// lab is a table with its graph.
type lab struct {
	name    string
	graph   *sparse.CSR // ln w
	conduct *sparse.CSR // w^2
	class   []int       // by vertex
	value   []float64   // by vertex, numbers
	classes int
	n       int
}

var open = map[string]func(t *testing.T) *lab{
	"iris":   func(t *testing.T) *lab { return openClasses(t, "iris") },
	"wine":   func(t *testing.T) *lab { return openClasses(t, "wine") },
	"digits": func(t *testing.T) *lab { return openClasses(t, "digits") },
	"seabed": func(t *testing.T) *lab { return demoTable(t, demo.SeabedFile, demo.SeabedTruthFile, false) },
	"clips":  func(t *testing.T) *lab { return demoTable(t, demo.ClipsFile, demo.ClipsTruthFile, false) },
	"grain":  func(t *testing.T) *lab { return demoTable(t, demo.GrainFile, demo.GrainTruthFile, true) },
	// Numbers in the open tables: one column from the others.
	"petal width": func(t *testing.T) *lab { return openNumbers(t, "iris", "petal_width_cm") },
	"proline":     func(t *testing.T) *lab { return openNumbers(t, "wine", "proline") },
}

var ready = map[string]*lab{}

func get(t *testing.T, name string) *lab {
	t.Helper()
	if ready[name] == nil {
		l := open[name](t)
		l.name = name
		ready[name] = l
	}
	return ready[name]
}

func openRows(t *testing.T, name string) [][]string {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "..", "..", "testdata", "open", name+".csv"))
	if err != nil {
		t.Fatal(err)
	}
	return parse(t, data)
}

func parse(t *testing.T, data []byte) [][]string {
	t.Helper()
	rows, err := csv.NewReader(bytes.NewReader(data)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func openClasses(t *testing.T, name string) *lab {
	rows := openRows(t, name)
	truth := make([]string, len(rows)-1)
	for i, r := range rows[1:] {
		truth[i] = r[len(r)-1]
	}
	return build(t, rows, func(c int) bool { return c > 0 && c < len(rows[0])-1 }, truth, false)
}

func openNumbers(t *testing.T, name, column string) *lab {
	rows := openRows(t, name)
	target := slices.Index(rows[0], column)
	truth := make([]string, len(rows)-1)
	for i, r := range rows[1:] {
		truth[i] = r[target]
	}
	return build(t, rows, func(c int) bool { return c > 0 && c < len(rows[0])-1 && c != target }, truth, true)
}

func demoTable(t *testing.T, table, truthFile string, numbers bool) *lab {
	var rows, truths [][]string
	for _, f := range demo.Files(demo.Seed) {
		switch f.Name {
		case table:
			rows = parse(t, f.Data)
		case truthFile:
			truths = parse(t, f.Data)
		}
	}
	truth := make([]string, len(rows)-1)
	for i, r := range truths[1:] {
		truth[i] = r[1]
	}
	return build(t, rows, func(c int) bool { return c > 0 && c < len(rows[0])-1 }, truth, numbers)
}

// build makes the graph as the program does by default: standard scale, ten neighbours, Gaussian kernel, local scale.
func build(t *testing.T, rows [][]string, feature func(c int) bool, truth []string, numbers bool) *lab {
	t.Helper()
	ctx := context.Background()
	var columns []int
	for c := range rows[0] {
		if feature(c) {
			columns = append(columns, c)
		}
	}
	raw := points.NewMatrix(len(rows)-1, len(columns))
	for i, r := range rows[1:] {
		for k, c := range columns {
			raw.Row(i)[k] = number(t, r[c])
		}
	}
	space, err := points.Prepare(ctx, raw, points.Options{})
	if err != nil {
		t.Fatal(err)
	}
	lists, _, err := neighbors.KNearest(ctx, space.Points, choose.DefaultNeighbors, neighbors.Options{})
	if err != nil {
		t.Fatal(err)
	}
	g, err := graph.FromLists(lists, choose.DefaultNeighbors, 0)
	if err != nil {
		t.Fatal(err)
	}
	band := graph.Bandwidth{Local: true, H: 1}
	w, err := g.LogWeights(graph.Gaussian, band, 0)
	if err != nil {
		t.Fatal(err)
	}
	// One component, so that any labels reach everywhere.
	reach, err := graph.FindReach(w, []int32{0})
	if err != nil {
		t.Fatal(err)
	}
	if len(reach.Unlabelled()) > 0 {
		if w, _, err = g.Join(ctx, w, reach, space.Points, graph.Gaussian, band, neighbors.Options{}); err != nil {
			t.Fatal(err)
		}
	}
	l := &lab{graph: w, conduct: choose.Conductances(w, solve.Slope), n: w.N}
	names := slices.Compact(slices.Sorted(slices.Values(truth)))
	l.class, l.value, l.classes = make([]int, l.n), make([]float64, l.n), len(names)
	for i := len(truth) - 1; i >= 0; i-- {
		v := space.Vertex[i]
		if numbers {
			l.value[v] = number(t, truth[i])
		} else {
			l.class[v], _ = slices.BinarySearch(names, truth[i])
		}
	}
	if numbers {
		l.classes = 0
	}
	return l
}

// draw picks count vertices at random, increasing.
func (l *lab) draw(r *rand.Rand, count int) []int32 {
	var at []int32
	for _, v := range r.Perm(l.n)[:count] {
		at = append(at, int32(v))
	}
	slices.Sort(at)
	return at
}

func (l *lab) labels(at []int32, class func(k int) int) choose.Labels {
	s := choose.Labels{Vertex: at, Target: make([][]float64, l.classes)}
	for c := range s.Target {
		s.Target[c] = make([]float64, len(at))
	}
	for k := range at {
		s.Target[class(k)][k] = 1
	}
	return s
}

// answer is a solved table: balanced shares by vertex and left-out ones by label.
type answer struct {
	labels  choose.Labels
	scores  [][]float64 // class by vertex
	weights choose.Weights
	leftOut [][]float64 // label by class, shares
	given   []int
}

// solveClasses solves and leaves out at p.
func (l *lab) solveClasses(t *testing.T, s choose.Labels, p float64, mode choose.Mode) *answer {
	t.Helper()
	ctx := context.Background()
	problem := solve.Problem{Graph: l.graph, P: p, Energy: solve.Slope}
	scores, _, err := choose.Solve(ctx, problem, s, nil, solve.Settings{Tolerance: 1e-6})
	if err != nil {
		t.Fatal(err)
	}
	a := &answer{labels: s, scores: scores, given: make([]int, len(s.Vertex))}
	balance := choose.Balance{Mode: mode}
	if a.weights, err = balance.Weigh(problem, scores, s, 0); err != nil {
		t.Fatal(err)
	}
	left, err := choose.LeaveOut(ctx, problem, s, choose.LeaveOptions{Start: scores, Tolerance: 1e-6})
	if err != nil {
		t.Fatal(err)
	}
	whole, err := choose.Balance{Mode: aim(mode)}.Mass(scores, s)
	if err != nil {
		t.Fatal(err)
	}
	for k := range s.Vertex {
		a.given[k] = s.Class(k)
		w := leftWeights(a.weights, whole, left, int(left.Fold[k]), mode, s)
		a.leftOut = append(a.leftOut, w.Shares(nil, func(c int) float64 { return left.Score[k][c] }))
	}
	return a
}

// leftWeights are the weights of an answer without a fold: the whole answer's weights, moved as mass normalisation
// moves when the fold is left out.
func leftWeights(w, whole choose.Weights, left *choose.LeftOut, fold int, mode choose.Mode, s choose.Labels) choose.Weights {
	if mode == choose.NoBalance {
		return w
	}
	// The shares that a left-out answer aims at must not count the labels that are left out.
	rest := choose.Labels{Task: s.Task, Target: make([][]float64, len(s.Target))}
	for k, f := range left.Fold {
		if int(f) == fold {
			continue
		}
		rest.Vertex = append(rest.Vertex, s.Vertex[k])
		for c := range s.Target {
			rest.Target[c] = append(rest.Target[c], s.Target[c][k])
		}
	}
	part := choose.LeftWeights(left, fold, choose.Balance{Mode: aim(mode)}, rest)
	out := make(choose.Weights, len(w))
	for c := range w {
		out[c] = w[c] * part[c] / whole[c]
	}
	return out
}

// aim is the mass normalisation by which a mode's weights are moved.
func aim(mode choose.Mode) choose.Mode {
	if mode == choose.AutoBalance {
		return choose.FromLabels
	}
	return mode
}

// shares gives the balanced scores of a vertex.
func (a *answer) shares(dst []float64, v int) []float64 {
	return a.weights.Shares(dst, func(c int) float64 { return a.scores[c][v] })
}

// free lists the vertices without a label.
func (l *lab) free(at []int32) []int {
	var out []int
	for v := range l.n {
		if _, held := slices.BinarySearch(at, int32(v)); !held {
			out = append(out, v)
		}
	}
	return out
}

func (l *lab) accuracy(a *answer) float64 {
	right, all := 0.0, 0.0
	for _, v := range l.free(a.labels.Vertex) {
		all++
		if a.weights.Decide(func(c int) float64 { return a.scores[c][v] }) == l.class[v] {
			right++
		}
	}
	return right / all
}

func (l *lab) system(t *testing.T, at []int32) *laplace.System {
	t.Helper()
	s, err := laplace.New(context.Background(), l.conduct, at, laplace.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// mean of the numbers seen so far.
type mean struct {
	sum, square float64
	n           int
}

func (m *mean) add(v float64) { m.sum += v; m.square += v * v; m.n++ }

func (m *mean) value() float64 { return m.sum / float64(m.n) }

// se is the standard error of the mean.
func (m *mean) se() float64 {
	v := m.square/float64(m.n) - m.value()*m.value()
	return math.Sqrt(max(v, 0) / float64(max(m.n-1, 1)))
}
