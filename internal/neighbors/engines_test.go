package neighbors

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/points"
)

// engines runs every exact engine.
func engines(t *testing.T, m *points.Matrix, k int, o Options) map[string]*Lists {
	t.Helper()
	if err := check(m, &o); err != nil {
		t.Fatal(err)
	}
	tr, err := newTree(context.Background(), m, o)
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]*Lists{}
	if out["tree"], _, err = tr.all(context.Background(), k, o); err != nil {
		t.Fatal(err)
	}
	if o.Metric == points.Euclidean {
		if out["blocks"], _, err = newBlocks(tr, o.Workers).all(context.Background(), k, o); err != nil {
			t.Fatal(err)
		}
	}
	return out
}

// TestEnginesAgreeToTheBit holds the engines against each other and, on the smaller sets, against the definition.
func TestEnginesAgreeToTheBit(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 2))
	for _, shape := range shapes {
		for trial := range 16 {
			n, d := 2+r.IntN(600), []int{1, 2, 3, 5, 9, 20, 33}[r.IntN(7)]
			if trial%4 != 0 {
				n = 2 + r.IntN(150)
			}
			k := 1 + r.IntN(min(n-1, 15))
			m := shape.make(r, n, d)
			got := engines(t, m, k, Options{Workers: 1 + trial%3})
			if !same(got["tree"], got["blocks"]) {
				t.Fatalf("%s n=%d d=%d k=%d: tree and blocks differ", shape.name, n, d, k)
			}
			if n < 150 {
				if err := compareLists(m, got["blocks"], points.Euclidean); err != nil {
					t.Fatalf("%s n=%d d=%d k=%d: %v", shape.name, n, d, k, err)
				}
			}
		}
	}
}

func same(a, b *Lists) bool { return slices.Equal(a.Index, b.Index) && slices.Equal(a.Dist, b.Dist) }

// clustered makes points of many clusters, each a sheet of a few dimensions bent into d columns.
func clustered(n, d, clusters, inner int) *points.Matrix {
	r := rand.New(rand.NewPCG(31, 7))
	centre := fill(clusters, d, func(int, int) float64 { return 3 * r.NormFloat64() })
	basis := fill(clusters*inner, d, func(int, int) float64 { return r.NormFloat64() })
	m := points.NewMatrix(n, d)
	for i := range n {
		c := r.IntN(clusters)
		copy(m.Row(i), centre.Row(c))
		for b := range inner {
			z := r.NormFloat64()
			for j, v := range basis.Row(c*inner + b) {
				m.Row(i)[j] += z * v
			}
		}
		for j := range d {
			m.Row(i)[j] += 0.1 * r.NormFloat64()
		}
	}
	return m
}

func TestApproximateMeasuresItsRecall(t *testing.T) {
	m := clustered(2500, 16, 12, 8)
	o := Options{Search: Approximate, Workers: 2, Seed: 5}
	got, rep, err := KNearest(context.Background(), m, 10, o)
	if err != nil {
		t.Fatal(err)
	}
	truth := engines(t, m, 10, Options{})["tree"]
	found := 0
	for i := range m.N {
		index, _ := got.Row(i)
		want, _ := truth.Row(i)
		for _, j := range index {
			if slices.Contains(want, j) {
				found++
			}
		}
	}
	recall := float64(found) / float64(10*m.N)
	// Four standard errors of a share measured on 512 points, neighbours of one point taken as one draw.
	if rep.Exact || rep.Sample != recallSample || rep.Recall < recall-0.03 || rep.Recall > recall+0.03 || recall < wantedRecall {
		t.Errorf("recall %v, reported %+v", recall, rep)
	}
	o.Workers = 1
	again, _, err := KNearest(context.Background(), m, 10, o)
	if err != nil || !same(got, again) {
		t.Errorf("one worker and two gave different lists (%v)", err)
	}
}

func TestPermutedRowsGiveTheSameLists(t *testing.T) {
	r := rand.New(rand.NewPCG(41, 2))
	for _, search := range []Search{Exact, Approximate} {
		for _, shape := range shapes {
			raw := shape.make(r, 2100, 3)
			s, err := points.Prepare(context.Background(), raw, points.Options{})
			if err != nil {
				t.Fatal(err)
			}
			k := min(6, s.Points.N-1)
			a, _, err := KNearest(context.Background(), s.Points, k, Options{Search: search, Workers: 1})
			if err != nil {
				t.Fatal(err)
			}
			perm := r.Perm(s.Points.N)
			q := fill(s.Points.N, s.Points.D, func(i, j int) float64 { return s.Points.Row(perm[i])[j] })
			b, _, err := KNearest(context.Background(), q, k, Options{Search: search, Workers: 3})
			if err != nil {
				t.Fatal(err)
			}
			for i, p := range perm {
				bi, bd := b.Row(i)
				ai, ad := a.Row(p)
				for x := range bi {
					if int32(perm[bi[x]]) != ai[x] || bd[x] != ad[x] {
						t.Fatalf("%s %s: row %d: neighbours %v at %v, permuted %v at %v", search, shape.name, p, ai, ad, bi, bd)
					}
				}
			}
		}
	}
}

