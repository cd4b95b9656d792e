package laplace

import (
	"math"

	"pinfill/internal/parallel"
)

const (
	damping    = 0.8  // of the Jacobi sweeps
	goodEnough = 0.25 // a first K-cycle step that leaves less of its residual is the last
)

// maxWidth is the number of right-hand sides that are solved in lockstep.
const maxWidth = 4

// scalars holds one number for each right-hand side of a block.
type scalars [maxWidth]float64

// smoothAndRestrict makes the right-hand side of the next level from the residual after one sweep from zero, and
// leaves it in the work of that level.
//
//	x = damping g, next = R (g - A' x)
func (h *hierarchy) smoothAndRestrict(k, width int, g []float32) {
	l, next := h.levels[k], h.levels[k+1]
	r := l.work[1]
	parallel.For(h.workers, l.n, rowChunk, func(lo, hi int) { l.firstResidual(width, g, r, lo, hi) })
	to := next.work[0]
	parallel.For(h.workers, next.n, rowChunk, func(lo, hi int) { l.restrict(width, r, to, lo, hi) })
}

// cycle applies one K-cycle from level k down to g, giving out: a sweep, the coarse correction, a sweep.
func (h *hierarchy) cycle(k, width int, g, out []float32) {
	l := h.levels[k]
	if k == len(h.levels)-1 {
		h.bottom(width, g, out)
		return
	}
	h.smoothAndRestrict(k, width, g)
	c := h.krylov(k+1, width)
	x := l.work[1]
	parallel.For(h.workers, l.n, sumChunk, func(lo, hi int) { l.prolong(width, g, c, x, lo, hi) })
	parallel.For(h.workers, l.n, rowChunk, func(lo, hi int) { l.sweep(width, g, x, out, lo, hi) })
}

// krylov solves level k for the right-hand side in its work[0] by at most two steps of flexible conjugate gradients
// preconditioned by the cycle below (Notay 2010, algorithm 3.2), and gives the vector that holds the answer.
//
//	c1 = B g, v1 = A c1, rho1 = c1.v1, alpha1 = c1.g, r = g - (alpha1/rho1) v1
//	c2 = B r, v2 = A c2, gamma = c2.v1, beta = c2.v2, alpha2 = c2.r, rho2 = beta - gamma^2/rho1
//	x = (alpha1/rho1 - gamma alpha2/(rho1 rho2)) c1 + (alpha2/rho2) c2
//
// Products are those of the unscaled system, x . y = sum d_i x_i y_i.
func (h *hierarchy) krylov(k, width int) []float32 {
	l := h.levels[k]
	g, c1 := l.work[0], l.work[2]
	h.cycle(k, width, g, c1)
	if k == len(h.levels)-1 && h.inverse != nil {
		return c1 // exact
	}
	v1, r, c2 := l.work[3], l.work[4], l.work[5]
	sum := func(part func(lo, hi int, to *[3]scalars)) (total [3]scalars) {
		parts := make([][3]scalars, (l.n+sumChunk-1)/sumChunk)
		parallel.ForChunk(h.workers, l.n, sumChunk, func(_, n, lo, hi int) {
			to := &parts[n]
			tiles(lo, hi, func(lo, hi int) {
				var t [3]scalars
				part(lo, hi, &t)
				for v := range to {
					for c := range width {
						to[v][c] += t[v][c]
					}
				}
			})
		})
		for _, p := range parts {
			for v := range total {
				for c := range width {
					total[v][c] += p[v][c]
				}
			}
		}
		return total
	}
	one := sum(func(lo, hi int, to *[3]scalars) { l.product(width, c1, g, v1, to, lo, hi) })
	rho1, alpha1, gg := one[0], one[1], one[2]
	var step, keep scalars // alpha1/rho1; 1 where the second step is wanted
	for c := range width {
		if rho1[c] > 0 {
			step[c] = alpha1[c] / rho1[c]
		}
	}
	rest := sum(func(lo, hi int, to *[3]scalars) { l.subtract(width, g, v1, r, &step, to, lo, hi) })
	again := false
	for c := range width {
		if rest[0][c] > goodEnough*goodEnough*gg[c] && rho1[c] > 0 {
			keep[c] = 1
			again = true
		}
	}
	var second scalars
	if again {
		h.cycle(k, width, r, c2)
		two := sum(func(lo, hi int, to *[3]scalars) { l.products(width, c2, v1, r, l.work[1], to, lo, hi) })
		gamma, beta, alpha2 := two[0], two[1], two[2]
		for c := range width {
			rho2 := beta[c] - gamma[c]*gamma[c]/rho1[c]
			if keep[c] == 0 || !(rho2 > 1e-12*beta[c]) {
				continue
			}
			second[c] = alpha2[c] / rho2
			step[c] -= gamma[c] * alpha2[c] / (rho1[c] * rho2)
		}
	}
	parallel.For(h.workers, l.n, sumChunk, func(lo, hi int) {
		tiles(lo, hi, func(lo, hi int) { l.combine(width, &step, c1, &second, c2, lo, hi) })
	})
	return c1
}

// bottom applies the inverse of the coarsest level, or one sweep where that was too large to invert.
func (h *hierarchy) bottom(width int, g, out []float32) {
	l := h.levels[len(h.levels)-1]
	if h.inverse == nil {
		for i, v := range g[:l.n*width] {
			out[i] = damping * v
		}
		return
	}
	n := l.n
	if width == 1 {
		for i := range n {
			row := h.inverse[i*n : (i+1)*n]
			x := g[:len(row)]
			var s, t, u, v float32
			j := 0
			for ; j+4 <= len(row); j += 4 {
				s += float32(row[j] * x[j])
				t += float32(row[j+1] * x[j+1])
				u += float32(row[j+2] * x[j+2])
				v += float32(row[j+3] * x[j+3])
			}
			for ; j < len(row); j++ {
				s += float32(row[j] * x[j])
			}
			out[i] = (s + t) + (u + v)
		}
		return
	}
	for i := range n {
		row := h.inverse[i*n : (i+1)*n]
		var acc [4][maxWidth]float32
		for j, a := range row {
			to := &acc[j&3]
			if j >= n&^3 {
				to = &acc[0]
			}
			x := g[4*j : 4*j+4]
			to[0] += float32(a * x[0])
			to[1] += float32(a * x[1])
			to[2] += float32(a * x[2])
			to[3] += float32(a * x[3])
		}
		for c := range width {
			out[4*i+c] = (acc[0][c] + acc[1][c]) + (acc[2][c] + acc[3][c])
		}
	}
}

func isBad(v float64) bool { return math.IsNaN(v) || math.IsInf(v, 0) }
