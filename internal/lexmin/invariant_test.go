package lexmin

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/sparse"
	"pinfill/internal/testproblems"
)

// within is the share of the label range by which two solves of equivalent problems may differ.
const within = 1e-9

func each(t *testing.T, count uint64, do func(seed uint64, pr testproblems.Problem, f []float64)) {
	t.Helper()
	for seed := range count {
		pr := testproblems.Random(seed+5000, inf, mixed[seed%uint64(len(mixed))])
		do(seed, pr, solve(t, pr, 1))
	}
}

func mapped(y []float64, to func(float64) float64) []float64 {
	out := make([]float64, len(y))
	for i, v := range y {
		out[i] = to(v)
	}
	return out
}

func TestLabelsAndRange(t *testing.T) {
	each(t, 100, func(_ uint64, pr testproblems.Problem, f []float64) {
		low, high := slices.Min(pr.Values), slices.Max(pr.Values)
		for v, y := range f {
			if !(y >= low && y <= high) {
				t.Errorf("%s: vertex %d has %v outside [%v, %v]", pr.Name, v, y, low, high)
			}
		}
		for i, v := range pr.Fixed {
			if f[v] != pr.Values[i] {
				t.Errorf("%s: vertex %d came back as %v, was %v", pr.Name, v, f[v], pr.Values[i])
			}
		}
	})
}

// f(a y + b) = a f(y) + b, to the bit for a power of two and b = 0; also with labels 1e9 and 1e9 + 1e-6.
func TestValuesShiftAndScale(t *testing.T) {
	each(t, 100, func(_ uint64, pr testproblems.Problem, f []float64) {
		q := pr
		for _, c := range []struct{ a, b, tolerance float64 }{
			{0x1p40, 0, 0},
			{0x1p-900, 0, 0},
			{3.7, -11, within},
			{-1, 0, within},
			{1e-6, 1e9, .25 / pr.Range()}, // 1e9 + 1e-6 y keeps y to .06, and so does what comes back
		} {
			q.Values = mapped(pr.Values, func(y float64) float64 { return c.a*y + c.b })
			got := mapped(solve(t, q, 1), func(y float64) float64 { return (y - c.b) / c.a })
			if e := testproblems.Distance(got, f) / pr.Range(); !(e <= c.tolerance) {
				t.Errorf("%s: a=%g b=%g: %g off", pr.Name, c.a, c.b, e)
			}
		}
	})
}

// Vertices renumbered at random keep their values.
func TestRenumbering(t *testing.T) {
	each(t, 100, func(seed uint64, pr testproblems.Problem, f []float64) {
		perm := rand.New(rand.NewPCG(seed, 3)).Perm(pr.Graph.N)
		var edges []testproblems.Edge
		for i := range pr.Graph.N {
			cols, vals := pr.Graph.Row(i)
			for k, j := range cols {
				if int(j) > i {
					edges = append(edges, testproblems.Edge{I: perm[i], J: perm[j], LogW: vals[k]})
				}
			}
		}
		q := pr
		q.Graph = testproblems.Graph(pr.Graph.N, edges)
		order := make([]int, len(pr.Fixed))
		for i := range order {
			order[i] = i
		}
		slices.SortFunc(order, func(a, b int) int { return perm[pr.Fixed[a]] - perm[pr.Fixed[b]] })
		q.Fixed, q.Values = nil, nil
		for _, i := range order {
			q.Fixed = append(q.Fixed, int32(perm[pr.Fixed[i]]))
			q.Values = append(q.Values, pr.Values[i])
		}
		got := solve(t, q, 1)
		for v := range f {
			if !(math.Abs(got[perm[v]]-f[v]) <= within*pr.Range()) {
				t.Errorf("%s: vertex %d: %v, renumbered %v", pr.Name, v, f[v], got[perm[v]])
			}
		}
	})
}

// A graph laid twice over itself, joined at the labels: the automorphism that swaps the copies leaves values alike, and
// they are those of one copy, for a second copy of every path changes no slope.
func TestAutomorphism(t *testing.T) {
	each(t, 100, func(_ uint64, pr testproblems.Problem, f []float64) {
		n := pr.Graph.N
		twin := func(v int) int {
			if _, isHeld := slices.BinarySearch(pr.Fixed, int32(v)); isHeld {
				return v
			}
			return v + n
		}
		var edges []testproblems.Edge
		for i := range n {
			cols, vals := pr.Graph.Row(i)
			for k, j := range cols {
				if int(j) <= i {
					continue
				}
				edges = append(edges, testproblems.Edge{I: i, J: int(j), LogW: vals[k]})
				if a, b := twin(i), twin(int(j)); a != i || b != int(j) {
					edges = append(edges, testproblems.Edge{I: a, J: b, LogW: vals[k]})
				}
			}
		}
		// Twins of held vertices stand alone: tie them to the graph by hanging them on vertex 0.
		for _, v := range pr.Fixed {
			edges = append(edges, testproblems.Edge{I: 0, J: int(v) + n, LogW: -2})
		}
		q := pr
		q.Graph = testproblems.Graph(2*n, edges)
		got := solve(t, q, 1)
		for v := range n {
			if !(math.Abs(got[v]-got[twin(v)]) <= within*pr.Range() && math.Abs(got[v]-f[v]) <= within*pr.Range()) {
				t.Errorf("%s: vertex %d: %v, twin %v, alone %v", pr.Name, v, got[v], got[twin(v)], f[v])
			}
		}
	})
}

