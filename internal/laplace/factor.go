package laplace

import "context"

// factor is L D L^T of A by elimination without subtraction. With off-diagonals -w_ij <= 0 and excess e_i >= 0,
// eliminating k sets
//
//	d_k = e_k + sum_{j>k} w_kj,   w_ij += w_ik w_kj / d_k,   e_i += w_ik e_k / d_k,
//
// sums of positive terms throughout, so that each entry is found to a few roundings whatever the contrast between
// conductances (Grassmann, Taksar and Heyman 1985; O'Cinneide, Numer. Math. 65, 1993; for M-matrices Alfa, Xue and
// Ye, Math. Comp. 71, 2002). The diagonal of A is not used.
type factor struct {
	*plan
	l []float64 // w_ik / d_k beside plan.row
	d []float64
}

// newFactor factorises a in the order of p, column by column, each gathering what earlier columns give it.
func newFactor(ctx context.Context, a *sddm, p *plan) (*factor, error) {
	n := a.n
	f := &factor{plan: p, l: make([]float64, len(p.row)), d: make([]float64, n)}
	e := make([]float64, n)
	sum := make([]float64, n)
	first, next := make([]int32, n), make([]int32, n) // columns whose next row is k
	at := make([]int, n)                              // position of that row
	for k := range n {
		e[k] = a.excess[p.order[k]]
		first[k] = -1
	}
	for k := range n {
		if k%256 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		old := p.order[k]
		for q := a.ptr[old]; q < a.ptr[old+1]; q++ {
			if i := int(p.place[a.col[q]]); i > k {
				sum[i] += a.w[q]
			}
		}
		for j := first[k]; j >= 0; {
			following := next[j]
			q, end := at[j], p.ptr[j+1]
			w := f.l[q] * f.d[j]
			rows, l := p.row[q+1:end], f.l[q+1:end]
			for m, i := range rows {
				sum[i] += float64(l[m] * w)
			}
			if q+1 < end {
				at[j] = q + 1
				to := p.row[q+1]
				next[j], first[to] = first[to], j
			}
			j = following
		}
		lo, hi := p.ptr[k], p.ptr[k+1]
		d := e[k]
		for _, i := range p.row[lo:hi] {
			d += sum[i]
		}
		f.d[k] = d
		for q := lo; q < hi; q++ {
			i := p.row[q]
			f.l[q] = sum[i] / d
			sum[i] = 0
			e[i] += float64(f.l[q] * e[k])
		}
		if lo < hi {
			at[k] = lo
			to := p.row[lo]
			next[k], first[to] = first[to], int32(k)
		}
	}
	return f, nil
}

// solve sets x = A^-1 b for width interleaved vectors; t is scratch of their size. For b >= 0 nothing cancels.
func (f *factor) solve(width int, b, x, t []float64) {
	for k, old := range f.order {
		copy(t[k*width:(k+1)*width], b[int(old)*width:])
	}
	if width == 1 {
		f.solve1(t)
	} else {
		f.solve4(t)
	}
	for k, old := range f.order {
		copy(x[int(old)*width:(int(old)+1)*width], t[k*width:])
	}
}

func (f *factor) solve1(t []float64) {
	for k, d := range f.d {
		lo, hi := f.ptr[k], f.ptr[k+1]
		l, v := f.l[lo:hi], t[k]
		for m, i := range f.row[lo:hi] {
			t[i] += float64(l[m] * v)
		}
		t[k] = v / d
	}
	for k := len(f.d) - 1; k >= 0; k-- {
		lo, hi := f.ptr[k], f.ptr[k+1]
		l, v := f.l[lo:hi], t[k]
		for m, i := range f.row[lo:hi] {
			v += float64(l[m] * t[i])
		}
		t[k] = v
	}
}

func (f *factor) solve4(t []float64) {
	for k, d := range f.d {
		lo, hi := f.ptr[k], f.ptr[k+1]
		l := f.l[lo:hi]
		own := (*[4]float64)(t[4*k:])
		v0, v1, v2, v3 := own[0], own[1], own[2], own[3]
		for m, i := range f.row[lo:hi] {
			w, to := l[m], (*[4]float64)(t[4*int(i):])
			to[0] += float64(w * v0)
			to[1] += float64(w * v1)
			to[2] += float64(w * v2)
			to[3] += float64(w * v3)
		}
		own[0], own[1], own[2], own[3] = v0/d, v1/d, v2/d, v3/d
	}
	for k := len(f.d) - 1; k >= 0; k-- {
		lo, hi := f.ptr[k], f.ptr[k+1]
		l := f.l[lo:hi]
		own := (*[4]float64)(t[4*k:])
		v0, v1, v2, v3 := own[0], own[1], own[2], own[3]
		for m, i := range f.row[lo:hi] {
			w, from := l[m], (*[4]float64)(t[4*int(i):])
			v0 += float64(w * from[0])
			v1 += float64(w * from[1])
			v2 += float64(w * from[2])
			v3 += float64(w * from[3])
		}
		own[0], own[1], own[2], own[3] = v0, v1, v2, v3
	}
}
