package choose

import (
	"context"
	"errors"
	"math"
	"slices"

	"pinfill/internal/graph"
	"pinfill/internal/sparse"
)

const (
	contrastRank = 7  // neighbour whose distance stands for the local density
	contrastK    = 10 // neighbours that the dimension is read from
	// evenBelow: the study's tables without gaps (squares, rolls, spheres, cubes of 1 to 5 dimensions, rings, moons) have
	// a contrast of 1.1 to 1.9, clusters and the open tables 1.9 to 5.6.
	evenBelow = 2
)

// contrast says how unevenly rows lie, free of scale and dimension: the standard deviation of ln s, s the distance to
// the 7th neighbour, over what it would be for points spread evenly, 1/(d sqrt(7)) with d the intrinsic dimension (the
// volume within s is then a Gamma variable of shape 7). About 1 to 2 is even, edges of the table included; sparse gaps
// and dense middles raise it. d is the estimate of Levina and Bickel (2004) with the inverses averaged. NaN where fewer
// than half of the vertices have seven neighbours, or all distances are alike.
//
// The distances are asked of the source: with the inverse kernel and bandwidth 1, ln w is -ln distance.
func contrast(ctx context.Context, source Source, s Setting) (float64, error) {
	s.Kernel, s.Bandwidth = graph.Inverse, graph.Bandwidth{H: 1}
	g, err := source(ctx, s)
	var under *graph.UnderflowError
	if errors.As(err, &under) {
		return math.NaN(), nil // distances too far from 1 to be told
	}
	if err != nil {
		return math.NaN(), err
	}
	return contrastOf(g), nil
}

func contrastOf(g *sparse.CSR) float64 {
	var scale, inverse []float64
	var near []float64
	for v := range g.N {
		_, logs := g.Row(v)
		if len(logs) < contrastRank {
			continue
		}
		near = near[:0]
		for _, a := range logs {
			near = append(near, -a)
		}
		slices.Sort(near)
		near = near[:min(len(near), contrastK)]
		last := len(near) - 1
		var t float64
		for _, a := range near[:last] {
			t += near[last] - a
		}
		scale = append(scale, near[contrastRank-1])
		inverse = append(inverse, t/float64(last))
	}
	if 2*len(scale) < g.N {
		return math.NaN()
	}
	m, v := mean(scale), 0.0
	for _, a := range scale {
		v += float64((a - m) * (a - m))
	}
	sd := math.Sqrt(v / float64(len(scale)))
	return sd / mean(inverse) * math.Sqrt(contrastRank)
}