// TestAutoAndManhattan covers what the choice of engine can lead to: Auto stays exact where that is cheap, and the
// approximate search knows the L1 distance.
func TestAutoAndManhattan(t *testing.T) {
	m := clustered(2100, 12, 8, 6)
	_, rep, err := KNearest(context.Background(), m, 5, Options{Search: Auto})
	if err != nil || !rep.Exact {
		t.Errorf("Auto on a small table: %+v, %v", rep, err)
	}
	got, rep, err := KNearest(context.Background(), m, 5, Options{Search: Approximate, Metric: points.Manhattan})
	if err != nil || rep.Exact || rep.Recall < wantedRecall {
		t.Fatalf("approximate Manhattan: %+v, %v", rep, err)
	}
	for i := range m.N {
		index, dist := got.Row(i)
		for s, j := range index {
			if want := taxicab(m.Row(i), m.Row(int(j))); int(j) == i || dist[s] != want || s > 0 && dist[s] < dist[s-1] {
				t.Fatalf("point %d: neighbour %d is %d at %v, its distance is %v", i, s, j, dist[s], want)
			}
		}
	}
	if _, rep, _ = KNearest(context.Background(), clustered(1000, 4, 3, 2), 5, Options{Search: Approximate}); !rep.Exact {
		t.Error("approximate search of few points was not exact")
	}
}

// TestPlanChoosesByTheData: uniform points of many columns go to blocks, points of few intrinsic dimensions to the tree.
func TestPlanChoosesByTheData(t *testing.T) {
	r := rand.New(rand.NewPCG(61, 2))
	for _, c := range []struct {
		name   string
		m      *points.Matrix
		blocks bool
	}{
		{"uniform in 2 columns", fill(5000, 2, func(int, int) float64 { return r.Float64() }), false},
		{"curve in 40 columns", fill(5000, 40, func(i, j int) float64 { return math.Sin(float64(i*(j+1)) / 5000) }), false},
		{"normal in 40 columns", fill(5000, 40, func(int, int) float64 { return r.NormFloat64() }), true},
	} {
		_, rep, err := KNearest(context.Background(), c.m, 8, Options{})
		if err != nil || (rep.Engine == "blocks") != c.blocks {
			t.Errorf("%s: %+v, %v", c.name, rep, err)
		}
	}
}

func TestSearchesEndWithTheirContext(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	m := clustered(2500, 6, 3, 4)
	for _, search := range []Search{Exact, Approximate} {
		if _, _, err := KNearest(ctx, m, 5, Options{Search: search}); err != context.Canceled {
			t.Errorf("%s: %v", search, err)
		}
	}
	if _, _, err := WithinRadius(ctx, m, 1, Options{}); err != context.Canceled {
		t.Errorf("radius: %v", err)
	}
}

func TestProgressGrowsToOne(t *testing.T) {
	last := 0.0
	o := Options{Workers: 2, Progress: func(share float64) {
		if share < last || share > 1 {
			t.Errorf("progress %v after %v", share, last)
		}
		last = share
	}}
	if _, _, err := KNearest(context.Background(), clustered(3000, 3, 3, 3), 5, o); err != nil || last != 1 {
		t.Errorf("progress ended at %v (%v)", last, err)
	}
}

func TestQueriesAllocateNothing(t *testing.T) {
	m := clustered(3000, 3, 3, 3)
	x, err := NewIndex(context.Background(), m, Options{})
	if err != nil {
		t.Fatal(err)
	}
	index, dist := make([]int32, 10), make([]float64, 10)
	if allocs := testing.AllocsPerRun(200, func() {
		if err := x.Nearest(m.Row(7), index, dist); err != nil {
			t.Fatal(err)
		}
	}); allocs > 0.5 { // the pool may be emptied by the collector in between
		t.Errorf("%v allocations a query", allocs)
	}
	if index[0] != 7 || dist[0] != 0 {
		t.Errorf("the point itself was not found: %d at %v", index[0], dist[0])
	}
	if x.Nearest(m.Row(7)[:2], index, dist) == nil || x.Nearest(m.Row(7), index[:3], dist) == nil {
		t.Error("wrong sizes passed")
	}
}

// TestRadiusIsInclusive: points on a grid of step 0.1 have neighbours at the radius exactly as computed.
func TestRadiusIsInclusive(t *testing.T) {
	for _, radius := range []float64{0.1, 0.3, 1e-3, 7, 1e-200} {
		for _, metric := range []points.Metric{points.Euclidean, points.Manhattan} {
			if b := bound(metric, radius); metric == points.Euclidean && (math.Sqrt(b) > radius || math.Sqrt(math.Nextafter(b, 1e300)) <= radius) {
				t.Errorf("bound %v for radius %v", b, radius)
			}
		}
	}
	m := fill(100, 2, func(i, j int) float64 { return float64([]int{i % 10, i / 10}[j]) })
	got, _, err := WithinRadius(context.Background(), m, 1, Options{})
	if err != nil || len(got.Index) != 4*90 { // 2 * 10 * 9 grid edges, each twice
		t.Errorf("%d neighbours on a 10 by 10 grid, want 360 (%v)", len(got.Index), err)
	}
}

// TestShortPoolsAreFilled empties the pool of a point, as if the rounds had not reached it.
func TestShortPoolsAreFilled(t *testing.T) {
	m := clustered(2100, 8, 4, 4)
	tr, err := newTree(context.Background(), m, Options{Metric: points.Euclidean, Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	s, err := newDescent(tr, 20)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.run(context.Background(), Options{Workers: 2}); err != nil {
		t.Fatal(err)
	}
	const victim = 77
	for r := 3; r < 20; r++ {
		s.close[victim*20+r], s.index[victim*20+r] = math.Inf(1), -1
	}
	got, _ := s.lists(10, 2).Row(tr.number(victim))
	want, _ := engines(t, m, 10, Options{})["tree"].Row(tr.number(victim))
	if !slices.Equal(got, want) {
		t.Errorf("neighbours %v, want %v", got, want)
	}
}
