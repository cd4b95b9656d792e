package neighbors

import (
	"bytes"
	"context"
	"encoding/binary"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"testing"
	"time"

	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// BenchmarkAllNearest finds the 10 nearest of each of a million uniform points, ordering them included, and sets the
// time against SciPy's cKDTree (build and query, two workers) on the same points where Python with SciPy is there.
func BenchmarkAllNearest(b *testing.B) {
	for _, d := range []int{2, 3} {
		b.Run(fmt.Sprintf("d=%d", d), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, uint64(d)))
			m := fill(1_000_000, d, func(int, int) float64 { return r.Float64() })
			theirs, err := scipy(m, 10)
			var order, search time.Duration
			for b.Loop() {
				start := time.Now()
				s, e := points.Prepare(context.Background(), m, points.Options{Scale: points.None, Workers: 2})
				if e != nil {
					b.Fatal(e)
				}
				order += time.Since(start)
				start = time.Now()
				if _, _, e = KNearest(context.Background(), s.Points, 10, Options{Workers: 2}); e != nil {
					b.Fatal(e)
				}
				search += time.Since(start)
			}
			b.ReportMetric(order.Seconds()/float64(b.N), "s-prepare")
			b.ReportMetric(search.Seconds()/float64(b.N), "s-search")
			if err != nil {
				b.Logf("no yardstick: %v", err)
				return
			}
			b.ReportMetric(theirs, "s-ckdtree")
			b.ReportMetric((order+search).Seconds()/float64(b.N)/theirs, "ratio")
		})
	}
}

// scipy gives the seconds cKDTree takes.
func scipy(m *points.Matrix, k int) (float64, error) {
	var in bytes.Buffer
	if err := binary.Write(&in, binary.LittleEndian, m.Data); err != nil {
		return 0, err
	}
	python := "python3"
	if p := os.Getenv("PYTHON"); p != "" {
		python = p
	}
	cmd := exec.Command(python, "testdata/ckdtree.py", fmt.Sprint(m.N), fmt.Sprint(m.D), fmt.Sprint(k))
	cmd.Stdin = &in
	out, err := cmd.Output()
	if err != nil {
		return 0, err
	}
	var build, query float64
	_, err = fmt.Sscan(string(out), &build, &query)
	return build + query, err
}

// BenchmarkDescent sets the approximate search of 200,000 clustered points in 64 columns against blocked brute force,
// timed on some of its buckets: every bucket against all points.
func BenchmarkDescent(b *testing.B) {
	m := clustered(200_000, 64, 200, 12)
	s, err := points.Prepare(context.Background(), m, points.Options{Workers: 2})
	if err != nil {
		b.Fatal(err)
	}
	o := Options{Search: Approximate, Workers: 2}
	if err := check(s.Points, &o); err != nil {
		b.Fatal(err)
	}
	t, err := newTree(context.Background(), s.Points, o)
	if err != nil {
		b.Fatal(err)
	}
	brute, pruned := timeBlocks(t, o.Workers)
	for b.Loop() {
		start := time.Now()
		_, rep, err := KNearest(context.Background(), s.Points, 10, o)
		if err != nil {
			b.Fatal(err)
		}
		took := time.Since(start).Seconds()
		b.ReportMetric(took, "s-descent")
		b.ReportMetric(rep.Recall, "recall")
		b.ReportMetric(float64(rep.Distances)/float64(m.N), "distances/point")
		b.ReportMetric(brute, "s-brute")
		b.ReportMetric(brute/took, "times-faster")
		b.ReportMetric(pruned/took, "times-faster-than-blocks")
	}
}

// timeBlocks estimates the seconds of a full search by blocks from a few buckets: without pruning, and as it is.
func timeBlocks(t *tree, workers int) (brute, pruned float64) {
	bl := newBlocks(t, workers)
	works := make([]*batch, 32)
	start := time.Now()
	parallel.For(workers, len(works), 1, func(i, _ int) {
		lo, hi := bl.bucket(i * (1 << bl.level) / len(works))
		w := bl.batch()
		var places []int
		var close [][]float64
		var index [][]int32
		for p := lo; p < hi; p++ {
			places, close, index = append(places, p), append(close, make([]float64, 10)), append(index, make([]int32, 10))
		}
		w.others(context.Background(), places, close, index)
		works[i] = w
	})
	took := time.Since(start).Seconds()
	var pairs, queries float64
	for _, w := range works {
		pairs += float64(w.distances)
		queries += float64(len(w.places))
	}
	n := float64(t.pts.N)
	return took / pairs * n * n, took / queries * n
}

