package neighbors

import (
	"context"
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
		for trial := range 24 {
			n, d := 2+r.IntN(700), []int{1, 2, 3, 5, 9, 20, 33}[r.IntN(7)]
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
	m := clustered(4000, 24, 20, 8)
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
			raw := shape.make(r, 3000, 3)
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
