package graph

import (
	"context"
	"io"
	"math/rand/v2"
	"runtime"
	"strconv"
	"testing"
	"time"

	"pinfill/internal/neighbors"
)

// BenchmarkBuild times what follows the search against the search: symmetrising and weighting, as a share of the
// all-10-nearest search of the same points, index included. Peak bytes a vertex count the lists, the skeleton and the
// weights together.
func BenchmarkBuild(b *testing.B) {
	for _, d := range []int{2, 3} {
		b.Run("d="+strconv.Itoa(d), func(b *testing.B) {
			pts := cloud(b, 3, 1_000_000, d, 0)
			start := time.Now()
			l, _, err := neighbors.KNearest(context.Background(), pts, 10, neighbors.Options{})
			if err != nil {
				b.Fatal(err)
			}
			search := time.Since(start)
			var build time.Duration
			var before, after runtime.MemStats
			for b.Loop() {
				runtime.ReadMemStats(&before)
				start := time.Now()
				g, err := FromLists(l, 10, 0)
				if err != nil {
					b.Fatal(err)
				}
				w, err := g.LogWeights(Gaussian, Bandwidth{Local: true, H: 1}, 0)
				if err != nil {
					b.Fatal(err)
				}
				build += time.Since(start)
				runtime.ReadMemStats(&after)
				runtime.KeepAlive(w)
			}
			b.ReportMetric(search.Seconds(), "search-s")
			b.ReportMetric(build.Seconds()/float64(b.N)/search.Seconds(), "build/search")
			b.ReportMetric(float64(after.TotalAlloc-before.TotalAlloc)/float64(l.N), "built-B/row")
		})
	}
}

// BenchmarkParts times the rest of what is done with a graph of 1e6 vertices, each against symmetrising.
func BenchmarkParts(b *testing.B) {
	pts := cloud(b, 3, 1_000_000, 2, 0)
	l := nearest(b, pts, 10)
	g, _ := FromLists(l, 10, 0)
	w, _ := g.LogWeights(Gaussian, Bandwidth{Local: true, H: 1}, 0)
	name := func(dst []byte, v int32) []byte { return strconv.AppendInt(dst, int64(v), 10) }
	for _, part := range []struct {
		name string
		run  func()
	}{
		{"symmetrise", func() { _, _ = FromLists(l, 10, 0) }},
		{"weights", func() { _, _ = g.LogWeights(Gaussian, Bandwidth{Local: true, H: 1}, 0) }},
		{"forest", func() { SpanningForest(g.Skeleton, 0) }},
		{"health", func() { Measure(w, 0) }},
		{"reach", func() { _, _ = FindReach(w, nil) }},
		{"edge-list", func() { _, _ = WriteEdgeList(io.Discard, w, name, ',', 0) }},
		{"matrix-market", func() { _, _ = WriteMatrixMarket(io.Discard, w, nil, 0) }},
	} {
		b.Run(part.name, func(b *testing.B) {
			for b.Loop() {
				part.run()
			}
		})
	}
}

// BenchmarkFromEdges builds a graph of 1e7 random edges on 1e6 vertices.
func BenchmarkFromEdges(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 1))
	edges := make([]Edge, 10_000_000)
	for i := range edges {
		v := rng.Int32N(1_000_000)
		edges[i] = Edge{v, (v + 1 + rng.Int32N(999_999)) % 1_000_000, 1}
	}
	for b.Loop() {
		if _, _, err := FromEdges(1_000_000, edges, 0); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(edges)), "ns/edge")
}
