package laplace

import (
	"context"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"golang.org/x/sys/unix"

	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/parallel"
	"pinfill/internal/points"
	"pinfill/internal/sparse"
)

// cloud is the symmetrised 10-nearest-neighbour graph of n uniform points in the d-cube, or of clusters of them, in
// the order of a k-d tree, with conductances of a Gaussian kernel of the local bandwidth times h.
func cloud(tb testing.TB, n, d int, h float64, clusters int) *sparse.CSR {
	tb.Helper()
	r := rand.New(rand.NewPCG(uint64(n), uint64(d)))
	m := points.NewMatrix(n, d)
	for i := range n {
		row := m.Row(i)
		for j := range row {
			row[j] = r.Float64()
		}
		if clusters > 0 {
			c := rand.New(rand.NewPCG(uint64(i%clusters), 99))
			for j := range row {
				row[j] = c.Float64() + .01*r.NormFloat64()
			}
		}
	}
	order, err := points.Order(context.Background(), m, 0)
	if err != nil {
		tb.Fatal(err)
	}
	sorted := points.NewMatrix(n, d)
	for i, from := range order {
		copy(sorted.Row(i), m.Row(int(from)))
	}
	lists, _, err := neighbors.KNearest(context.Background(), sorted, 10, neighbors.Options{})
	if err != nil {
		tb.Fatal(err)
	}
	g, err := graph.FromLists(lists, 10, 0)
	if err != nil {
		tb.Fatal(err)
	}
	logs, err := g.LogWeights(graph.Gaussian, graph.Bandwidth{Local: true, H: h}, 0)
	if err != nil {
		tb.Fatal(err)
	}
	c := make([]float64, logs.NNZ())
	for k, v := range logs.Val {
		c[k] = math.Exp(2 * v)
	}
	return logs.WithValues(c)
}

// cpuTime is the processor time of the process in seconds.
func cpuTime() (user, system float64) {
	var r unix.Rusage
	if unix.Getrusage(unix.RUSAGE_SELF, &r) != nil {
		return math.NaN(), math.NaN()
	}
	return float64(r.Utime.Nano()) / 1e9, float64(r.Stime.Nano()) / 1e9
}

func spread(n, l int) []int32 {
	r := rand.New(rand.NewPCG(uint64(n), uint64(l)))
	return pickFixed(r, n, l)
}

// unit is the time of one product of the matrix c with a vector in double precision on the given workers: wall, and
// of processors.
func unit(c *sparse.CSR, workers int) (wall, processor float64) {
	x, y := make([]float64, c.N), make([]float64, c.N)
	for i := range x {
		x[i] = math.Sin(float64(i))
	}
	var walls, cpus []float64
	for range 7 {
		reps := max(1, 4_000_000/(c.NNZ()+1))
		user, _ := cpuTime()
		start := time.Now()
		for range reps {
			parallel.For(workers, c.N, rowChunk, func(lo, hi int) {
				for i := lo; i < hi; i++ {
					cols := c.Col[c.RowPtr[i]:c.RowPtr[i+1]]
					vals := c.Val[c.RowPtr[i]:c.RowPtr[i+1]]
					var s float64
					for k, j := range cols {
						s += vals[k] * x[j]
					}
					y[i] = s
				}
			})
		}
		walls = append(walls, time.Since(start).Seconds()/float64(reps))
		after, _ := cpuTime()
		cpus = append(cpus, (after-user)/float64(reps))
	}
	slices.Sort(walls)
	slices.Sort(cpus)
	return walls[3], cpus[3]
}

func benchmarkSolve(b *testing.B, c *sparse.CSR, fixed []int32, classes int, o Options, tol float64) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(1, 2))
	var values, x [][]float64
	for range classes {
		v := make([]float64, len(fixed))
		for i := range v {
			v[i] = r.Float64()
		}
		values = append(values, v)
		x = append(x, make([]float64, c.N))
	}
	u, p := unit(c, o.Workers)
	var setup, solve float64
	var spent [2]float64
	var st Stats
	for b.Loop() {
		for k := range x {
			clear(x[k])
		}
		user, sys := cpuTime()
		start := time.Now()
		s, err := New(ctx, c, fixed, o)
		if err != nil {
			b.Fatal(err)
		}
		setup += time.Since(start).Seconds()
		st, err = s.SolveDirichlet(ctx, values, x, tol)
		if err != nil {
			b.Fatal(err)
		}
		solve += time.Since(start).Seconds()
		u2, s2 := cpuTime()
		spent[0] += u2 - user
		spent[1] += s2 - sys
	}
	u2, p2 := unit(c, o.Workers)
	u, p = (u+u2)/2, (p+p2)/2
	n := float64(b.N)
	b.ReportMetric(setup/n/u, "setup-units")
	b.ReportMetric(solve/n/u, "units")
	b.ReportMetric(spent[0]/n/p, "user-units")
	b.ReportMetric(spent[1]/n/p, "sys-units")
	b.ReportMetric(float64(st.Iterations)/float64(classes), "its")
	b.ReportMetric(p*1e9/float64(c.NNZ()), "unit-cpu-ns/nnz")
	b.ReportMetric(float64(st.Method), "method")
	if !st.Converged {
		b.Errorf("not converged: %+v", st)
	}
}

func BenchmarkSolve(b *testing.B) {
	for _, d := range []int{2, 3, 10} {
		for _, n := range []int{10_000, 100_000, 1_000_000} {
			if d == 10 && n > 100_000 {
				continue // the search would take minutes
			}
			var c *sparse.CSR
			for _, classes := range []int{1, 10} {
				b.Run(fmt.Sprintf("d=%d/n=%d/classes=%d", d, n, classes), func(b *testing.B) {
					if c == nil {
						c = cloud(b, n, d, 1, 0)
					}
					benchmarkSolve(b, c, spread(n, 100), classes, Options{}, 1e-8)
				})
			}
		}
	}
}

func BenchmarkHard(b *testing.B) {
	cases := hardNetworks(100_000)
	cases["narrow"] = func() (*sparse.CSR, []int32) { return cloud(b, 100_000, 2, .3, 0), spread(100_000, 100) }
	cases["clustered"] = func() (*sparse.CSR, []int32) { return cloud(b, 100_000, 2, 1, 50), spread(100_000, 1000) }
	cases["one label"] = func() (*sparse.CSR, []int32) { return cloud(b, 100_000, 2, 1, 0), []int32{77, 78} }
	cases["half labelled"] = func() (*sparse.CSR, []int32) {
		var f []int32
		for i := 0; i < 100_000; i += 2 {
			f = append(f, int32(i))
		}
		return cloud(b, 100_000, 2, 1, 0), f
	}
	for _, name := range slices.Sorted(maps.Keys(cases)) {
		b.Run(name, func(b *testing.B) {
			c, fixed := cases[name]()
			label, count := sparse.Components(c)
			held := make([]bool, count)
			for _, v := range fixed {
				held[label[v]] = true
			}
			for v, l := range label { // a label for each component
				if !held[l] {
					held[l] = true
					fixed = append(fixed, int32(v))
				}
			}
			slices.Sort(fixed)
			benchmarkSolve(b, c, fixed, 1, Options{}, 1e-8)
		})
	}
}
