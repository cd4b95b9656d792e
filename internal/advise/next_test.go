package advise

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"pinfill/internal/laplace"
)

// dense is the inverse of the grounded Laplacian, bordered with zeros for labelled vertices.
func dense(w [][]float64, labelled []int32) *mat.Dense {
	n := len(w)
	a := mat.NewDense(n, n, nil)
	held := make([]bool, n)
	for _, v := range labelled {
		held[v] = true
	}
	for i := range n {
		if held[i] {
			a.Set(i, i, 1)
			continue
		}
		for j, v := range w[i] {
			a.Set(i, i, a.At(i, i)+v)
			if !held[j] && j != i {
				a.Set(i, j, -v)
			}
		}
	}
	var g mat.Dense
	if err := g.Inverse(a); err != nil {
		panic(err)
	}
	for _, v := range labelled {
		g.Set(int(v), int(v), 0)
	}
	return &g
}

// slow names vertices by the definition: a dense inverse, all scores, a rank-one down-date.
func slow(p NextProblem, w [][]float64) (vertex []int32, gain []float64) {
	g := dense(w, p.Labelled)
	n := len(w)
	out := make([]bool, n)
	r := make([]float64, n)
	for v := range n {
		r[v] = p.rows(v) * max(p.doubt(v), doubtFloor)
		out[v] = p.excluded(v)
	}
	for _, v := range p.Labelled {
		out[v], r[v] = true, 0
	}
	for range p.Count {
		best, at, left := 0.0, -1, 0.0
		for k := range n {
			var s float64
			for x := range n {
				s += r[x] * g.At(x, k)
				left += r[x] * r[k] * g.At(x, k)
			}
			if t := s * s / g.At(k, k) / p.cost(k); !out[k] && t > best {
				best, at = t, k
			}
		}
		if at < 0 {
			break
		}
		vertex, gain = append(vertex, int32(at)), append(gain, best*p.cost(at)/left)
		own := g.At(at, at)
		column := mat.Col(nil, at, g)
		for i := range n {
			for j := range n {
				g.Set(i, j, g.At(i, j)-column[i]*column[j]/own)
			}
		}
		out[at], r[at] = true, 0
	}
	return vertex, gain
}

func TestNextAgainstTheDefinition(t *testing.T) {
	for seed := range uint64(40) {
		r := rand.New(rand.NewPCG(61, seed))
		n := 20 + r.IntN(40)
		w := random(r, n, 2*n)
		p := NextProblem{Conductance: network(w), Labelled: []int32{2, 9}, Count: 6}
		if seed%2 == 1 {
			for range n {
				p.Rows = append(p.Rows, float64(1+r.IntN(3)))
				p.Doubt = append(p.Doubt, r.Float64())
				p.Cost = append(p.Cost, .5+r.Float64())
				p.Exclude = append(p.Exclude, r.IntN(4) == 0)
			}
		}
		got, err := Next(context.Background(), p)
		if err != nil {
			t.Fatal(err)
		}
		want, gain := slow(p, w)
		for k, q := range got {
			if q.Vertex != want[k] {
				t.Fatalf("graph %d, pick %d: vertex %d, want %d", seed, k, q.Vertex, want[k])
			}
			near(t, "gain", q.Gain, gain[k], 1e-4)
		}
		if len(got) != len(want) {
			t.Errorf("%d picks, want %d", len(got), len(want))
		}
	}
}

