package choose

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// sheet is n points on a square, their graphs as a Source, and a value at each.
func sheet(t testing.TB, r *rand.Rand, n int, value func(x, y float64) float64) (Source, []float64) {
	t.Helper()
	raw := points.NewMatrix(n, 2)
	for i := range raw.Data {
		raw.Data[i] = r.Float64()
	}
	s, err := points.Prepare(context.Background(), raw, points.Options{Scale: "none"})
	if err != nil {
		t.Fatal(err)
	}
	lists, _, err := neighbors.KNearest(context.Background(), s.Points, 12, neighbors.Options{})
	if err != nil {
		t.Fatal(err)
	}
	v := make([]float64, n)
	for i := range v {
		x := s.Points.Row(i)
		v[i] = value(x[0], x[1])
	}
	return func(_ context.Context, s Setting) (*sparse.CSR, error) {
		g, err := graph.FromLists(lists, s.Neighbors, 0)
		if err != nil {
			return nil, err
		}
		return g.LogWeights(s.Kernel, s.Bandwidth, 0)
	}, v
}

// label takes the values at count random vertices; classes > 0 makes them classes.
func label(r *rand.Rand, v []float64, count, classes int) Labels {
	vs := r.Perm(len(v))[:count]
	slices.Sort(vs)
	l := Labels{Task: Numbers, Target: [][]float64{nil}}
	if classes > 0 {
		l = Labels{Target: make([][]float64, classes)}
	}
	for _, x := range vs {
		l.Vertex = append(l.Vertex, int32(x))
		if classes == 0 {
			l.Target[0] = append(l.Target[0], v[x])
			continue
		}
		for c := range l.Target {
			y := 0.0
			if int(v[x]) == c {
				y = 1
			}
			l.Target[c] = append(l.Target[c], y)
		}
	}
	return l
}

