package laplace

import (
	"context"
	"math"
)

// directAlways is the number of free vertices up to which a system is factorised at once.
const directAlways = 300

// engines are what a system has built so far.
type engines struct {
	dense *denseFactor
}

func (e *engines) reweighted() { e.dense = nil }

// denseFactor is L D L^T of the grounded Laplacian by elimination without subtraction: with w_ij >= 0 and e_i >= 0,
// d_k = e_k + sum_{j>k} w_kj, w_ij += w_ik w_kj / d_k, e_i += w_ik e_k / d_k. Every quantity is a sum of positive
// terms, so each entry is found to a few roundings whatever the contrast (Alfa, Xue and Ye, Math. Comp. 71, 2002).
type denseFactor struct {
	n int
	l []float64 // row k: w_kj / d_k for j > k
	d []float64
}

func newDense(a *grounded) *denseFactor {
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

func (s *System) solveDirect(ctx context.Context, b, x []float64, j job, tol float64) (Stats, error) {
	if s.dense == nil {
		s.dense = newDense(&s.a)
	}
	workers := s.options.Workers
	n := s.a.n
	st := Stats{Method: Direct}
	r, z := make([]float64, n), make([]float64, n)
	bb := s.a.norm2(workers, b)
	s.dense.solve(b, x)
	for step := 0; ; step++ {
		rr := s.a.residual(workers, b, x, r)
		s.dense.solve(r, z)
		residual, correction := math.Sqrt(rr/bb), maxAbs(workers, z)/j.scale(workers, x)
		if step == 0 || correction < st.Correction {
			st.Residual, st.Correction = residual, correction
		}
		st.Converged = st.Residual <= tol && st.Correction <= tol
		if st.Converged || step == 3 {
			return st, ctx.Err()
		}
		for i := range x {
			x[i] += z[i]
		}
	}
}
