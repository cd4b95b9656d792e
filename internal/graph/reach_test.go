package graph

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/sparse"
)

// clusters gives points in tight groups at integer places, so that their neighbour graph has several components.
func clusters(t *testing.T, seed uint64, groups, each, d int) *points.Matrix {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 8))
	m := points.NewMatrix(groups*each, d)
	for g := range groups {
		centre := make([]float64, d)
		for j := range centre {
			centre[j] = float64(rng.IntN(6))
		}
		for i := range each {
			for j, c := range centre {
				m.Row(g*each + i)[j] = c + float64(rng.IntN(100))/1000 // steps of 0.001: distances tie
			}
		}
	}
	s, err := points.Prepare(context.Background(), m, points.Options{Scale: points.None})
	if err != nil {
		t.Fatal(err)
	}
	return s.Points
}

func TestJoinTakesTheNearestPair(t *testing.T) {
	joined := 0
	for seed := range uint64(60) {
		metric := []points.Metric{points.Euclidean, points.Manhattan}[seed%2]
		pts := clusters(t, seed, 6, 8, 1+int(seed)%3)
		k := min(3, pts.N-1)
		l, _, err := neighbors.KNearest(context.Background(), pts, k, neighbors.Options{Metric: metric})
		if err != nil {
			t.Fatal(err)
		}
		g, err := FromLists(l, k, 0)
		if err != nil {
			t.Fatal(err)
		}
		b := Bandwidth{Local: seed%4 < 2, H: 1}
		kernel := Kernel(seed % 5)
		if kernel.Compact() {
			b.H = 3
		}
		w, err := g.LogWeights(kernel, b, 0)
		if err != nil {
			t.Fatal(err)
		}
		rng := rand.New(rand.NewPCG(seed, 3))
		labelled := []int32{rng.Int32N(int32(pts.N)), rng.Int32N(int32(pts.N))}
		r, err := FindReach(w, labelled)
		if err != nil {
			t.Fatal(err)
		}
		if r.Labels[r.Component[labelled[0]]] == 0 {
			t.Fatal("a labelled component without a label")
		}
		j, bridges, err := g.Join(context.Background(), w, r, pts, kernel, b, neighbors.Options{Metric: metric})
		if err != nil {
			t.Fatal(err)
		}
		checkCSR(t, j)
		joined += len(bridges)
		if len(bridges) != len(r.Unlabelled()) || j.NNZ() != w.NNZ()+2*len(bridges) {
			t.Fatalf("%d bridges for %d components", len(bridges), len(r.Unlabelled()))
		}
		after, err := FindReach(j, labelled)
		if err != nil || after.Unlabelled() != nil || after.Blank() != nil {
			t.Fatalf("seed %d: components are left without a label", seed)
		}
		got := dense(j)
		blank := r.Blank()
		for t0, e := range bridges {
			if e.Component != r.Unlabelled()[t0] || r.Component[e.From] != e.Component || r.Labels[r.Component[e.To]] == 0 {
				t.Fatalf("bridge %+v", e)
			}
			best := math.Inf(1)
			for v := range pts.N {
				for u := range pts.N {
					if r.Component[v] == e.Component && !blank[u] {
						best = min(best, distance(metric, pts.Row(v), pts.Row(u)))
					}
				}
			}
			if math.Abs(e.Distance-best) > 1e-15 || math.Abs(distance(metric, pts.Row(int(e.From)), pts.Row(int(e.To)))-best) > 1e-15 {
				t.Fatalf("seed %d: bridge %+v, nearest pair at %v", seed, e, best)
			}
			if v := got[[2]int32{e.From, e.To}]; v != e.LogWeight || math.IsInf(v, 0) || math.IsNaN(v) {
				t.Fatalf("bridge %+v has ln w %v in the graph", e, v)
			}
		}
		again, same2, err := g.Join(context.Background(), w, r, pts, kernel, b, neighbors.Options{Metric: metric, Workers: 1})
		if err != nil || !same(again, j) || !slices.Equal(same2, bridges) {
			t.Fatal("bridges depend on the number of workers")
		}
	}
	if joined < 50 {
		t.Fatalf("only %d bridges were built", joined)
	}
}

func distance(m points.Metric, a, b []float64) float64 {
	var s float64
	for j := range a {
		if d := math.Abs(a[j] - b[j]); m == points.Manhattan {
			s += d
		} else {
			s += d * d
		}
	}
	if m == points.Manhattan {
		return s
	}
	return math.Sqrt(s)
}

