package choose

import (
	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// normalisedCut is the sum over classes of cut/volume (Shi and Malik 2000) of the decisions that weights make, labels
// at their own class: 0 for classes that no edge joins, near classes-1 for a random partition. conductance holds the
// edge conductances. A class without any vertex counts as 1, as does one that is all cut. Vertices with NaN scores and
// their edges are left out.
func normalisedCut(conductance *sparse.CSR, scores [][]float64, w Weights, l Labels, workers int) float64 {
	n, classes := conductance.N, len(w)
	class := make([]int32, n)
	parallel.For(workers, n, 4096, func(lo, hi int) {
		for v := lo; v < hi; v++ {
			class[v] = int32(w.Decide(func(c int) float64 { return scores[c][v] }))
		}
	})
	for k, v := range l.Vertex {
		class[v] = int32(l.Class(k))
	}
	const grain = 4096
	type sums struct{ within, volume []float64 }
	parts := make([]sums, (n+grain-1)/grain)
	parallel.ForChunk(workers, n, grain, func(_, chunk, lo, hi int) {
		s := sums{make([]float64, classes), make([]float64, classes)}
		for v := lo; v < hi; v++ {
			own := class[v]
			if own < 0 {
				continue
			}
			cols, vals := conductance.Row(v)
			var in, all float64
			for k, u := range cols {
				if class[u] < 0 {
					continue
				}
				all += vals[k]
				if class[u] == own {
					in += vals[k]
				}
			}
			s.within[own] += in
			s.volume[own] += all
		}
		parts[chunk] = s
	})
	var cut float64
	for c := range classes {
		var in, all float64
		for _, s := range parts {
			in += s.within[c]
			all += s.volume[c]
		}
		if all > 0 {
			cut += 1 - in/all
		} else {
			cut++
		}
	}
	return cut
}