func TestAutoSmoothNumbersKeepTheDefault(t *testing.T) {
	r := rand.New(rand.NewPCG(81, 5))
	source, v := sheet(t, r, 300, func(x, y float64) float64 { return x + y })
	d, err := Auto(context.Background(), source, label(r, v, 30, 0), Asked{}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if d.P < 3 || !d.Chosen.Certified || !d.Chosen.Advised || len(d.Scores) != len(numberPs) {
		t.Errorf("p %v of %d tried: %s", d.P, len(d.Scores), d.Reason)
	}
	if !strings.Contains(d.Reason, "default for numbers") {
		t.Errorf("reason %q", d.Reason)
	}
}

// White noise is best answered by a mean of many labels: p = 2, which averages, must win over p = 6.
func TestAutoNoiseMovesToTwo(t *testing.T) {
	r := rand.New(rand.NewPCG(82, 5))
	source, v := sheet(t, r, 400, func(_, _ float64) float64 { return r.NormFloat64() })
	d, err := Auto(context.Background(), source, label(r, v, 200, 0), Asked{}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if d.P != 2 || !strings.Contains(d.Reason, "more than the noise") {
		t.Errorf("p %v: %s", d.P, d.Reason)
	}
}

func TestAutoFewLabelsSaysSo(t *testing.T) {
	r := rand.New(rand.NewPCG(83, 5))
	source, v := sheet(t, r, 200, func(x, _ float64) float64 { return math.Floor(2 * x) })
	l := label(r, v, 4, 2)
	for l.PerClass()[0] != 2 {
		l = label(r, v, 4, 2)
	}
	d, err := Auto(context.Background(), source, l, Asked{}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if d.P != 2 || len(d.Scores) != 1 || !strings.Contains(d.Reason, "too few to leave some out") {
		t.Errorf("p %v of %d tried: %s", d.P, len(d.Scores), d.Reason)
	}
	l = label(r, v, 12, 2)
	l.Group = make([]int32, 12) // one group: nothing can be left out
	if d, err = Auto(context.Background(), source, l, Asked{}, Options{}); err != nil || len(d.Scores) != 1 {
		t.Errorf("one group: %v, %v", d, err)
	}
}

func TestAutoAsAsked(t *testing.T) {
	r := rand.New(rand.NewPCG(84, 5))
	source, v := sheet(t, r, 200, func(x, _ float64) float64 { return math.Floor(3 * x) })
	a := Asked{P: []float64{4}, Neighbors: []int{8}, Kernel: []graph.Kernel{graph.Exponential}, Bandwidth: []graph.Bandwidth{{Local: true, H: 2}}, Balance: Balance{Mode: Uniform}}
	d, err := Auto(context.Background(), source, label(r, v, 20, 3), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if d.P != 4 || d.Neighbors != 8 || d.Kernel != graph.Exponential || d.Bandwidth.H != 2 || d.Balance.Mode != Uniform || !strings.Contains(d.Reason, "as asked") {
		t.Errorf("%+v: %s", d.Setting, d.Reason)
	}
}

// Classes renamed are classes renamed in the answer; workers change no bit.
func TestAutoFollowsClassesAndIgnoresWorkers(t *testing.T) {
	r := rand.New(rand.NewPCG(85, 5))
	source, v := sheet(t, r, 250, func(x, y float64) float64 { return math.Floor(3 * x * y * 1.3) })
	l := label(r, v, 24, 3)
	m := l
	m.Target = [][]float64{l.Target[2], l.Target[0], l.Target[1]}
	one, err := Auto(context.Background(), source, l, Asked{}, Options{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	four, err := Auto(context.Background(), source, l, Asked{}, Options{Workers: 4})
	if err != nil {
		t.Fatal(err)
	}
	turned, err := Auto(context.Background(), source, m, Asked{}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if one.Reason != four.Reason || one.P != turned.P {
		t.Fatalf("%s / %s / %s", one.Reason, four.Reason, turned.Reason)
	}
	for c := range one.Chosen.Fields {
		if !slices.Equal(one.Chosen.Fields[c], four.Chosen.Fields[c]) || one.Chosen.Weights[c] != four.Chosen.Weights[c] {
			t.Fatalf("class %d: another number of workers gives other bits", c)
		}
		to := (c + 1) % 3
		if math.Abs(one.Chosen.Weights[c]-turned.Chosen.Weights[to]) > 1e-9 {
			t.Errorf("class %d: weight %v, renamed %v", c, one.Chosen.Weights[c], turned.Chosen.Weights[to])
		}
	}
}

func TestSweepAgreesWithSolving(t *testing.T) {
	r := rand.New(rand.NewPCG(86, 5))
	source, v := sheet(t, r, 200, func(x, y float64) float64 { return math.Sin(4*x) + y })
	l := label(r, v, 20, 0)
	var settings []Setting
	for _, p := range []float64{8, 2, math.Inf(1), 1.7, 3} {
		settings = append(settings, Setting{P: p, Neighbors: 10, Bandwidth: graph.Bandwidth{Local: true, H: 1}})
	}
	c, err := Sweep(context.Background(), source, l, settings, Options{Scores: true})
	if err != nil {
		t.Fatal(err)
	}
	for i, s := range c.Scores {
		if s.P != settings[i].P || !s.Certified {
			t.Fatalf("setting %d: %+v", i, s.Setting)
		}
		g, _ := source(context.Background(), settings[i])
		want, _, err := Solve(context.Background(), solve.Problem{Graph: g, P: s.P}, l, nil, solve.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		for x := range want[0] {
			if !near(s.Fields[0][x], want[0][x], 2e-9*3) {
				t.Fatalf("p %v vertex %d: %v after another p, %v from nothing", s.P, x, s.Fields[0][x], want[0][x])
			}
		}
		if math.IsNaN(s.Error) || s.LeftOut != 20 {
			t.Errorf("p %v: left-out error %v over %d", s.P, s.Error, s.LeftOut)
		}
		for j := range c.Scores {
			a := c.Agreement[i][j]
			if a != c.Agreement[j][i] || !(a > 0 && a <= 1) || (i == j) != (a == 1) {
				t.Errorf("agreement of %d and %d: %v", i, j, a)
			}
		}
	}
}

// A square has no gaps, two clusters have: the contrast tells them apart, and with it the first candidate.
func TestContrastTellsGaps(t *testing.T) {
	r := rand.New(rand.NewPCG(87, 5))
	source, v := sheet(t, r, 400, func(x, _ float64) float64 { return math.Floor(2 * x) })
	even, err := contrast(context.Background(), source, Setting{Neighbors: 10})
	if err != nil || !(even > .8 && even < evenBelow) {
		t.Errorf("square: contrast %v, %v", even, err)
	}
	d, err := Auto(context.Background(), source, label(r, v, 8, 2), Asked{}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if d.Scores[0].P != 2 || d.Balance.Mode != FromLabels || !strings.Contains(d.Reason, "without gaps") {
		t.Errorf("square: p %v, balance %v: %s", d.P, d.Balance.Mode, d.Reason)
	}
	if c := contrastOf(network(3, []edge{{0, 1, 1}, {1, 2, 1}})); !math.IsNaN(c) {
		t.Errorf("too few neighbours: contrast %v", c)
	}
}