// named is a set of points with a name.
type named struct {
	name string
	m    *points.Matrix
}

// hostile gives sets of n points that trees are known to dislike, uniform points first.
func hostile(n int) []named {
	const d = 3
	r := rand.New(rand.NewPCG(9, 9))
	return []named{
		{"uniform", fill(n, d, func(int, int) float64 { return r.Float64() })},
		{"full grid", fill(n, d, func(i, j int) float64 { return float64([]int{i % 59, i / 59 % 59, i / 59 / 59}[j]) })},
		{"coarse grid", fill(n, d, func(int, int) float64 { return float64(r.IntN(10)) })},
		{"half identical", fill(n, d, func(i, _ int) float64 { return float64(i%2) * r.Float64() })},
		{"binary column", fill(n, d, func(i, j int) float64 { return float64(j/2*r.IntN(2)) + float64(1-j/2)*r.Float64() })},
		{"axes", fill(n, d, func(i, j int) float64 { return float64((i%3-j+3)%3/2) * r.NormFloat64() })},
		{"powers", fill(n, d, func(int, int) float64 { return math.Exp2(60 * r.Float64()) })},
		{"shell", fill(n, d, func(i, j int) float64 {
			z, a := float64(i)/float64(n)*2-1, float64(i)*2.399963 // golden angle
			return []float64{math.Sqrt(1-z*z) * math.Cos(a), math.Sqrt(1-z*z) * math.Sin(a), z}[j]
		})},
		{"sorted line", fill(n, d, func(i, j int) float64 { return float64(i * (j + 1)) })},
		{"nested clusters", fill(n, d, func(i, _ int) float64 { return math.Ldexp(r.NormFloat64(), -(i % 40)) })},
	}
}

// BenchmarkHostile sets the time from raw rows to neighbours, for point sets that hurt k-d trees, against uniform
// points of the same size.
func BenchmarkHostile(b *testing.B) {
	sets := hostile(200_000)
	for b.Loop() {
		var base float64
		for _, set := range sets {
			start := time.Now()
			s, err := points.Prepare(context.Background(), set.m, points.Options{Workers: 2})
			if err != nil {
				b.Fatal(err)
			}
			middle := time.Now()
			if _, _, err := KNearest(context.Background(), s.Points, 10, Options{Workers: 2}); err != nil {
				b.Fatal(err)
			}
			took := time.Since(start).Seconds()
			if base == 0 {
				base = took
			}
			b.Logf("%-16s %7d points: prepare %.3f s, search %.3f s, %.2f of uniform", set.name, s.Points.N, middle.Sub(start).Seconds(), time.Since(middle).Seconds(), took/base)
		}
	}
}

// BenchmarkEngines times both exact engines on a sample of points, with what the plan chooses.
func BenchmarkEngines(b *testing.B) {
	for _, d := range []int{2, 5, 8, 12, 16, 32, 64} {
		for _, kind := range []string{"uniform", "sheet"} {
			const n = 100_000
			m := clustered(n, d, 1, min(d, 5))
			if kind == "uniform" {
				r := rand.New(rand.NewPCG(4, uint64(d)))
				m = fill(n, d, func(int, int) float64 { return r.Float64() })
			}
			b.Run(fmt.Sprintf("%s/d=%d", kind, d), func(b *testing.B) {
				s, err := points.Prepare(context.Background(), m, points.Options{Workers: 2})
				if err != nil {
					b.Fatal(err)
				}
				o := Options{Workers: 2}
				if err := check(s.Points, &o); err != nil {
					b.Fatal(err)
				}
				t, err := newTree(context.Background(), s.Points, o)
				if err != nil {
					b.Fatal(err)
				}
				for b.Loop() {
					start := time.Now()
					const step = 97
					parallel.For(2, n/step, 8, func(lo, hi int) {
						f := t.finder()
						for i := lo; i < hi; i++ {
							f.others(i*step, t.nodeOf(i*step, t.levels), make([]float64, 10), make([]int32, 10))
						}
					})
					tree := time.Since(start).Seconds() / (n / step) * 1e6
					brute, pruned := timeBlocks(t, 2)
					p := t.plan(context.Background(), 10, o)
					b.ReportMetric(tree, "us-tree")
					b.ReportMetric(pruned/n*1e6, "us-blocks")
					b.ReportMetric(brute/n*1e6, "us-brute")
					b.ReportMetric(p.work/n/2e3, "us-expected")
					b.ReportMetric(map[bool]float64{true: 1}[p.blocks != nil], "blocks-chosen")
				}
			})
		}
	}
}
