package laplace

import "pinfill/internal/parallel"

const (
	aggregateRows = 16384 // aggregates are formed independently in blocks of so many rows
	aggregateSize = 4
	strongEnough  = 0.5 // a vertex joins a group if its tie to it is at least this share of its strongest tie
	groundRule    = 5   // a vertex whose excess is at least so many times its strongest tie belongs to the ground
	joinRounds    = 3
)

const (
	unassigned int32 = -1
	grounds    int32 = -2 // in place of an aggregate: the vertex belongs to the ground
)

// aggregate groups the vertices of a into aggregates of about aggregateSize strongly tied ones, numbered 0..count-1
// by their first vertex; agg_i is the aggregate of i or grounds. Rows are treated in blocks of the given size.
//
// A group grows from a seed by the vertex u of largest tie w(u, G) to it, as long as that is strong for u. Seeds left
// alone join the aggregate of their strongest neighbour. A vertex that hangs on the ground more than on any neighbour
// is left out: with it, the whole aggregate would be pinned to the ground.
func aggregate(a *sddm, workers, block int) (agg []int32, count int) {
	n := a.n
	strongest := make([]float64, n)
	toward := make([]int32, n) // the strongest neighbour, or -1
	root := make([]int32, n)   // first vertex of the aggregate
	parallel.For(workers, n, rowChunk, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			m, at := 0.0, int32(-1)
			for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
				if a.w[k] > m {
					m, at = a.w[k], a.col[k]
				}
			}
			strongest[i], toward[i] = m, at
			root[i] = unassigned
			if a.excess[i] >= groundRule*m {
				root[i] = grounds
			}
		}
	})
	alone := make([]bool, n)
	scratch := make([]grower, workers)
	parallel.ForChunk(workers, n, block, func(worker, _, lo, hi int) {
		g := &scratch[worker]
		if len(g.at) < hi-lo {
			g.at = make([]int32, hi-lo)
		}
		for i := lo; i < hi; i++ {
			if root[i] == unassigned {
				alone[i] = g.grow(a, i, lo, hi, root, strongest) == 1
			}
		}
	})
	join(workers, root, toward, alone)
	agg = make([]int32, n)
	for i, r := range root {
		switch {
		case r == grounds:
			agg[i] = grounds
		case int(r) == i:
			agg[i] = int32(count)
			count++
		}
	}
	parallel.For(workers, n, sumChunk, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			if r := root[i]; r >= 0 && int(r) != i {
				agg[i] = agg[r]
			}
		}
	})
	return agg, count
}

// grower holds the candidates for a group: vertices next to it and their ties to it.
type grower struct {
	at   []int32 // of a vertex of the block: 1 + its place among the candidates, or 0
	cand []int32
	tie  []float64
}

// grow forms the group of seed i out of unassigned vertices of [lo, hi) and gives its size.
func (g *grower) grow(a *sddm, i, lo, hi int, root []int32, strongest []float64) int {
	root[i] = int32(i)
	g.cand, g.tie = g.cand[:0], g.tie[:0]
	size := 1
	for last := i; size < aggregateSize; size++ {
		for k := a.ptr[last]; k < a.ptr[last+1]; k++ {
			u := int(a.col[k])
			if u < lo || u >= hi || root[u] != unassigned {
				continue
			}
			if at := g.at[u-lo]; at > 0 {
				g.tie[at-1] += a.w[k]
			} else {
				g.cand = append(g.cand, int32(u))
				g.tie = append(g.tie, a.w[k])
				g.at[u-lo] = int32(len(g.cand))
			}
		}
		best, most := -1, 0.0
		for c, tie := range g.tie {
			if tie <= most || tie < strongEnough*strongest[g.cand[c]] || size == 1 && tie < strongEnough*strongest[i] {
				continue
			}
			best, most = c, tie
		}
		if best < 0 {
			break
		}
		u := g.cand[best]
		root[u] = int32(i)
		last = int(u)
		end := len(g.cand) - 1
		g.at[int(u)-lo] = 0
		if best != end {
			g.cand[best], g.tie[best] = g.cand[end], g.tie[end]
			g.at[int(g.cand[best])-lo] = int32(best + 1)
		}
		g.cand, g.tie = g.cand[:end], g.tie[:end]
	}
	for _, u := range g.cand {
		g.at[int(u)-lo] = 0
	}
	return size
}

// join attaches vertices that are alone to the aggregate of their strongest neighbour, or to the ground. Each round
// looks at the state before it, so that the order of rows does not matter; two that point at each other make a pair.
func join(workers int, root, toward []int32, alone []bool) {
	var left []int32
	for i, a := range alone {
		if a {
			left = append(left, int32(i))
		}
	}
	next := make([]int32, len(left))
	for round := 0; round <= joinRounds && len(left) > 0; round++ {
		pairing := round == joinRounds
		parallel.For(workers, len(left), sumChunk, func(lo, hi int) {
			for k := lo; k < hi; k++ {
				i := left[k]
				j := toward[i]
				next[k] = i
				switch {
				case j < 0:
				case !alone[j]:
					next[k] = root[j]
				case pairing && toward[j] == i:
					next[k] = min(i, j)
				}
			}
		})
		for k, i := range left {
			root[i] = next[k]
			if next[k] != i {
				alone[i] = false
			}
		}
		kept := left[:0]
		for _, i := range left {
			if alone[i] {
				kept = append(kept, i)
			}
		}
		left = kept
	}
}
