package sparse

import (
	"context"
	"math"
	"slices"
)

// MinimumDegree gives an order of elimination that keeps fill low: order[k] is the vertex eliminated k-th. It is the
// approximate minimum degree of Amestoy, Davis and Duff (SIAM J. Matrix Anal. Appl. 17, 1996) on the quotient graph:
// an eliminated vertex stands as an element, the list of its remaining neighbours, which are a clique. Vertices of
// degree above 10 sqrt(n) come last. Indistinguishable vertices are not merged, so that the time is about that of
// listing the factor. Only the pattern of a is looked at.
func MinimumDegree(ctx context.Context, a *CSR) ([]int32, error) {
	n := a.N
	q := quotient{
		degree: make([]int32, n), head: make([]int32, n), next: make([]int32, n), prev: make([]int32, n),
	}
	for i := range q.head {
		q.head[i] = -1
	}
	var (
		gone     = make([]bool, n) // eliminated, or of high degree
		absorbed = make([]bool, n) // elements that are part of another
		vars     = make([][]int32, n)
		elems    = make([][]int32, n)
		list     = make([][]int32, n) // of element e: its vertices
		mark     = make([]int32, n)
		outside  = make([]int32, n) // of element e: vertices outside the current one
		seen     = make([]int32, n) // pivot for which outside was counted, plus 1
		order    = make([]int32, 0, n)
		high     []int32
	)
	limit := max(16, int(10*math.Sqrt(float64(n))))
	for i := range n {
		if a.RowPtr[i+1]-a.RowPtr[i] > limit {
			gone[i] = true
			high = append(high, int32(i))
		}
	}
	own := slices.Clone(a.Col)
	for i := range n {
		vars[i] = own[a.RowPtr[i]:a.RowPtr[i+1]:a.RowPtr[i+1]]
		if !gone[i] {
			vars[i] = slices.DeleteFunc(vars[i], func(j int32) bool { return gone[j] })
			q.degree[i] = int32(len(vars[i]))
			q.insert(int32(i))
		}
	}
	left := n - len(high)
	for step := int32(1); left > 0; step++ {
		if step%1024 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		p := q.smallest()
		q.remove(p)
		gone[p] = true
		left--
		order = append(order, p)
		mark[p] = step
		var lp []int32
		add := func(j int32) {
			if !gone[j] && mark[j] != step {
				mark[j] = step
				lp = append(lp, j)
			}
		}
		for _, j := range vars[p] {
			add(j)
		}
		for _, e := range elems[p] {
			if absorbed[e] {
				continue
			}
			for _, j := range list[e] {
				add(j)
			}
			absorbed[e], list[e] = true, nil
		}
		list[p], vars[p], elems[p] = lp, nil, nil
		for _, i := range lp {
			for _, e := range elems[i] {
				if absorbed[e] {
					continue
				}
				if seen[e] != step {
					seen[e], outside[e] = step, int32(len(list[e]))
				}
				outside[e]--
			}
		}
		for _, i := range lp {
			q.remove(i)
			vars[i] = slices.DeleteFunc(vars[i], func(j int32) bool { return gone[j] || mark[j] == step })
			d := int32(len(vars[i]) + len(lp) - 1)
			kept := elems[i][:0]
			for _, e := range elems[i] {
				if absorbed[e] {
					continue
				}
				if outside[e] == 0 { // within the new element
					absorbed[e], list[e] = true, nil
					continue
				}
				kept = append(kept, e)
				d += outside[e]
			}
			elems[i] = append(kept, p)
			q.degree[i] = min(d, q.degree[i]+int32(len(lp))-1, int32(left-1))
			q.insert(i)
		}
	}
	slices.SortStableFunc(high, func(i, j int32) int {
		return (a.RowPtr[i+1] - a.RowPtr[i]) - (a.RowPtr[j+1] - a.RowPtr[j])
	})
	return append(order, high...), nil
}

// quotient keeps the vertices in lists by degree.
type quotient struct {
	degree, head, next, prev []int32
	low                      int32 // no vertex has a smaller degree
}

func (q *quotient) insert(i int32) {
	d := q.degree[i]
	q.next[i], q.prev[i] = q.head[d], -1
	if h := q.head[d]; h >= 0 {
		q.prev[h] = i
	}
	q.head[d] = i
	q.low = min(q.low, d)
}

func (q *quotient) remove(i int32) {
	if p := q.prev[i]; p >= 0 {
		q.next[p] = q.next[i]
	} else {
		q.head[q.degree[i]] = q.next[i]
	}
	if x := q.next[i]; x >= 0 {
		q.prev[x] = q.prev[i]
	}
}

func (q *quotient) smallest() int32 {
	for q.head[q.low] < 0 {
		q.low++
	}
	return q.head[q.low]
}
