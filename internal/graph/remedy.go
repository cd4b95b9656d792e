package graph

import (
	"math"
	"slices"

	"pinfill/internal/neighbors"
	"pinfill/internal/parallel"
	"pinfill/internal/points"
)

// What would bring a label to every component: a larger k, a larger bandwidth, or as many neighbours as make the
// bridges edges of the graph anyway.

// SmallestK is the smallest number of neighbours k for which every component of the graph of k neighbours holds a
// label, labelled[v] marking the vertices with one; 0 if the lists are too short to say, or there is no label.
//
// An edge stands from the k on that is the smaller of its two ranks, so adding the lists rank by rank to a union of
// sets meets each k in turn: time O(n K).
func SmallestK(l *neighbors.Lists, labelled []bool) int {
	s := newSets(labelled)
	for k := 1; k <= l.K; k++ {
		for v := range l.N {
			s.join(int32(v), l.Index[v*l.K+k-1])
		}
		if s.waiting == 0 {
			return k
		}
	}
	return 0
}

// SmallestBandwidth is the least H for which a kernel that is zero beyond t = 1 leaves every component with a label,
// labelled[v] marking the vertices with one; +Inf where a component of the skeleton itself is without, 0 where every
// vertex has its own.
func (g *Graph) SmallestBandwidth(labelled []bool, local bool, workers int) float64 {
	s := newSets(labelled)
	if s.waiting == 0 {
		return 0
	}
	for _, e := range g.forest(local, workers) {
		s.join(e.I, e.J)
		if s.waiting == 0 {
			return e.W
		}
	}
	return math.Inf(1)
}

// sets is a union of sets of vertices that knows how many hold no label.
type sets struct {
	parent  []int32
	holds   []bool // of each root: its set holds a label
	waiting int    // sets without a label
}

func newSets(labelled []bool) *sets {
	s := &sets{parent: make([]int32, len(labelled)), holds: slices.Clone(labelled)}
	for v, l := range labelled {
		s.parent[v] = int32(v)
		if !l {
			s.waiting++
		}
	}
	return s
}

func (s *sets) root(v int32) int32 {
	for s.parent[v] != v {
		s.parent[v] = s.parent[s.parent[v]]
		v = s.parent[v]
	}
	return v
}

func (s *sets) join(u, v int32) {
	a, b := s.root(u), s.root(v)
	if a == b {
		return
	}
	if !s.holds[a] || !s.holds[b] {
		s.waiting--
	}
	if b < a {
		a, b = b, a
	}
	s.parent[b] = a
	s.holds[a] = s.holds[a] || s.holds[b]
}

// maxRankWork bounds the distances that SufficientK computes.
const maxRankWork = 1 << 28

// SufficientK is a number of neighbours at which every bridge is an edge of the graph of k neighbours, so that nothing
// is left to bridge; a smaller one may do. 0 if finding it would take more than 2^28 distances.
//
// A bridge goes from u to the nearest vertex that a label reaches, so whatever is nearer to u is unreached: the rank of
// the bridge among u's neighbours is one more than the number of such vertices.
func SufficientK(r *Reach, bridges []Bridge, pts *points.Matrix, m points.Metric, workers int) int {
	var unreached []int32
	for v, c := range r.Component {
		if r.Labels[c] == 0 {
			unreached = append(unreached, int32(v))
		}
	}
	if len(bridges)*len(unreached) > maxRankWork {
		return 0
	}
	return int(parallel.Max(workers, len(bridges), 1, func(t, _ int) float64 {
		b := bridges[t]
		limit := b.Distance * (1 + 1e-12) // distances summed in another order
		rank := 1
		for _, v := range unreached {
			if v != b.From && between(m, pts.Row(int(b.From)), pts.Row(int(v))) <= limit {
				rank++
			}
		}
		return float64(rank)
	}))
}

func between(m points.Metric, a, b []float64) float64 {
	var sum float64
	for j, x := range a {
		if d := math.Abs(x - b[j]); m == points.Manhattan {
			sum += d
		} else {
			sum += float64(d * d)
		}
	}
	if m == points.Manhattan {
		return sum
	}
	return math.Sqrt(sum)
}
