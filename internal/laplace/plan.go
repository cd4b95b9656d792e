package laplace

import (
	"context"
	"slices"

	"pinfill/internal/sparse"
)

// plan is the order and the pattern of a sparse elimination, which conductances do not change.
type plan struct {
	order []int32 // order[k]: row eliminated k-th
	place []int32 // its inverse
	ptr   []int   // column k of the factor has rows row[ptr[k]:ptr[k+1]], in places > k, increasing
	row   []int32
	work  float64 // multiplications and additions, in pairs, of one factorisation
}

// newPlan orders the rows by minimum degree and finds the pattern of the factor. It gives nil, without error, as soon
// as the factor is seen to hold more than most entries.
func newPlan(ctx context.Context, a *sddm, most int) (*plan, error) {
	n := a.n
	order, err := sparse.MinimumDegree(ctx, &sparse.CSR{N: n, RowPtr: a.ptr, Col: a.col})
	if err != nil {
		return nil, err
	}
	p := &plan{order: order, place: sparse.Inverse(order), ptr: make([]int, n+1)}
	// The pattern of column k is that of row k of A beyond k and those of its children in the elimination tree.
	first, next := make([]int32, n), make([]int32, n) // children lists
	mark := make([]int32, n)
	for i := range first {
		first[i], next[i], mark[i] = -1, -1, -1
	}
	for k := range int32(n) {
		start := len(p.row)
		mark[k] = k
		add := func(i int32) {
			if i > k && mark[i] != k {
				mark[i] = k
				p.row = append(p.row, i)
			}
		}
		old := order[k]
		for _, j := range a.col[a.ptr[old]:a.ptr[old+1]] {
			add(p.place[j])
		}
		for c := first[k]; c >= 0; c = next[c] {
			for _, i := range p.row[p.ptr[c]:p.ptr[c+1]] {
				add(i)
			}
		}
		mine := p.row[start:]
		slices.Sort(mine)
		if len(mine) > 0 {
			next[k], first[mine[0]] = first[mine[0]], k
		}
		p.ptr[k+1] = len(p.row)
		p.work += float64(len(mine)) * float64(len(mine)+1) / 2
		if len(p.row) > most {
			return nil, nil
		}
	}
	return p, nil
}
