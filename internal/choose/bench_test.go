package choose

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"pinfill/internal/graph"
	"pinfill/internal/solve"
)

// BenchmarkAuto prints what choosing costs in solves at the chosen setting: 30 labels on a sheet of 5,000 points.
func BenchmarkAuto(b *testing.B) {
	for _, c := range []struct {
		name    string
		classes int
	}{{"numbers", 0}, {"classes", 3}} {
		b.Run(c.name, func(b *testing.B) {
			r := rand.New(rand.NewPCG(95, 5))
			source, v := sheet(b, r, 5000, func(x, y float64) float64 {
				if c.classes > 0 {
					return math.Floor(3 * x)
				}
				return math.Sin(4*x) + y
			})
			l := label(r, v, 30, c.classes)
			var ratio float64
			for b.Loop() {
				t0 := time.Now()
				d, err := Auto(context.Background(), source, l, Asked{}, Options{})
				if err != nil {
					b.Fatal(err)
				}
				all := time.Since(t0)
				g, err := source(context.Background(), d.Setting)
				if err != nil {
					b.Fatal(err)
				}
				t0 = time.Now()
				if _, _, err := Solve(context.Background(), solve.Problem{Graph: g, P: d.P}, l, nil, solve.Settings{}); err != nil {
					b.Fatal(err)
				}
				ratio = float64(all) / float64(time.Since(t0))
			}
			b.ReportMetric(ratio, "solves")
		})
	}
}

// BenchmarkSweep prints what p = 2, 2.5, 3, 4, 6, 8, 16 and inf together cost over p = 8 alone, without leave-out.
func BenchmarkSweep(b *testing.B) {
	r := rand.New(rand.NewPCG(96, 5))
	source, v := sheet(b, r, 5000, func(x, y float64) float64 { return math.Sin(4*x) + y })
	l := label(r, v, 20, 0)
	at := func(ps ...float64) []Setting {
		var all []Setting
		for _, p := range ps {
			all = append(all, Setting{P: p, Neighbors: DefaultNeighbors, Bandwidth: graph.Bandwidth{Local: true, H: 1}})
		}
		return all
	}
	run := func(s []Setting) time.Duration {
		t0 := time.Now()
		if _, err := Sweep(context.Background(), source, l, s, Options{}); err != nil {
			b.Fatal(err)
		}
		return time.Since(t0)
	}
	var ratio float64
	for b.Loop() {
		alone := run(at(8))
		ratio = float64(run(at(2, 2.5, 3, 4, 6, 8, 16, math.Inf(1)))) / float64(alone)
	}
	b.ReportMetric(ratio, "x")
}
