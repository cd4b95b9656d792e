package laplace

import (
	"context"
	"math"
)

// preconditioner applies an approximate inverse of A to the residuals of a block.
type preconditioner interface {
	// apply sets z to about A^-1 r; size is max |r_i| / A_ii of each column.
	apply(k *block, size *scalars) applied
	method() Method
	// slack bounds how far max |error| is expected to exceed max |z|, given the iteration so far.
	slack(l *lanczos) float64
	// patience is the number of iterations to wait for the residual to halve before giving a column up.
	patience() int
}

const restarts = 6 // from the true residual, at most

// column is the state of one right-hand side.
type column struct {
	active   bool
	stats    Stats
	bb       float64 // norm^2 of b
	first    float64 // residual^2 at the start of the round
	claimed  float64 // residual^2 by the recurrence
	lowest   float64 // residual^2 at the last marked progress
	lowestAt int     // iteration of it
	pq       float64 // p . A p
	largest  float64 // max |z| of the last apply
	slack    float64 // largest of the rounds before
	spectrum lanczos // of this round
}

// verdict says whether to give up on a preconditioner, after an iteration that left residual^2 rr in column c.
type verdict func(iteration int, c *column, rr, tol float64) (stop bool)

// pcg is flexible conjugate gradients on the columns of a block from the guess x: beta = -(z . q_old) / (p_old .
// q_old) keeps successive directions conjugate though the preconditioner may change from step to step (Notay, SIAM J.
// Sci. Comput. 22, 2000). A column stops when its residual and its preconditioned residual are small, or neither
// falls any more; then the residual is computed anew and, if it is not what the recurrence claims, the iteration
// starts again from it. quit may end the iteration early, with what has been reached left in x.
func pcg(ctx context.Context, k *block, tol float64, m preconditioner, quit verdict) (columns [maxWidth]column, done bool, err error) {
	bb := k.norm2(k.b)
	for c := range k.width {
		columns[c] = column{active: bb[c] > 0, bb: bb[c], first: math.Inf(1), stats: Stats{Method: m.method(), Converged: bb[c] <= 0}}
	}
	for round := 0; ; round++ {
		rr, size := k.residual()
		if !k.judge(columns[:k.width], round, &rr, &size, tol, m) {
			return columns, true, nil
		}
		for it := 1; ; it++ {
			if err := ctx.Err(); err != nil {
				return columns, false, err
			}
			z := m.apply(k, &size)
			var beta, alpha scalars
			going := false
			for c := range k.width {
				col := &columns[c]
				if !col.active {
					continue
				}
				col.largest = z.largest[c]
				if k.small(c, col, rr[c], tol, m) || isBad(z.zr[c]) {
					col.active = false
					continue
				}
				going = true
				if it > 1 {
					beta[c] = -z.zq[c] / col.pq
				}
			}
			if !going {
				break
			}
			k.direct(&beta)
			pq := k.multiply()
			for c := range k.width {
				col := &columns[c]
				if !col.active {
					continue
				}
				alpha[c] = z.zr[c] / pq[c]
				if !(pq[c] > 0) || isBad(alpha[c]) {
					alpha[c], col.active = 0, false
					continue
				}
				col.pq = pq[c]
				col.spectrum.step(alpha[c], beta[c])
				col.stats.Iterations++
			}
			rr, size = k.advance(&alpha)
			for c := range k.width {
				col := &columns[c]
				if !col.active {
					continue
				}
				col.claimed = rr[c]
				if rr[c] < col.lowest/4 {
					col.lowest, col.lowestAt = rr[c], it
				}
				if it-col.lowestAt > m.patience() || rr[c] == 0 || k.small(c, col, rr[c], tol, m) {
					col.active = false
				} else if quit != nil && quit(it, col, rr[c], tol) {
					return columns, false, nil
				}
			}
		}
	}
}

// judge looks at the true residuals (rr, size) at the start of a round: which columns are done, which go on. It says
// whether any goes on.
func (k *block) judge(columns []column, round int, rr, size *scalars, tol float64, m preconditioner) bool {
	doubt := false // a column whose recurrence does not match the truth
	for c := range columns {
		col := &columns[c]
		if col.bb <= 0 {
			continue
		}
		col.stats.Residual = math.Sqrt(rr[c] / col.bb)
		if rr[c] == 0 {
			col.stats.Correction, col.stats.Converged = 0, true
			continue
		}
		col.slack = max(col.slack, m.slack(&col.spectrum))
		if round > 0 && !(rr[c] <= tol*tol*col.bb && rr[c] <= 1.5*col.claimed) {
			doubt = true
		}
	}
	var z applied
	if doubt {
		z = m.apply(k, size)
	}
	going := false
	for c := range columns {
		col := &columns[c]
		if col.bb <= 0 || rr[c] == 0 {
			col.active = false
			continue
		}
		col.active = true
		if round > 0 {
			if doubt {
				col.largest = z.largest[c]
			}
			col.stats.Correction = col.largest * col.slack / k.scale(c)
			col.stats.Converged = col.stats.Residual <= tol && col.stats.Correction <= tol
			col.active = !col.stats.Converged && round < restarts && rr[c] < col.first/4
		}
		going = going || col.active
		col.first, col.lowest, col.lowestAt, col.spectrum = rr[c], rr[c], 0, lanczos{}
	}
	return going
}

// small says whether the residual^2 rr and the last max |z| of column c are within the tolerance. The latter belongs
// to the residual before, which errs on the safe side.
func (k *block) small(c int, col *column, rr, tol float64, m preconditioner) bool {
	return rr <= tol*tol*col.bb && col.largest*max(col.slack, m.slack(&col.spectrum)) <= tol*k.scale(c)
}
