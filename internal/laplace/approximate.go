package laplace

import (
	"cmp"
	"context"
	"math/rand/v2"
	"slices"

	"pinfill/internal/sparse"
)

// approximation is a randomised approximate elimination (Gao, Kyng and Spielman, "Robust and practical solution of
// Laplacian equations by approximate elimination", arXiv 2303.00709, 2023; after Kyng and Sachdeva 2016) as a
// preconditioner. Eliminating a vertex with neighbours of conductances w_1 <= ... <= w_k, d their sum, leaves a tree
// on them instead of a clique: for each i an edge from i to one j > i, drawn with probability w_j / S_i, of
// conductance w_i S_i / d, where S_i = sum of w_j over j > i. In the mean this is the exact elimination. The ground
// is a neighbour that is never eliminated; parallel edges are merged first. The seed is fixed.
type approximation struct {
	factor *factor
	t      []float64
}

const (
	approximateSeed   = 0x5eed
	approximateDegree = 512 // degrees above are not told apart
)

func newApproximation(ctx context.Context, a *sddm) (*approximation, error) {
	type edge struct {
		to int32 // -1 is the ground
		w  float64
	}
	n := a.n
	random := rand.New(rand.NewPCG(approximateSeed, 0))
	edges := make([][]edge, n)
	excess := slices.Clone(a.excess)
	degree := make([]int32, n) // edges, parallel ones counted each
	buckets := make([][]int32, approximateDegree+1)
	low := 0
	file := func(i int32) { // a vertex stands in several buckets; the one of its degree counts
		b := min(int(degree[i]), approximateDegree)
		buckets[b] = append(buckets[b], i)
		low = min(low, b)
	}
	for i := range n {
		for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
			if a.w[k] > 0 {
				edges[i] = append(edges[i], edge{a.col[k], a.w[k]})
			}
		}
		degree[i] = int32(len(edges[i]))
		file(int32(i))
	}
	f := &factor{plan: &plan{ptr: make([]int, 1, n+1)}, d: make([]float64, 0, n)}
	gone := make([]bool, n)
	place := make([]int32, n) // of a neighbour among the merged, plus 1
	var merged []edge
	var suffix []float64
	for len(f.order) < n {
		if len(f.order)%4096 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		for len(buckets[low]) == 0 {
			low++
		}
		last := len(buckets[low]) - 1
		v := buckets[low][last]
		buckets[low] = buckets[low][:last]
		if gone[v] || min(int(degree[v]), approximateDegree) != low {
			continue
		}
		gone[v] = true
		merged = merged[:0]
		for _, e := range edges[v] {
			if gone[e.to] {
				continue
			}
			degree[e.to]--
			if at := place[e.to]; at > 0 {
				merged[at-1].w += e.w
			} else {
				merged = append(merged, e)
				place[e.to] = int32(len(merged))
			}
		}
		edges[v] = nil
		for _, e := range merged {
			place[e.to] = 0
		}
		if excess[v] > 0 {
			merged = append(merged, edge{-1, excess[v]})
		}
		slices.SortFunc(merged, func(x, y edge) int {
			return cmp.Or(cmp.Compare(x.w, y.w), cmp.Compare(x.to, y.to))
		})
		suffix = append(suffix[:0], make([]float64, len(merged)+1)...)
		for i := len(merged) - 1; i >= 0; i-- {
			suffix[i] = suffix[i+1] + merged[i].w
		}
		d := suffix[0]
		f.order, f.d = append(f.order, v), append(f.d, d)
		for i, e := range merged {
			if e.to >= 0 {
				f.row, f.l = append(f.row, e.to), append(f.l, e.w/d)
			}
			rest := suffix[i+1]
			if i+1 == len(merged) {
				break
			}
			// The draw falls on j where suffix[j] >= target > suffix[j+1].
			target := rest * (1 - random.Float64())
			j, end := i+1, len(merged)-1
			for j < end {
				m := (j + end + 1) / 2
				if suffix[m] >= target {
					j = m
				} else {
					end = m - 1
				}
			}
			w := float64(e.w / d * rest)
			one, two := e.to, merged[j].to
			switch {
			case one < 0:
				excess[two] += w
			case two < 0:
				excess[one] += w
			default:
				edges[one] = append(edges[one], edge{two, w})
				edges[two] = append(edges[two], edge{one, w})
				degree[one]++
				degree[two]++
			}
		}
		f.ptr = append(f.ptr, len(f.row))
		for _, e := range merged {
			if e.to >= 0 {
				file(e.to)
			}
		}
	}
	f.place = sparse.Inverse(f.order)
	for k, v := range f.row {
		f.row[k] = f.place[v]
	}
	return &approximation{factor: f}, nil
}

func (m *approximation) method() Method { return Elimination }

func (m *approximation) apply(k *block, _ *scalars) applied {
	if len(m.t) < len(k.r) {
		m.t = make([]float64, len(k.r))
	}
	m.factor.solve(k.width, k.r, k.z, m.t[:len(k.r)])
	return k.total(func(int, int) {})
}

func (m *approximation) slack(*lanczos) float64 { return 4 }

func (m *approximation) patience() int { return 60 }
