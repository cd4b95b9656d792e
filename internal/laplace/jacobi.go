package laplace

import "math"

// jacobi is the diagonal preconditioner.
type jacobi struct{}

func (jacobi) method() Method { return Jacobi }

func (jacobi) apply(k *block, _ *scalars) applied {
	return k.total(func(lo, hi int) {
		for c := range k.width {
			at := lo*k.width + c
			for _, d := range k.a.diag[lo:hi] {
				k.z[at] = k.r[at] / d
				at += k.width
			}
		}
	})
}

// slack is 1 over the smallest eigenvalue of D^-1 A that the iteration has seen, once it has seen some.
func (jacobi) slack(l *lanczos) float64 {
	if len(l.inverse) < 10 {
		return 1e4
	}
	return max(4, 1/l.smallest())
}

func (jacobi) patience() int { return 1000 }

// lanczos keeps the tridiagonal matrix of Lanczos that conjugate gradients build on the way: T_kk = 1/alpha_k +
// beta_k/alpha_{k-1}, T_k,k+1 = sqrt(beta_{k+1})/alpha_k (Saad, Iterative Methods for Sparse Linear Systems, 2nd
// ed., section 6.7.3).
type lanczos struct{ inverse, beta []float64 } // 1/alpha_k and beta_k

func (l *lanczos) step(alpha, beta float64) {
	l.inverse = append(l.inverse, 1/alpha)
	l.beta = append(l.beta, max(beta, 0))
}

// smallest is the smallest eigenvalue of the tridiagonal matrix to 10%, by bisection on the signs of its pivots; at
// most 1, and 1 before the first step.
func (l *lanczos) smallest() float64 {
	if len(l.inverse) == 0 {
		return 1
	}
	low, high := 1e-16, 1.0
	for high/low > 1.1 {
		mid := math.Sqrt(low * high)
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
			tk += float64(l.beta[k] * prev * (1 - prev/d))
		}
		if tk <= 0 {
			return true
		}
		d = tk
	}
	return false
}
