package lexmin

import (
	"context"
	"fmt"
	"math"
	"slices"
	"testing"
	"time"

	"pinfill/internal/testproblems"
)

// BenchmarkSolve prints the time of a solve as a multiple of one Dijkstra search from all labels over the same graph,
// taken in the same run, and the work done.
func BenchmarkSolve(b *testing.B) {
	for _, c := range []struct{ n, d int }{{4000, 2}, {50000, 2}, {200000, 2}, {200000, 3}} {
		pr := testproblems.Cloud(1, c.n, c.d, 10, 20)
		b.Run(fmt.Sprintf("n=%d/d=%d", c.n, c.d), func(b *testing.B) {
			var st Stats
			for b.Loop() {
				var err error
				if _, st, err = Solve(context.Background(), pr.Graph, pr.Fixed, pr.Values, Options{}); err != nil {
					b.Fatal(err)
				}
			}
			solve := b.Elapsed().Seconds() / float64(b.N)
			b.ReportMetric(solve/oneSearch(pr), "dijkstras")
			b.ReportMetric(float64(st.HeapPops)/float64(c.n), "pops/row")
			b.ReportMetric(float64(st.Paths)/float64(c.n), "paths/row")
			b.ReportMetric(float64(st.Searches)/float64(st.Paths), "searches/path")
		})
	}
}

// BenchmarkHard does the same for graphs that are hard for the method: ties everywhere, one long path, hubs, weights
// over ten decades, half the rows labelled, one label.
func BenchmarkHard(b *testing.B) {
	for _, pr := range []testproblems.Problem{
		chain(100000), star(100000), lattice(300, 0), lattice(300, 1), comb(300),
		tenDecades(50000), relabelled(50000, 25000), relabelled(50000, 1), relabelled(50000, 2),
	} {
		b.Run(pr.Name, func(b *testing.B) {
			var st Stats
			for b.Loop() {
				var err error
				if _, st, err = Solve(context.Background(), pr.Graph, pr.Fixed, pr.Values, Options{}); err != nil {
					b.Fatal(err)
				}
			}
			solve := b.Elapsed().Seconds() / float64(b.N)
			b.ReportMetric(solve/oneSearch(pr), "dijkstras")
			b.ReportMetric(float64(st.HeapPops)/float64(pr.Graph.N), "pops/row")
		})
	}
}

func chain(n int) testproblems.Problem {
	w := make([]float64, n)
	for i := range w {
		w[i] = 1 + float64(i%7)
	}
	pr := testproblems.Chain(math.Inf(1), w)
	pr.Name = "chain"
	return pr
}

func star(n int) testproblems.Problem {
	pr := testproblems.Star(math.Inf(1), n/2, n/2)
	pr.Name = "star"
	return pr
}

// lattice is a square lattice of unit weights, or of weights e^(spread * a fraction that repeats), with labels at
// opposite corners.
func lattice(side int, spread float64) testproblems.Problem {
	var edges []testproblems.Edge
	weight := func(k int) float64 { return spread * math.Mod(float64(k)*.6180339887498949, 1) }
	for v := range side * side {
		if (v+1)%side != 0 {
			edges = append(edges, testproblems.Edge{I: v, J: v + 1, LogW: weight(2 * v)})
		}
		if v+side < side*side {
			edges = append(edges, testproblems.Edge{I: v, J: v + side, LogW: weight(2*v + 1)})
		}
	}
	return testproblems.Problem{
		Name: fmt.Sprintf("lattice/spread=%g", spread), Graph: testproblems.Graph(side*side, edges),
		Fixed: []int32{0, int32(side*side - 1)}, Values: []float64{0, 1}, P: math.Inf(1),
	}
}

// comb is a spine with teeth of growing length, a label at each tip.
func comb(teeth int) testproblems.Problem {
	pr := testproblems.Problem{Name: "comb", P: math.Inf(1)}
	var edges []testproblems.Edge
	n := teeth
	for i := range teeth {
		if i > 0 {
			edges = append(edges, testproblems.Edge{I: i - 1, J: i})
		}
		from := i
		for range i + 1 {
			edges = append(edges, testproblems.Edge{I: from, J: n})
			from = n
			n++
		}
		pr.Fixed = append(pr.Fixed, int32(n-1))
		pr.Values = append(pr.Values, float64(i*i%17))
	}
	pr.Graph = testproblems.Graph(n, edges)
	return pr
}

// tenDecades is a cloud with weights stretched to lie between 1e-10 and 1.
func tenDecades(n int) testproblems.Problem {
	pr := testproblems.Cloud(2, n, 2, 10, 20)
	low := slices.Min(pr.Graph.Val)
	val := make([]float64, len(pr.Graph.Val))
	for k, x := range pr.Graph.Val {
		val[k] = x / low * math.Log(1e-10)
	}
	pr.Name, pr.Graph = "weights=1e-10..1", pr.Graph.WithValues(val)
	return pr
}

func relabelled(n, labels int) testproblems.Problem {
	pr := testproblems.Cloud(2, n, 2, 10, labels)
	pr.Name = fmt.Sprintf("labels=%d", labels)
	return pr
}

// oneSearch is the median time in seconds of five searches from all labels.
func oneSearch(pr testproblems.Problem) float64 {
	s := newSolver(pr.Graph, pr.Fixed, make([]float64, len(pr.Fixed)), 0, 1, Options{})
	s.length = make([]float64, len(pr.Graph.Val))
	w := s.spare.Get().(*worker)
	var all []int32
	for v := range s.set {
		if s.set[v] != held {
			all = append(all, int32(v))
		}
	}
	w.measure(part{vertices: all}, slices.Max(pr.Graph.Val))
	var times []float64
	for range 5 {
		start := time.Now()
		w.distances(all, 1, 0, 1, s.upper, s.ids.Add(1))
		times = append(times, time.Since(start).Seconds())
	}
	if math.IsInf(s.upper[all[0]].dist, 1) {
		panic("not reached")
	}
	slices.Sort(times)
	return times[2]
}
