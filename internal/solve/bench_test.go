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