// y <= y' gives f <= f'.
func TestComparison(t *testing.T) {
	each(t, 100, func(seed uint64, pr testproblems.Problem, f []float64) {
		rng := rand.New(rand.NewPCG(seed, 4))
		q := pr
		q.Values = mapped(pr.Values, func(y float64) float64 { return y + max(0, rng.Float64()-.5) })
		for v, y := range solve(t, q, 1) {
			if y < f[v]-within*pr.Range() {
				t.Errorf("%s: vertex %d falls from %v to %v as labels rise", pr.Name, v, f[v], y)
			}
		}
	})
}

// Weights times a constant change nothing, however large the constant; a vertex labelled with its own answer neither.
func TestWeightsScaleAndOwnAnswer(t *testing.T) {
	each(t, 100, func(seed uint64, pr testproblems.Problem, f []float64) {
		for _, shift := range []float64{700, -5000, .3} {
			q := pr
			q.Graph = pr.Graph.WithValues(mapped(pr.Graph.Val, func(x float64) float64 { return x + shift }))
			if e := testproblems.Distance(solve(t, q, 1), f) / pr.Range(); !(e <= within) {
				t.Errorf("%s: weights times e^%g: %g off", pr.Name, shift, e)
			}
		}
		v := int32(seed) % int32(pr.Graph.N)
		at, isHeld := slices.BinarySearch(pr.Fixed, v)
		if isHeld {
			return
		}
		q := pr
		q.Fixed = slices.Insert(slices.Clone(pr.Fixed), at, v)
		q.Values = slices.Insert(slices.Clone(pr.Values), at, f[v])
		if e := testproblems.Distance(solve(t, q, 1), f) / pr.Range(); !(e <= within) {
			t.Errorf("%s: vertex %d held at its own answer: %g off", pr.Name, v, e)
		}
	})
}

// The same bits for any number of workers and every run, on a graph large enough to be divided.
func TestSameBits(t *testing.T) {
	pr := testproblems.Cloud(3, 6000, 2, 10, 20)
	want := solve(t, pr, 1)
	if r := check(t, pr, want); r.Imbalance > certified || r.Shift > certified || r.Path > certified {
		t.Errorf("%+v", r)
	}
	for run := range 6 {
		if got := solve(t, pr, 2+run); testproblems.Distance(got, want) != 0 {
			t.Errorf("%d workers: %g off", 2+run, testproblems.Distance(got, want))
		}
	}
}

// Two problems side by side are two problems, to the bit.
func TestComponentsAreIndependent(t *testing.T) {
	a, b := testproblems.Random(1, inf, testproblems.Options{}), testproblems.Random(2, inf, testproblems.Options{})
	// The values are normalised together, so the ranges must be alike for the same bits.
	a.Values[0], b.Values[0], a.Values[1], b.Values[1] = 0, 0, 1, 1
	n := a.Graph.N
	joined := &sparse.CSR{N: n + b.Graph.N, RowPtr: slices.Clone(a.Graph.RowPtr), Val: append(slices.Clone(a.Graph.Val), b.Graph.Val...)}
	joined.Col = slices.Clone(a.Graph.Col)
	for _, j := range b.Graph.Col {
		joined.Col = append(joined.Col, j+int32(n))
	}
	for _, r := range b.Graph.RowPtr[1:] {
		joined.RowPtr = append(joined.RowPtr, r+a.Graph.NNZ())
	}
	both := testproblems.Problem{Graph: joined, Fixed: slices.Clone(a.Fixed), Values: append(slices.Clone(a.Values), b.Values...)}
	for _, v := range b.Fixed {
		both.Fixed = append(both.Fixed, v+int32(n))
	}
	if d := testproblems.Distance(solve(t, both, 2), append(solve(t, a, 1), solve(t, b, 1)...)); d != 0 {
		t.Errorf("%g off", d)
	}
}

func TestErrorsAndCancelling(t *testing.T) {
	pr := testproblems.Chain(inf, []float64{1, 1, 1})
	ctx := context.Background()
	for name, change := range map[string]func(*testproblems.Problem){
		"NaN value":    func(p *testproblems.Problem) { p.Values = []float64{0, math.NaN()} },
		"overflow":     func(p *testproblems.Problem) { p.Values = []float64{-1e308, 1e308} },
		"no label":     func(p *testproblems.Problem) { p.Fixed, p.Values = nil, nil },
		"order":        func(p *testproblems.Problem) { p.Fixed = []int32{3, 0} },
		"out of range": func(p *testproblems.Problem) { p.Fixed = []int32{0, 4} },
		"lengths":      func(p *testproblems.Problem) { p.Fixed = []int32{0} },
		"weight":       func(p *testproblems.Problem) { p.Graph = p.Graph.WithValues([]float64{inf, inf, 0, 0, 0, 0}) },
		"unlabelled component": func(p *testproblems.Problem) {
			p.Graph = testproblems.Graph(6, []testproblems.Edge{{I: 0, J: 1}, {I: 1, J: 2}, {I: 2, J: 3}, {I: 4, J: 5}})
		},
	} {
		q := pr
		change(&q)
		if _, _, err := Solve(ctx, q.Graph, q.Fixed, q.Values, Options{}); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	big := testproblems.Cloud(4, 20000, 2, 8, 10)
	ctx, cancel := context.WithCancel(ctx)
	_, _, err := Solve(ctx, big.Graph, big.Fixed, big.Values, Options{Progress: func(share float64) {
		if share > .1 {
			cancel()
		}
	}})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}
