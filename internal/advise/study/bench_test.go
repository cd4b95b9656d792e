package study

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"pinfill/internal/advise"
	"pinfill/internal/choose"
	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/solve"
	"pinfill/internal/trust"
)

// BenchmarkTrust takes 100,000 rows of three features with 100 labels of four classes and prints what trust and advice
// cost, in units of labelling at p = 2 (neighbours, weights, solve): left-out answers, probabilities and sets of every
// row, the audit, and twenty rows named.
func BenchmarkTrust(b *testing.B) {
	const n, d, count, classes = 100_000, 3, 100, 4
	ctx := context.Background()
	r := rand.New(rand.NewPCG(1, 1))
	raw := points.NewMatrix(n, d)
	for i := range raw.Data {
		raw.Data[i] = r.Float64()
	}
	for b.Loop() {
		clock := time.Now()
		lap := func() float64 {
			s := time.Since(clock).Seconds()
			clock = time.Now()
			return s
		}
		space, err := points.Prepare(ctx, raw, points.Options{})
		if err != nil {
			b.Fatal(err)
		}
		lists, _, err := neighbors.KNearest(ctx, space.Points, choose.DefaultNeighbors, neighbors.Options{})
		if err != nil {
			b.Fatal(err)
		}
		g, err := graph.FromLists(lists, choose.DefaultNeighbors, 0)
		if err != nil {
			b.Fatal(err)
		}
		w, err := g.LogWeights(graph.Gaussian, graph.Bandwidth{Local: true, H: 1}, 0)
		if err != nil {
			b.Fatal(err)
		}
		l := &lab{graph: w, conduct: choose.Conductances(w, solve.Slope), n: w.N, classes: classes}
		at := l.draw(rand.New(rand.NewPCG(2, 2)), count)
		s := l.labels(at, func(k int) int {
			x := space.Points.Row(int(at[k]))
			return int(math.Abs(math.Floor(2*x[0]+x[1]*x[1]))) % classes
		})
		problem := solve.Problem{Graph: w, P: 2}
		build := lap()
		scores, _, err := choose.Solve(ctx, problem, s, nil, solve.Settings{})
		if err != nil {
			b.Fatal(err)
		}
		label := build + lap()
		left, err := choose.LeaveOut(ctx, problem, s, choose.LeaveOptions{Start: scores})
		if err != nil {
			b.Fatal(err)
		}
		leaving := lap()
		given := make([]int, count)
		for k := range given {
			given[k] = s.Class(k)
		}
		cal, err := trust.FitCalibration(trust.ClassEvidence{Classes: classes, LeftOut: left.Score, Given: given})
		if err != nil {
			b.Fatal(err)
		}
		sets, err := trust.NewSets(cal, trust.SetSettings{Coverage: .9})
		if err != nil {
			b.Fatal(err)
		}
		row, prob := make([]float64, classes), make([]float64, classes)
		var set []int32
		doubt := make([]float64, n)
		for v := range n {
			for c := range row {
				row[c] = scores[c][v]
			}
			set = sets.Of(set[:0], cal.Probabilities(prob, row))
			slices.Sort(row)
			doubt[v] = 1 - (row[classes-1]-row[classes-2])/row[classes-1]
		}
		judging := lap()
		p := make([][]float64, count)
		for k := range p {
			p[k] = cal.Probabilities(make([]float64, classes), left.Score[k])
		}
		if _, err := advise.AuditClasses(given, p, nil); err != nil {
			b.Fatal(err)
		}
		auditing := lap()
		if _, err := advise.Next(ctx, advise.NextProblem{Conductance: l.conduct, Labelled: at, Doubt: doubt, Count: 20}); err != nil {
			b.Fatal(err)
		}
		naming := lap()
		b.ReportMetric(label, "label-s")
		b.ReportMetric(leaving/label, "leave-out/label")
		b.ReportMetric(judging/label, "judge/label")
		b.ReportMetric(auditing/label, "audit/label")
		b.ReportMetric(naming/label, "next/label")
		b.ReportMetric((leaving+judging+auditing+naming)/label, "all/label")
	}
}
