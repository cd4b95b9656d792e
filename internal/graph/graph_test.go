package graph

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/sparse"
)

// cloud gives n distinct points in d columns, in their canonical order; step > 0 rounds coordinates to multiples of it,
// so that distances tie.
func cloud(t testing.TB, seed uint64, n, d int, step float64) *points.Matrix {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 77))
	m := points.NewMatrix(n, d)
	for i := range m.Data {
		m.Data[i] = rng.Float64()
		if step > 0 {
			m.Data[i] = math.Round(m.Data[i]/step) * step
		}
	}
	s, err := points.Prepare(context.Background(), m, points.Options{Scale: points.None})
	if err != nil {
		t.Fatal(err)
	}
	return s.Points
}

func nearest(t testing.TB, pts *points.Matrix, k int) *neighbors.Lists {
	t.Helper()
	l, _, err := neighbors.KNearest(context.Background(), pts, k, neighbors.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// checkCSR refuses anything but a symmetric matrix with sorted columns and no diagonal.
func checkCSR(t testing.TB, a *sparse.CSR) {
	t.Helper()
	if len(a.RowPtr) != a.N+1 || a.RowPtr[a.N] != len(a.Col) || len(a.Col) != len(a.Val) {
		t.Fatalf("sizes: n %d, row pointers %d, columns %d, values %d", a.N, len(a.RowPtr), len(a.Col), len(a.Val))
	}
	for i := range a.N {
		col, val := a.Row(i)
		for k, j := range col {
			if int(j) == i || j < 0 || int(j) >= a.N || k > 0 && col[k-1] >= j {
				t.Fatalf("row %d has columns %v", i, col)
			}
			back, ok := slices.BinarySearch(a.Col[a.RowPtr[j]:a.RowPtr[j+1]], int32(i))
			if !ok || math.Float64bits(a.Val[a.RowPtr[j]+back]) != math.Float64bits(val[k]) {
				t.Fatalf("entries (%d,%d) and (%d,%d) differ", i, j, j, i)
			}
		}
	}
}

// dense is the matrix as a map of pairs, the form the oracles use.
func dense(a *sparse.CSR) map[[2]int32]float64 {
	m := map[[2]int32]float64{}
	for i := range a.N {
		col, val := a.Row(i)
		for k, j := range col {
			m[[2]int32{int32(i), j}] = val[k]
		}
	}
	return m
}

func same(a, b *sparse.CSR) bool {
	return a.N == b.N && slices.Equal(a.RowPtr, b.RowPtr) && slices.Equal(a.Col, b.Col) &&
		slices.EqualFunc(a.Val, b.Val, func(x, y float64) bool { return math.Float64bits(x) == math.Float64bits(y) })
}

func TestFromListsIsTheUnionOfLists(t *testing.T) {
	for seed := range uint64(60) {
		n, d := 2+int(seed*seed)%150, 1+int(seed)%4
		step := 0.0
		if seed%3 == 0 {
			step = 0.125
		}
		pts := cloud(t, seed, n, d, step)
		if pts.N < 2 {
			continue
		}
		most := min(pts.N-1, 1+int(seed)%12)
		if seed == 59 {
			most = min(pts.N-1, 70) // more neighbours than bits in a word
		}
		l := nearest(t, pts, most)
		for _, k := range []int{1, (most + 1) / 2, most} {
			g, err := FromLists(l, k, 3)
			if err != nil {
				t.Fatal(err)
			}
			checkCSR(t, g.Skeleton)
			want := map[[2]int32]float64{}
			for i := range l.N {
				for r := range k {
					j, v := l.Index[i*l.K+r], l.Dist[i*l.K+r]
					want[[2]int32{int32(i), j}] = v
					want[[2]int32{j, int32(i)}] = v
				}
			}
			got := dense(g.Skeleton)
			if len(got) != len(want) {
				t.Fatalf("seed %d k %d: %d entries, want %d", seed, k, len(got), len(want))
			}
			for e, v := range want {
				if got[e] != v {
					t.Fatalf("seed %d k %d: entry %v is %v, want %v", seed, k, e, got[e], v)
				}
			}
			for i, s := range g.Local {
				if s != l.Dist[i*l.K+min(LocalRank, l.K)-1] {
					t.Fatalf("own scale of %d is %v", i, s)
				}
			}
			one, _ := FromLists(l, k, 1)
			if !same(one.Skeleton, g.Skeleton) {
				t.Fatal("the graph depends on the number of workers")
			}
		}
	}
}

// Permuted rows give the same graph bit for bit, and each row the same vertex, with ties and with copies.
func TestRowOrderDoesNotReachTheGraph(t *testing.T) {
	build := func(m *points.Matrix) (*points.Space, *sparse.CSR) {
		s, err := points.Prepare(context.Background(), m, points.Options{})
		if err != nil {
			t.Fatal(err)
		}
		g, err := FromLists(nearest(t, s.Points, 6), 6, 0)
		if err != nil {
			t.Fatal(err)
		}
		w, err := g.LogWeights(Gaussian, Bandwidth{Local: true, H: 1}, 0)
		if err != nil {
			t.Fatal(err)
		}
		return s, w
	}
	for seed := range uint64(20) {
		rng := rand.New(rand.NewPCG(seed, 99))
		m := points.NewMatrix(120, 3)
		for i := range m.Data {
			m.Data[i] = float64(rng.IntN(5))
		}
		s, w := build(m)
		moved := points.NewMatrix(m.N, m.D)
		perm := rng.Perm(m.N)
		for i, from := range perm {
			copy(moved.Row(i), m.Row(from))
		}
		s2, w2 := build(moved)
		if !same(w, w2) {
			t.Fatalf("seed %d: the graph depends on the order of rows", seed)
		}
		for i, from := range perm {
			if s2.Vertex[i] != s.Vertex[from] {
				t.Fatalf("seed %d: row %d moved to another vertex", seed, from)
			}
		}
	}
}

func TestFromListsRefuses(t *testing.T) {
	good := func() *neighbors.Lists {
		return &neighbors.Lists{N: 3, K: 2, Index: []int32{1, 2, 0, 2, 1, 0}, Dist: []float64{1, 2, 1, 3, 3, 3}}
	}
	if _, err := FromLists(good(), 2, 1); err != nil {
		t.Fatal(err)
	}
	for name, spoil := range map[string]func(*neighbors.Lists){
		"own index":  func(l *neighbors.Lists) { l.Index[2] = 1 },
		"range":      func(l *neighbors.Lists) { l.Index[3] = 3 },
		"negative":   func(l *neighbors.Lists) { l.Index[3] = -1 },
		"zero":       func(l *neighbors.Lists) { l.Dist[0] = 0 },
		"descending": func(l *neighbors.Lists) { l.Dist[1] = 0.5 },
		"NaN":        func(l *neighbors.Lists) { l.Dist[1] = math.NaN() },
		"infinite":   func(l *neighbors.Lists) { l.Dist[1] = math.Inf(1) },
		"short":      func(l *neighbors.Lists) { l.Dist = l.Dist[:5] },
	} {
		l := good()
		spoil(l)
		if _, err := FromLists(l, 2, 1); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	for _, k := range []int{0, -1, 3} {
		if _, err := FromLists(good(), k, 1); err == nil {
			t.Errorf("k = %d: no error", k)
		}
	}
}

func TestFromRaggedIsEveryPairWithinTheRadius(t *testing.T) {
	for seed := range uint64(20) {
		pts := cloud(t, seed, 40+int(seed)*5, 2, []float64{0, 0.1}[seed%2])
		radius := 0.05 + 0.02*float64(seed)
		r, _, err := neighbors.WithinRadius(context.Background(), pts, radius, neighbors.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for _, near := range []*neighbors.Lists{nil, nearest(t, pts, 9)} {
			g, err := FromRagged(r, near, 2)
			if err != nil {
				t.Fatal(err)
			}
			checkCSR(t, g.Skeleton)
			got := dense(g.Skeleton)
			for i := range pts.N {
				var all []float64
				for j := range pts.N {
					d := math.Hypot(pts.Row(i)[0]-pts.Row(j)[0], pts.Row(i)[1]-pts.Row(j)[1])
					if i != j {
						all = append(all, d)
					}
					if math.Abs(d-radius) < 1e-12 {
						continue // on the rim, where Hypot and the search may round apart
					}
					if v, ok := got[[2]int32{int32(i), int32(j)}]; ok != (i != j && d < radius) || ok && math.Abs(v-d) > 1e-15 {
						t.Fatalf("seed %d: pair %d %d at %v within %v: %v %v", seed, i, j, d, radius, v, ok)
					}
				}
				slices.Sort(all)
				want := all[LocalRank-1]
				if near == nil {
					row, _ := r.Row(i)
					if want = math.NaN(); len(row) > 0 {
						want = all[min(len(row), LocalRank)-1]
					}
				}
				if s := g.Local[i]; math.IsNaN(s) != math.IsNaN(want) || math.Abs(s-want) > 1e-15 {
					t.Fatalf("own scale of %d is %v, want %v", i, s, want)
				}
			}
		}
	}
}
