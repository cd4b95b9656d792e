package neighbors

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/points"
)

// oracle is the definition: all other points sorted by distance, then coordinates, then number. Distances are summed in
// plain order, so that only data on which that is exact, or without ties, compares to the bit.
func oracle(m *points.Matrix, i, k int, metric points.Metric) ([]int32, []float64) {
	type cand struct {
		c float64
		j int
	}
	var all []cand
	for j := range m.N {
		if j != i {
			all = append(all, cand{oracleDistance(m.Row(i), m.Row(j), metric), j})
		}
	}
	slices.SortFunc(all, func(a, b cand) int {
		switch {
		case a.c < b.c:
			return -1
		case a.c > b.c:
			return 1
		}
		if c := slices.Compare(m.Row(a.j), m.Row(b.j)); c != 0 {
			return c
		}
		return a.j - b.j
	})
	index, dist := make([]int32, k), make([]float64, k)
	for r := range k {
		index[r], dist[r] = int32(all[r].j), all[r].c
	}
	return index, dist
}

func oracleDistance(a, b []float64, metric points.Metric) float64 {
	var s float64
	for j := range a {
		if metric == points.Manhattan {
			s += math.Abs(a[j] - b[j])
		} else {
			s += (a[j] - b[j]) * (a[j] - b[j])
		}
	}
	if metric == points.Manhattan {
		return s
	}
	return math.Sqrt(s)
}

// shapes are the point sets that searches are tried on.
var shapes = []struct {
	name string
	make func(r *rand.Rand, n, d int) *points.Matrix
}{
	{"uniform", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(int, int) float64 { return r.Float64() })
	}},
	{"grid", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(int, int) float64 { return float64(r.IntN(4)) })
	}},
	{"fine grid", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(int, int) float64 { return float64(r.IntN(30)) })
	}},
	{"one column varies", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(_, j int) float64 { return float64(min(1-j, 0)) + float64(max(1-j, 0))*r.Float64() })
	}},
	{"line", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(i, j int) float64 { return float64(i * (j + 1)) })
	}},
	{"clusters", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(i, _ int) float64 { return float64(i%5)*100 + math.Ldexp(r.NormFloat64(), -(i%5)*8) })
	}},
	{"offset", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(int, int) float64 { return 1e9 + float64(r.IntN(1000))/64 })
	}},
	{"powers", func(r *rand.Rand, n, d int) *points.Matrix {
		return fill(n, d, func(int, int) float64 { return math.Ldexp(1, r.IntN(40)) })
	}},
}

func fill(n, d int, f func(i, j int) float64) *points.Matrix {
	m := points.NewMatrix(n, d)
	for i := range n {
		for j := range d {
			m.Data[i*d+j] = f(i, j)
		}
	}
	return m
}

func TestKNearestMatchesTheDefinition(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 2))
	for _, shape := range shapes {
		for trial := range 40 {
			n, d := 2+r.IntN(250), 1+r.IntN(6)
			if trial%10 == 0 {
				d = 17
			}
			k := 1 + r.IntN(min(n-1, 20))
			metric := []points.Metric{points.Euclidean, points.Manhattan}[trial%2]
			m := shape.make(r, n, d)
			got, rep, err := KNearest(context.Background(), m, k, Options{Metric: metric, Workers: 1 + trial%3})
			if err != nil || !rep.Exact || rep.Recall != 1 {
				t.Fatal(rep, err)
			}
			if err := compareLists(m, got, metric); err != nil {
				t.Fatalf("%s n=%d d=%d k=%d %s: %v", shape.name, n, d, k, metric, err)
			}
		}
	}
}

// compareLists holds lists against the oracle. Distances may differ by the rounding of d additions; where the oracle's
// own distances are that close to each other, either order is right.
func compareLists(m *points.Matrix, l *Lists, metric points.Metric) error {
	for i := range m.N {
		index, dist := l.Row(i)
		wantIndex, wantDist := oracle(m, i, l.K, metric)
		for s := range index {
			slack := 1e-14 * wantDist[s]
			if math.Abs(dist[s]-wantDist[s]) > slack {
				return fmt.Errorf("point %d: neighbour %d is at %v, want %v", i, s, dist[s], wantDist[s])
			}
			if index[s] != wantIndex[s] && math.Abs(oracleDistance(m.Row(i), m.Row(int(index[s])), metric)-wantDist[s]) > slack {
				return fmt.Errorf("point %d: neighbour %d is %d, want %d", i, s, index[s], wantIndex[s])
			}
			exact := wantDist[s] < 1<<26 && dist[s] == math.Trunc(dist[s]) // its square is a sum without rounding
			if index[s] != wantIndex[s] && exact && wantDist[s] == dist[s] {
				return fmt.Errorf("point %d: tied neighbour %d is %d, want %d", i, s, index[s], wantIndex[s])
			}
		}
	}
	return nil
}

func TestCompareListsRefuses(t *testing.T) {
	m := fill(40, 2, func(i, j int) float64 { return float64((i*7 + j*3) % 13) })
	l, _, err := KNearest(context.Background(), m, 4, Options{})
	if err != nil {
		t.Fatal(err)
	}
	l.Index[9]++
	if compareLists(m, l, points.Euclidean) == nil {
		t.Error("a wrong neighbour passed")
	}
}

