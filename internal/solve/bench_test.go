package solve

import (
	"context"
	"fmt"
	"math"
	"testing"
	"time"

	"pinfill/internal/testproblems"
)

// BenchmarkRun times certified solves on k-nearest-neighbour graphs (k = 10, 100 labels) and prints, beside the time,
// its ratio to the certified p = 2 solve of the same graph in the same run, the linear systems solved and the width.
func BenchmarkRun(b *testing.B) {
	for _, n := range []int{10_000, 100_000, 1_000_000} {
		for _, d := range []int{2, 3} {
			b.Run(fmt.Sprintf("n=%d/d=%d", n, d), func(b *testing.B) {
				pr := testproblems.Cloud(1, n, d, 10, 100)
				yardstick := 0.0
				for _, p := range []float64{2, 1.5, 3, 4, 8, 32} {
					b.Run(fmt.Sprintf("p=%v", p), func(b *testing.B) {
						q := problemOf(pr)
						q.P = p
						var r Result
						begin := time.Now()
						for b.Loop() {
							var err error
							if r, err = Run(context.Background(), q, Settings{}); err != nil {
								b.Fatal(err)
							}
						}
						each := time.Since(begin).Seconds() / float64(b.N)
						if p == 2 {
							yardstick = each
						}
						b.ReportMetric(each/yardstick, "x_p2")
						b.ReportMetric(float64(r.Counts.LinearSolves), "systems")
						b.ReportMetric(float64(r.Counts.Iterations), "iterations")
						b.ReportMetric(r.Certificate.Width, "width")
						if !(r.Certificate.Width <= DefaultTolerance) || math.IsNaN(r.Certificate.Width) {
							b.Errorf("not certified: %+v", r.Certificate)
						}
					})
				}
			})
		}
	}
}

// BenchmarkClasses times ten sets of values on one graph at p = 2 and prints the ratio to one.
func BenchmarkClasses(b *testing.B) {
	pr := problemOf(testproblems.Cloud(1, 100_000, 2, 10, 100))
	pr.P = 2
	sets := make([][]float64, 10)
	for c := range sets {
		sets[c] = make([]float64, len(pr.Values))
		for k := range sets[c] {
			if k%10 == c {
				sets[c][k] = 1
			}
		}
	}
	one := 0.0
	for _, count := range []int{1, 10} {
		b.Run(fmt.Sprintf("classes=%d", count), func(b *testing.B) {
			begin := time.Now()
			for b.Loop() {
				if _, err := RunMany(context.Background(), pr, sets[:count], nil, Settings{}); err != nil {
					b.Fatal(err)
				}
			}
			each := time.Since(begin).Seconds() / float64(b.N)
			if count == 1 {
				one = each
			}
			b.ReportMetric(each/one, "x_one")
		})
	}
}
