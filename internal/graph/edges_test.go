package graph

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"
)

func TestFromEdgesAgainstAMap(t *testing.T) {
	for seed := range uint64(300) {
		rng := rand.New(rand.NewPCG(seed, 41))
		n := 1 + rng.IntN(200)
		if seed%50 == 0 {
			n = 9000 // several blocks of full size
		}
		weight := map[[2]int32]float64{}
		var edges []Edge
		loops, repeats := 0, 0
		for range rng.IntN(5 * n) {
			i, j := rng.Int32N(int32(n)), rng.Int32N(int32(n))
			if seed%7 == 0 {
				i = 0 // a star: one long row
			}
			key := [2]int32{min(i, j), max(i, j)}
			w, given := weight[key]
			if !given {
				w = math.Exp(100 * rng.NormFloat64())
			}
			edges = append(edges, Edge{i, j, w})
			switch {
			case i == j:
				loops++
			case given:
				repeats++
			default:
				weight[key] = w
			}
		}
		a, counts, err := FromEdges(n, edges, 3)
		if err != nil {
			t.Fatal(err)
		}
		checkCSR(t, a)
		if want := (EdgeCounts{Edges: len(weight), Repeated: repeats, Loops: loops}); counts != want || a.NNZ() != 2*len(weight) {
			t.Fatalf("seed %d: counts %+v, want %+v", seed, counts, want)
		}
		got := dense(a)
		for e, w := range weight {
			if got[e] != math.Log(w) {
				t.Fatalf("seed %d: edge %v has ln w %v, want %v", seed, e, got[e], math.Log(w))
			}
		}
		rng.Shuffle(len(edges), func(i, j int) { edges[i], edges[j] = edges[j], edges[i] })
		for k := range edges {
			if rng.IntN(2) == 0 {
				edges[k].I, edges[k].J = edges[k].J, edges[k].I
			}
		}
		if b, _, err := FromEdges(n, edges, 1); err != nil || !same(a, b) {
			t.Fatalf("seed %d: the graph depends on the order of edges: %v", seed, err)
		}
	}
}

func TestFromEdgesNamesTheFirstConflict(t *testing.T) {
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 42))
		n := 2 + rng.IntN(20)
		edges := make([]Edge, 2+rng.IntN(60))
		for k := range edges {
			edges[k] = Edge{rng.Int32N(int32(n)), rng.Int32N(int32(n)), float64(1 + rng.IntN(2))}
		}
		if seed == 0 { // a difference in the last bit is a difference
			edges = []Edge{{0, 1, 1e300}, {1, 0, math.Nextafter(1e300, 0)}}
		}
		first, second := -1, -1
		seen := map[[2]int32]int{}
		for k, e := range edges {
			key := [2]int32{min(e.I, e.J), max(e.I, e.J)}
			if at, ok := seen[key]; !ok {
				seen[key] = k
			} else if e.I != e.J && edges[at].W != e.W {
				first, second = at, k
				break
			}
		}
		_, _, err := FromEdges(max(n, 2), edges, 2)
		var c *ConflictError
		if errors.As(err, &c) != (second >= 0) {
			t.Fatalf("seed %d: %v, want positions %d and %d", seed, err, first, second)
		}
		if c != nil && (c.First != first || c.Second != second || c.A != edges[first] || c.B != edges[second]) {
			t.Fatalf("seed %d: %+v, want positions %d and %d", seed, c, first, second)
		}
	}
}

func TestFromEdgesRefuses(t *testing.T) {
	good := Edge{0, 1, 1}
	for _, bad := range []Edge{{-1, 1, 1}, {0, -1, 1}, {0, 3, 1}, {3, 3, 1}, {0, 1, 0}, {0, 1, -1}, {0, 1, math.NaN()}, {0, 1, math.Inf(1)}, {2, 2, 0}} {
		_, _, err := FromEdges(3, []Edge{good, bad, {0, 1, math.NaN()}}, 0)
		var e *EdgeError
		if !errors.As(err, &e) || e.Position != 1 || e.Error() == "" {
			t.Errorf("%+v: %v", bad, err)
		}
	}
	for _, n := range []int{0, 1, 5} {
		a, counts, err := FromEdges(n, nil, 0)
		if err != nil || a.N != n || a.NNZ() != 0 || counts != (EdgeCounts{}) {
			t.Errorf("%d vertices, no edge: %+v, %v", n, a, err)
		}
	}
	if _, _, err := FromEdges(0, []Edge{good}, 0); err == nil {
		t.Error("an edge among no vertices")
	}
	if _, _, err := FromEdges(-1, nil, 0); err == nil {
		t.Error("a negative number of vertices")
	}
	if a, _, err := FromEdges(2, []Edge{{0, 1, math.SmallestNonzeroFloat64}}, 0); err != nil || a.Val[0] != math.Log(math.SmallestNonzeroFloat64) {
		t.Errorf("the smallest weight: %v", err)
	}
}