func TestWithinRadiusMatchesTheDefinition(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 2))
	for _, shape := range shapes {
		for trial := range 20 {
			n, d := 2+r.IntN(150), 1+r.IntN(5)
			metric := []points.Metric{points.Euclidean, points.Manhattan}[trial%2]
			m := shape.make(r, n, d)
			_, far := oracle(m, r.IntN(n), n-1, metric)
			radius := far[r.IntN(n-1)] // itself a distance that occurs
			if radius == 0 {
				continue
			}
			got, _, err := WithinRadius(context.Background(), m, radius, Options{Metric: metric, Workers: 1 + trial%3})
			if err != nil {
				t.Fatal(err)
			}
			for i := range n {
				wantIndex, wantDist := oracle(m, i, n-1, metric)
				lo, _ := slices.BinarySearch(wantDist, radius*(1-1e-14))
				hi, _ := slices.BinarySearch(wantDist, radius*(1+1e-14))
				for hi < n-1 && wantDist[hi] == radius {
					hi++
				}
				index, dist := got.Row(i)
				if len(index) < lo || len(index) > hi {
					t.Fatalf("%s: point %d has %d within %v, want %d to %d", shape.name, i, len(index), radius, lo, hi)
				}
				for s := range lo {
					if math.Abs(dist[s]-wantDist[s]) > 1e-14*wantDist[s] {
						t.Fatalf("%s: point %d, %d-th is %d at %v, want %d at %v", shape.name, i, s, index[s], dist[s], wantIndex[s], wantDist[s])
					}
				}
			}
		}
	}
}

func TestWithinRadiusStopsAtTheCap(t *testing.T) {
	m := shapes[0].make(rand.New(rand.NewPCG(1, 1)), 2000, 2)
	_, _, err := WithinRadius(context.Background(), m, 2, Options{MaxPairs: 1000})
	var too *TooManyPairsError
	if !errors.As(err, &too) || too.MaxPairs != 1000 {
		t.Fatalf("error %v", err)
	}
}

func TestIndexAndGrowingMatchTheDefinition(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 2))
	for _, shape := range shapes {
		for trial := range 20 {
			n, d := 2+r.IntN(200), 1+r.IntN(5)
			metric := []points.Metric{points.Euclidean, points.Manhattan}[trial%2]
			m := shape.make(r, n, d)
			x, err := NewIndex(context.Background(), m, Options{Metric: metric})
			if err != nil {
				t.Fatal(err)
			}
			g := NewGrowing(metric)
			with := points.NewMatrix(n+1, d)
			copy(with.Data, m.Data)
			k := 1 + r.IntN(min(n, 12))
			index, dist := make([]int32, k), make([]float64, k)
			for i := range n {
				g.Add(m.Row(i), int32(i))
			}
			for range 10 {
				q := with.Row(n)
				copy(q, m.Row(r.IntN(n)))
				q[r.IntN(d)] += float64(r.IntN(3))
				wantIndex, wantDist := oracle(with, n, k, metric)
				if err := x.Nearest(q, index, dist); err != nil {
					t.Fatal(err)
				}
				for s := range k {
					if math.Abs(dist[s]-wantDist[s]) > 1e-14*wantDist[s] {
						t.Fatalf("%s: %d-th nearest at %v, want %v", shape.name, s, dist[s], wantDist[s])
					}
				}
				id, far := g.Nearest(q)
				if math.Abs(far-wantDist[0]) > 1e-14*far || (shape.name == "grid" && id != wantIndex[0]) {
					t.Fatalf("%s: growing set gives %d at %v, want %d at %v", shape.name, id, far, wantIndex[0], wantDist[0])
				}
			}
		}
	}
}

func TestRefusals(t *testing.T) {
	m := fill(5, 2, func(i, j int) float64 { return float64(i + j) })
	bad := fill(5, 2, func(i, j int) float64 { return math.NaN() })
	for name, err := range map[string]error{
		"k=0":        second(KNearest(context.Background(), m, 0, Options{})),
		"k=n":        second(KNearest(context.Background(), m, 5, Options{})),
		"NaN":        second(KNearest(context.Background(), bad, 1, Options{})),
		"metric":     second(KNearest(context.Background(), m, 1, Options{Metric: "x"})),
		"search":     second(KNearest(context.Background(), m, 1, Options{Search: "x"})),
		"radius 0":   second(WithinRadius(context.Background(), m, 0, Options{})),
		"radius NaN": second(WithinRadius(context.Background(), m, math.NaN(), Options{})),
	} {
		if err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func second[T any](_ T, _ Report, err error) error { return err }

// TestHostile counts distances instead of seconds: on sets that trees dislike, a point costs at most four times what
// it costs among uniform points.
func TestHostile(t *testing.T) {
	var base float64
	for _, set := range hostile(20_000) {
		s, err := points.Prepare(context.Background(), set.m, points.Options{})
		if err != nil {
			t.Fatal(err)
		}
		_, rep, err := KNearest(context.Background(), s.Points, 10, Options{})
		if err != nil {
			t.Fatal(err)
		}
		each := float64(rep.Distances) / float64(set.m.N) // by row: copies of a row are merged before the search
		if base == 0 {
			base = each
		}
		if each > 4*base {
			t.Errorf("%s: %.0f distances a row, uniform points %.0f", set.name, each, base)
		}
	}
}