func TestJoinRefuses(t *testing.T) {
	w, _, err := FromEdges(4, []Edge{{0, 1, 1}, {2, 3, 1}}, 0)
	if err != nil {
		t.Fatal(err)
	}
	g := &Graph{Skeleton: w, Local: make([]float64, 4)}
	join := func(labelled []int32, pts *points.Matrix) error {
		r, err := FindReach(w, labelled)
		if err != nil {
			return err
		}
		_, _, err = g.Join(context.Background(), w, r, pts, Gaussian, Bandwidth{H: 1}, neighbors.Options{})
		return err
	}
	if err := join([]int32{0}, nil); !errors.Is(err, ErrNoPoints) {
		t.Errorf("no points: %v", err)
	}
	if err := join([]int32{0, 3}, nil); err != nil {
		t.Errorf("nothing to join: %v", err)
	}
	if err := join(nil, points.NewMatrix(4, 1)); !errors.Is(err, ErrNoLabel) {
		t.Errorf("no label: %v", err)
	}
	if err := join([]int32{0}, points.NewMatrix(3, 1)); err == nil {
		t.Error("three points for four vertices")
	}
	for _, v := range []int32{-1, 4} {
		if err := join([]int32{v}, nil); err == nil {
			t.Errorf("labelled vertex %d accepted", v)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	r, _ := FindReach(w, []int32{0})
	if _, _, err := g.Join(ctx, w, r, points.NewMatrix(4, 1), Gaussian, Bandwidth{H: 1}, neighbors.Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func TestBlankMarksWhatNoLabelReaches(t *testing.T) {
	w, _, _ := FromEdges(6, []Edge{{0, 2, 1}, {1, 4, 1}}, 0)
	r, err := FindReach(w, []int32{2, 2, 5})
	if err != nil {
		t.Fatal(err)
	}
	if want := []bool{false, true, false, true, true, false}; !slices.Equal(r.Blank(), want) {
		t.Errorf("blank %v, want %v", r.Blank(), want)
	}
	if !slices.Equal(r.Labels, []int{2, 0, 0, 1}) || !slices.Equal(r.Size, []int{2, 2, 1, 1}) || !slices.Equal(r.Unlabelled(), []int32{1, 2}) {
		t.Errorf("%+v", r)
	}
}

// mask marks the labelled of n vertices.
func mask(n int, labelled []int32) []bool {
	m := make([]bool, n)
	for _, v := range labelled {
		m[v] = true
	}
	return m
}

func TestSmallestKAgainstEveryK(t *testing.T) {
	found := 0
	for seed := range uint64(80) {
		pts := clusters(t, seed, 4, 6, 2)
		most := min(15, pts.N-1)
		l := nearest(t, pts, most)
		rng := rand.New(rand.NewPCG(seed, 6))
		var list []int32
		for range 1 + rng.IntN(3) {
			list = append(list, rng.Int32N(int32(pts.N)))
		}
		want := 0
		for k := 1; k <= most && want == 0; k++ {
			g, err := FromLists(l, k, 0)
			if err != nil {
				t.Fatal(err)
			}
			if r, _ := FindReach(g.Skeleton, list); r.Unlabelled() == nil {
				want = k
			}
		}
		if got := SmallestK(l, mask(pts.N, list)); got != want {
			t.Fatalf("seed %d: smallest k %d, want %d", seed, got, want)
		}
		if want > 1 {
			found++
		}
		if SmallestK(l, make([]bool, pts.N)) != 0 {
			t.Fatal("a k reaches vertices without any label")
		}
	}
	if found < 20 {
		t.Fatalf("only %d cases needed more than one neighbour", found)
	}
}

// At SufficientK neighbours the graph has every bridge, so no component is left without a label.
func TestSufficientKLeavesNothingToBridge(t *testing.T) {
	for seed := range uint64(60) {
		metric := []points.Metric{points.Euclidean, points.Manhattan}[seed%2]
		pts := clusters(t, seed, 5, 7, 2)
		l, _, err := neighbors.KNearest(context.Background(), pts, pts.N-1, neighbors.Options{Metric: metric})
		if err != nil {
			t.Fatal(err)
		}
		g, _ := FromLists(l, 2, 0)
		w, err := g.LogWeights(Gaussian, Bandwidth{H: 1}, 0)
		if err != nil {
			t.Fatal(err)
		}
		labelled := []int32{int32(seed) % int32(pts.N)}
		r, _ := FindReach(w, labelled)
		_, bridges, err := g.Join(context.Background(), w, r, pts, Gaussian, Bandwidth{H: 1}, neighbors.Options{Metric: metric})
		if err != nil {
			t.Fatal(err)
		}
		k := SufficientK(r, bridges, pts, metric, 2)
		if len(bridges) == 0 {
			if k != 0 {
				t.Fatalf("%d neighbours for no bridge", k)
			}
			continue
		}
		wide, err := FromLists(l, k, 0)
		if err != nil {
			t.Fatal(err)
		}
		edges := dense(wide.Skeleton)
		for _, b := range bridges {
			if _, ok := edges[[2]int32{b.From, b.To}]; !ok {
				t.Fatalf("seed %d: at %d neighbours bridge %+v is no edge", seed, k, b)
			}
		}
		if least := SmallestK(l, mask(pts.N, labelled)); k < least {
			t.Fatalf("seed %d: %d neighbours suffice where %d are needed", seed, k, least)
		}
	}
}

func TestSmallestBandwidth(t *testing.T) {
	finite := 0
	for seed := range uint64(60) {
		g, err := FromLists(nearest(t, clusters(t, seed, 3, 12, 2), 9), 9, 0)
		if err != nil {
			t.Fatal(err)
		}
		n := int32(g.Skeleton.N)
		labelled := []int32{0, n / 2, n - 1}
		for _, local := range []bool{false, true} {
			h := g.SmallestBandwidth(mask(int(n), labelled), local, 0)
			lost := func(h float64) bool {
				w, err := g.LogWeights(Box, Bandwidth{Local: local, H: h}, 0)
				if err != nil {
					t.Fatal(err)
				}
				r, _ := FindReach(w, labelled)
				return r.Unlabelled() != nil
			}
			if math.IsInf(h, 1) {
				if !lost(1e9) {
					t.Fatalf("seed %d: the whole skeleton is reached, no bandwidth found", seed)
				}
				continue
			}
			finite++
			if lost(h*(1+1e-12)) || !lost(h*(1-1e-9)) {
				t.Fatalf("seed %d: %v is not the smallest bandwidth", seed, h)
			}
		}
		all := make([]bool, n)
		for v := range all {
			all[v] = true
		}
		if h := g.SmallestBandwidth(all, false, 0); h != 0 {
			t.Fatalf("all labelled: %v", h)
		}
	}
	if finite < 20 {
		t.Fatalf("only %d cases had a bandwidth", finite)
	}
}

func TestTether(t *testing.T) {
	for seed := range uint64(100) {
		rng := rand.New(rand.NewPCG(seed, 12))
		n := 1 + rng.IntN(30)
		seen := map[[2]int32]bool{}
		var edges []Edge
		for range rng.IntN(3 * n) {
			i, j := rng.Int32N(int32(n)), rng.Int32N(int32(n))
			if key := [2]int32{min(i, j), max(i, j)}; !seen[key] {
				seen[key] = true
				edges = append(edges, Edge{i, j, rng.Float64() + 0.1})
			}
		}
		a, _, err := FromEdges(n, edges, 0)
		if err != nil {
			t.Fatal(err)
		}
		fixed := make([]int32, rng.IntN(8))
		for k := range fixed {
			fixed[k] = rng.Int32N(int32(n)) // in no order, some twice
		}
		logT := rng.NormFloat64()
		tied, now, err := Tether(a, fixed, logT)
		if err != nil {
			t.Fatal(err)
		}
		checkCSR(t, tied)
		want := dense(a)
		for k, v := range fixed {
			if now[k] != int32(n+k) {
				t.Fatalf("label %d sits on %d", k, now[k])
			}
			want[[2]int32{v, now[k]}], want[[2]int32{now[k], v}] = logT, logT
		}
		got := dense(tied)
		if tied.N != n+len(fixed) || len(got) != len(want) {
			t.Fatalf("%d vertices and %d entries", tied.N, len(got))
		}
		for e, v := range want {
			if got[e] != v {
				t.Fatalf("entry %v is %v, want %v", e, got[e], v)
			}
		}
	}
	a := &sparse.CSR{N: 2, RowPtr: []int{0, 0, 0}}
	for _, v := range []int32{-1, 2} {
		if _, _, err := Tether(a, []int32{v}, 0); err == nil {
			t.Errorf("vertex %d accepted", v)
		}
	}
	for _, logT := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		if _, _, err := Tether(a, []int32{0}, logT); err == nil {
			t.Errorf("ln T = %v accepted", logT)
		}
	}
}