// With estimated diagonals the picks may differ; what they remove in all must not fall far behind.
func TestNextByProbes(t *testing.T) {
	r := rand.New(rand.NewPCG(62, 0))
	const n = 200
	w := random(r, n, 3*n)
	p := NextProblem{Conductance: network(w), Labelled: []int32{5}, Count: 8}
	system, err := laplace.New(context.Background(), p.Conductance, p.Labelled, laplace.Options{})
	if err != nil {
		t.Fatal(err)
	}
	g := &greedy{p: &p, system: system, column: map[int32][]float64{}}
	if err := g.start(context.Background(), p.Labelled); err != nil {
		t.Fatal(err)
	}
	truth := dense(w, p.Labelled)
	if g.diag, err = g.probeDiagonal(context.Background()); err != nil {
		t.Fatal(err)
	}
	var off float64
	for v := range n {
		if v == 5 {
			continue
		}
		g.exact[v] = false
		off += math.Abs(g.diag[v]/truth.At(v, v)-1) / n
	}
	if off > .35 {
		t.Errorf("estimated diagonals are off by %.2f on average", off)
	}
	left := 1.0
	for range p.Count {
		pick, err := g.next(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		left *= 1 - pick.Gain
	}
	best := 1.0
	_, gain := slow(p, w)
	for _, v := range gain {
		best *= 1 - v
	}
	if 1-left < .97*(1-best) {
		t.Errorf("doubt left %.4f, by the definition %.4f", left, best)
	}
}

func TestNextReasons(t *testing.T) {
	// A labelled path, a larger and a smaller component without a label, and one where nothing may be named.
	w := make([][]float64, 40)
	for i := range w {
		w[i] = make([]float64, 40)
	}
	chain := func(lo, hi int) {
		for i := lo; i < hi; i++ {
			w[i][i+1], w[i+1][i] = 1, 1
		}
	}
	chain(0, 19)
	chain(20, 24)
	chain(25, 34)
	chain(35, 39)
	p := NextProblem{Conductance: network(w), Labelled: []int32{0}, Count: 4, Exclude: make([]bool, 40)}
	for v := 35; v < 40; v++ {
		p.Exclude[v] = true
	}
	picks, err := Next(context.Background(), p)
	if err != nil {
		t.Fatal(err)
	}
	if len(picks) != 4 || picks[0].Reason != Unreached || picks[0].Follows != 10 || picks[1].Reason != Unreached || picks[1].Follows != 5 {
		t.Fatalf("%+v", picks)
	}
	if v := picks[2].Vertex; picks[2].Reason == Unreached || v < 12 || v > 19 {
		t.Errorf("far end of the path: %+v", picks[2])
	}
	if !strings.Contains(picks[0].Sentence(), "no label in its part of the data; about 10 rows") || Reason(9).String() != "Reason(9)" {
		t.Error(picks[0].Sentence())
	}
	// Everything may be named, and no more than there is.
	picks, err = Next(context.Background(), NextProblem{Conductance: network(w), Count: 100})
	if err != nil || len(picks) != 40 {
		t.Fatalf("%d picks, %v", len(picks), err)
	}
	seen := map[int32]bool{}
	for _, q := range picks {
		if seen[q.Vertex] {
			t.Errorf("vertex %d named twice", q.Vertex)
		}
		seen[q.Vertex] = true
	}
	// A boundary says so.
	doubt := make([]float64, 40)
	doubt[10] = 1
	picks, err = Next(context.Background(), NextProblem{Conductance: network(w), Labelled: []int32{0, 19, 20, 25, 35}, Doubt: doubt, Count: 1})
	if err != nil || picks[0].Vertex != 10 || picks[0].Reason != Boundary {
		t.Errorf("%+v, %v", picks, err)
	}
}

func TestNextRefuses(t *testing.T) {
	g := network([][]float64{{0, 1}, {1, 0}})
	for _, p := range []NextProblem{
		{},
		{Conductance: g, Rows: []float64{1}},
		{Conductance: g, Cost: []float64{1, 0}},
		{Conductance: g, Cost: []float64{math.NaN(), 1}},
		{Conductance: g, Labelled: []int32{1, 0}},
		{Conductance: g, Labelled: []int32{2}},
		{Conductance: g, Exclude: []bool{true}},
	} {
		p.Count = 1
		if _, err := Next(context.Background(), p); err == nil {
			t.Errorf("%+v accepted", p)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Next(ctx, NextProblem{Conductance: g, Labelled: []int32{0}, Count: 1}); err == nil {
		t.Error("a context that ended went unnoticed")
	}
}

func TestNextForAnyWorkers(t *testing.T) {
	r := rand.New(rand.NewPCG(63, 0))
	p := NextProblem{Conductance: network(random(r, 900, 2500)), Labelled: []int32{1, 2, 3}, Count: 5, Workers: 1}
	one, err := Next(context.Background(), p)
	if err != nil {
		t.Fatal(err)
	}
	p.Workers = 3
	three, err := Next(context.Background(), p)
	if err != nil || !slices.Equal(one, three) {
		t.Errorf("%v\n%v\n%v", one, three, err)
	}
}
