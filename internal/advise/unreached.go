package advise

import (
	"math"
	"slices"

	"pinfill/internal/sparse"
)

// unreached picks a vertex in each component without a label and gives the vertices that are held from then on: the
// labelled ones, the picks, and a stand-in in components where nothing may be named.
func (p *NextProblem) unreached() (fixed []int32, picks []Pick) {
	part, count := sparse.Components(p.Conductance)
	has := make([]bool, count)
	for _, v := range p.Labelled {
		has[part[v]] = true
	}
	rows := make([]float64, count)
	best, any := make([]int32, count), make([]int32, count)
	worth := make([]float64, count)
	for c := range best {
		best[c], any[c] = -1, -1
	}
	for v := range p.Conductance.N {
		c := part[v]
		if has[c] {
			continue
		}
		rows[c] += p.rows(v)
		if any[c] < 0 {
			any[c] = int32(v)
		}
		if p.excluded(v) {
			continue
		}
		_, vals := p.Conductance.Row(v)
		var total float64
		for _, w := range vals {
			total += w
		}
		if t := total * p.rows(v) / p.cost(v); best[c] < 0 || t > worth[c] {
			best[c], worth[c] = int32(v), t
		}
	}
	fixed = slices.Clone(p.Labelled)
	for c, v := range best {
		switch {
		case has[c]:
		case v < 0:
			fixed = append(fixed, any[c])
		default:
			fixed = append(fixed, v)
			picks = append(picks, Pick{Vertex: v, Reason: Unreached, Gain: math.NaN(), Follows: rows[c]})
		}
	}
	slices.Sort(fixed)
	slices.SortStableFunc(picks, func(a, b Pick) int {
		return descending(a.Follows/p.cost(int(a.Vertex)), b.Follows/p.cost(int(b.Vertex)))
	})
	return fixed, picks
}
