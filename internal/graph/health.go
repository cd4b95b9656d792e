package graph

import (
	"math"
	"slices"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// Hub is a vertex that many others list as a neighbour.
type Hub struct {
	Vertex int32
	Degree int
}

// Health says whether a weighted graph can carry labels.
type Health struct {
	Vertices, Edges                    int
	DegreeMin, DegreeMedian, DegreeMax int     // edges at a vertex; the lower median
	DegreeSkew                         float64 // skewness of the degrees; 0 where all are equal
	Hubs                               []Hub   // vertices of degree above HubFactor medians, largest first, at most maxListed
	HubCount                           int     // how many there are
	Isolated                           []int32 // vertices without an edge, at most maxListed
	IsolatedCount                      int
	LogMin, LogMedian, LogMax          float64 // ln w over edges; NaN for a graph without edges
	Underflowed                        int     // edges whose weight a float64 cannot hold; they stand by their logarithm
	EffectiveMin, EffectiveMedian      float64 // effective degree over vertices with an edge; NaN without
	Hanging                            int     // vertices with several edges and an effective degree below hangingDegree
	Components                         int
	ComponentSizes                     []int // vertices of each component, largest first, at most maxListed
	Singletons                         int   // components of one vertex
	LargestShare                       float64
}

const (
	// HubFactor is how many times the median degree makes a vertex a hub. On K nearest neighbours the number of lists a
	// vertex stands in grows skew with dimension (Radovanovic, Nanopoulos and Ivanovic 2010); on points of few
	// dimensions the largest degree stays below 3 medians.
	HubFactor = 4

	// hangingDegree: at an effective degree below it a vertex follows one neighbour almost alone.
	hangingDegree = 1.1

	maxListed = 20
)

// Measure takes the health of a weighted graph, Val = ln w.
//
// The effective degree of a vertex is (sum w)^2 / sum w^2 over its edges: the number of equal edges that would spread
// its trust as evenly (the participation ratio). It is taken from the differences of ln w, which no bandwidth
// underflows.
func Measure(a *sparse.CSR, workers int) Health {
	h := Health{Vertices: a.N, Edges: a.NNZ() / 2}
	h.measureDegrees(a)
	h.measureWeights(a, workers)
	label, count := sparse.Components(a)
	size := sparse.Sizes(label, count)
	slices.SortFunc(size, func(x, y int) int { return y - x })
	h.Components = count
	for _, s := range size {
		if s == 1 {
			h.Singletons++
		}
	}
	if count > 0 {
		h.LargestShare = float64(size[0]) / float64(a.N)
	}
	h.ComponentSizes = slices.Clone(size[:min(count, maxListed)])
	return h
}

func (h *Health) measureDegrees(a *sparse.CSR) {
	if a.N == 0 {
		return
	}
	degree := func(v int) int { return a.RowPtr[v+1] - a.RowPtr[v] }
	h.DegreeMin = math.MaxInt
	for v := range a.N {
		d := degree(v)
		h.DegreeMin, h.DegreeMax = min(h.DegreeMin, d), max(h.DegreeMax, d)
		if d == 0 {
			h.IsolatedCount++
			if len(h.Isolated) < maxListed {
				h.Isolated = append(h.Isolated, int32(v))
			}
		}
	}
	with := make([]int, h.DegreeMax+1) // vertices of each degree
	var m2, m3 float64
	mean := float64(a.NNZ()) / float64(a.N)
	for v := range a.N {
		with[degree(v)]++
	}
	for d, c := range with {
		x := float64(d) - mean
		m2 += float64(float64(c) * x * x)
		m3 += float64(float64(c) * x * x * x)
	}
	if m2 > 0 {
		n := float64(a.N)
		h.DegreeSkew = (m3 / n) / math.Pow(m2/n, 1.5)
	}
	for below := 0; ; h.DegreeMedian++ {
		if below += with[h.DegreeMedian]; below > (a.N-1)/2 {
			break
		}
	}
	for v := range a.N {
		if d := degree(v); d > HubFactor*max(h.DegreeMedian, 1) {
			h.HubCount++
			h.Hubs = append(h.Hubs, Hub{int32(v), d})
		}
	}
	slices.SortStableFunc(h.Hubs, func(x, y Hub) int { return y.Degree - x.Degree })
	h.Hubs = slices.Clone(h.Hubs[:min(len(h.Hubs), maxListed)])
}

func (h *Health) measureWeights(a *sparse.CSR, workers int) {
	h.LogMin, h.LogMedian, h.LogMax = math.NaN(), math.NaN(), math.NaN()
	h.EffectiveMin, h.EffectiveMedian = math.NaN(), math.NaN()
	if a.NNZ() == 0 {
		return
	}
	effective := make([]float64, a.N)
	parallel.For(workers, a.N, rowGrain, func(lo, hi int) {
		for v := lo; v < hi; v++ {
			_, logs := a.Row(v)
			effective[v] = EffectiveDegree(logs)
		}
	})
	kept := effective[:0]
	for v, e := range effective {
		if math.IsNaN(e) {
			continue
		}
		kept = append(kept, e)
		if e < hangingDegree && a.RowPtr[v+1]-a.RowPtr[v] > 1 {
			h.Hanging++
		}
	}
	h.EffectiveMin = slices.Min(kept)
	h.EffectiveMedian = median(kept)
	h.LogMin, h.LogMax = slices.Min(a.Val), slices.Max(a.Val)
	once := make([]float64, 0, h.Edges) // each edge's value once
	for i := range a.N {
		col, val := a.Row(i)
		for t, j := range col {
			if int(j) > i {
				once = append(once, val[t])
				if val[t] < lowestLog {
					h.Underflowed++
				}
			}
		}
	}
	h.LogMedian = selectValue(once, (len(once)-1)/2)
}

// EffectiveDegree is (sum w)^2 / sum w^2 for weights given by their logarithms, between 1 and len(logs); NaN for none.
func EffectiveDegree(logs []float64) float64 {
	if len(logs) == 0 {
		return math.NaN()
	}
	top := slices.Max(logs)
	var s1, s2 float64
	for _, l := range logs {
		w := math.Exp(l - top)
		s1 += w
		s2 += float64(w * w)
	}
	return s1 * s1 / s2
}
