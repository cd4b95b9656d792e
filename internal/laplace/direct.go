package laplace

import (
	"context"
	"math"
)

// denseFactor is L D L^T of the grounded Laplacian by elimination without subtraction: with w_ij >= 0 and e_i >= 0,
// d_k = e_k + sum_{j>k} w_kj, w_ij += w_ik w_kj / d_k, e_i += w_ik e_k / d_k. Every quantity is a sum of positive
// terms, so each entry is found to a few roundings whatever the contrast (Alfa, Xue and Ye, Math. Comp. 71, 2002).
type denseFactor struct {
	n int
	l []float64 // row k: w_kj / d_k for j > k
	d []float64
}

func newDense(a *sddm) *denseFactor {
	n := a.n
	f := &denseFactor{n: n, l: make([]float64, n*n), d: make([]float64, n)}
	e := append([]float64(nil), a.excess...)
	for i := range n {
		for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
			f.l[i*n+int(a.col[k])] = a.w[k]
		}
	}
	for k := range n {
		row := f.l[k*n : (k+1)*n]
		d := e[k]
		for j := k + 1; j < n; j++ {
			d += row[j]
		}
		f.d[k] = d
		for i := k + 1; i < n; i++ {
			if row[i] == 0 {
				continue
			}
			m := row[i] / d
			e[i] += float64(m * e[k])
			to := f.l[i*n : (i+1)*n]
			for j := k + 1; j < n; j++ {
				to[j] += float64(m * row[j])
			}
		}
		for j := k + 1; j < n; j++ {
			row[j] /= d
		}
	}
	return f
}

func (f *denseFactor) solve(b, x []float64) {
	n := f.n
	copy(x, b)
	for k := range n {
		row := f.l[k*n : (k+1)*n]
		for j := k + 1; j < n; j++ {
			x[j] += float64(row[j] * x[k])
		}
	}
	for k := n - 1; k >= 0; k-- {
		row := f.l[k*n : (k+1)*n]
		t := x[k] / f.d[k]
		for j := k + 1; j < n; j++ {
			t += float64(row[j] * x[j])
		}
		x[k] = t
	}
}

// solveDirect solves the first used columns of k by elimination, with up to three steps of refinement.
func (s *System) solveDirect(ctx context.Context, k *block, used int, tol float64) (Stats, error) {
	if s.factor == nil {
		s.factor = newDense(k.a)
	}
	n, w := k.a.n, k.width
	total := Stats{Method: Direct, Converged: true}
	bb := k.norm2(k.b)
	column := make([]float64, n)
	answer := make([]float64, n)
	solve := func(c int, b, x []float64) {
		for i := range column {
			column[i] = b[i*w+c]
		}
		s.factor.solve(column, answer)
		for i, v := range answer {
			x[i*w+c] = v
		}
	}
	for c := range used {
		solve(c, k.b, k.x)
	}
	var columns [maxWidth]Stats
	for step := 0; ; step++ {
		if err := ctx.Err(); err != nil {
			return total, err
		}
		rr, _ := k.residual()
		going := false
		for c := range used {
			st := Stats{Method: Direct, Converged: true}
			if bb[c] > 0 {
				solve(c, k.r, k.z)
				largest := 0.0
				for i := range n {
					largest = max(largest, math.Abs(k.z[i*w+c]))
				}
				st.Residual, st.Correction = math.Sqrt(rr[c]/bb[c]), largest/k.scale(c)
				st.Converged = st.Residual <= tol && st.Correction <= tol
			}
			columns[c] = st
			if !st.Converged && step < 3 {
				going = true
				for i := range n {
					k.x[i*w+c] += k.z[i*w+c]
				}
			}
		}
		if !going {
			break
		}
	}
	for c := range used {
		total.merge(columns[c])
	}
	return total, nil
}
