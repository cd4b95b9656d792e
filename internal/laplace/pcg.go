package laplace

import (
	"context"
	"math"

	"pinfill/internal/parallel"
)

// preconditioner applies an approximate inverse of A.
type preconditioner interface {
	// apply sets z to about A^-1 r.
	apply(r, z []float64)
	method() Method
	// slack bounds how far max |error| may exceed max |z|, from the iteration so far.
	slack(l *lanczos) float64
}

// pcg is flexible conjugate gradients: beta = -(z . q_old) / (p_old . q_old) keeps successive directions conjugate
// though the preconditioner changes from step to step (Notay, SIAM J. Sci. Comput. 22, 2000). It stops on the true
// residual and on the preconditioned residual, or when neither falls any more.
func (s *System) pcg(ctx context.Context, b, x []float64, j job, tol float64, m preconditioner) (Stats, error) {
	a, workers := &s.a, s.options.Workers
	n := a.n
	r, z, p, q := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	st := Stats{Method: m.method()}
	bb := a.norm2(workers, b)
	var best float64 = math.Inf(1)
	for restart := 0; ; restart++ {
		rr := a.residual(workers, b, x, r)
		st.Residual = math.Sqrt(rr / bb)
		var l lanczos
		if st.Residual <= tol {
			m.apply(r, z)
			st.Correction = maxAbs(workers, z) * m.slack(&l) / j.scale(workers, x)
			st.Converged = st.Correction <= tol
		}
		if st.Converged || restart > 0 && st.Residual > best/2 || restart >= 8 {
			if !st.Converged {
				m.apply(r, z)
				st.Correction = maxAbs(workers, z) / j.scale(workers, x)
			}
			return st, nil
		}
		best = min(best, st.Residual)
		lowest, lowestAt := rr, 0
		var pq float64
		for it := 1; ; it++ {
			if err := ctx.Err(); err != nil {
				return st, err
			}
			m.apply(r, z)
			if rr <= tol*tol*bb && maxAbs(workers, z)*m.slack(&l) <= tol*j.scale(workers, x) {
				break
			}
			zr, zq := dots(workers, z, r, q)
			beta := 0.0
			if it > 1 {
				beta = -zq / pq
			}
			parallel.For(workers, n, sumChunk, func(lo, hi int) {
				for i := lo; i < hi; i++ {
					p[i] = z[i] + float64(beta*p[i])
				}
			})
			pq = a.multiply(workers, p, q)
			alpha := zr / pq
			if !(pq > 0) || math.IsInf(alpha, 0) || math.IsNaN(alpha) {
				break
			}
			l.step(alpha, beta)
			rr = parallel.Sum(workers, n, sumChunk, func(lo, hi int) float64 {
				var t float64
				for i := lo; i < hi; i++ {
					x[i] += float64(alpha * p[i])
					r[i] -= float64(alpha * q[i])
					t += float64(r[i] / a.diag[i] * r[i])
				}
				return t
			})
			st.Iterations++
			if rr < lowest/4 {
				lowest, lowestAt = rr, it
			} else if it-lowestAt > 300 {
				break
			}
			if rr == 0 {
				break
			}
		}
	}
}

func dots(workers int, z, r, q []float64) (zr, zq float64) {
	n := len(z)
	parts := make([][2]float64, (n+sumChunk-1)/sumChunk)
	parallel.ForChunk(workers, n, sumChunk, func(_, c, lo, hi int) {
		var s, t float64
		for i := lo; i < hi; i++ {
			s += float64(z[i] * r[i])
			t += float64(z[i] * q[i])
		}
		parts[c] = [2]float64{s, t}
	})
	for _, v := range parts {
		zr += v[0]
		zq += v[1]
	}
	return zr, zq
}

// scale is the size of x against which corrections are judged.
func (j *job) scale(workers int, x []float64) float64 {
	if j.unit > 0 {
		return j.unit
	}
	return max(maxAbs(workers, x), math.SmallestNonzeroFloat64)
}

// jacobi is the diagonal preconditioner.
type jacobi struct {
	a       *grounded
	workers int
}

func (m *jacobi) method() Method { return Jacobi }

func (m *jacobi) apply(r, z []float64) {
	parallel.For(m.workers, len(r), sumChunk, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			z[i] = r[i] / m.a.diag[i]
		}
	})
}

// slack is 1 over the smallest eigenvalue of D^-1 A that the iteration has seen.
func (m *jacobi) slack(l *lanczos) float64 { return 1 / l.smallest() }

// lanczos keeps the tridiagonal matrix of Lanczos that conjugate gradients build on the way: T_kk = 1/alpha_k +
// beta_k/alpha_{k-1}, T_k,k+1 = sqrt(beta_{k+1})/alpha_k (Saad, Iterative Methods for Sparse Linear Systems, 2nd
// ed., 6.7.3).
type lanczos struct{ inverse, beta []float64 } // 1/alpha_k and beta_k

func (l *lanczos) step(alpha, beta float64) {
	l.inverse = append(l.inverse, 1/alpha)
	l.beta = append(l.beta, max(beta, 0))
}

// smallest is the smallest eigenvalue of the tridiagonal matrix by bisection on the sign count of its LDL^T factors,
// at most 1; 1 before the first step.
func (l *lanczos) smallest() float64 {
	low, high := 0.0, 1.0
	if len(l.inverse) == 0 {
		return 1
	}
	for range 30 {
		mid := math.Sqrt(max(low, 1e-16) * high)
		if high/max(low, 1e-16) < 1.1 {
			break
		}
		if l.below(mid) {
			high = mid
		} else {
			low = mid
		}
	}
	return high
}

// below says whether an eigenvalue lies below t.
func (l *lanczos) below(t float64) bool {
	d := 1.0
	for k, inv := range l.inverse {
		tk := inv - t
		if k > 0 {
			prev := l.inverse[k-1]
			tk += l.beta[k] * prev * (1 - prev/d)
		}
		if tk <= 0 {
			return true
		}
		d = tk
	}
	return false
}
