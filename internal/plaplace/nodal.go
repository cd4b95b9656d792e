package plaplace

import (
	"context"
	"math"
)

// nodal is Newton's method on the root form of the nodal equations, for small systems where the powers of a large p
// leave parts of the graph with fluxes too small for an energy to see. With
//
//	D_i = (sum over f_j < f_i of w_ij^p (f_i - f_j)^(p-1))^(1/(p-1))  and U_i the same over f_j > f_i,
//
// the minimiser has D_i = U_i at every free vertex. Both are homogeneous of degree 1, so a Newton step is of the right
// size however far the fluxes are apart (for a vertex with one neighbour on either side it is exact); as p grows they
// become the steepest slopes down and up. The Jacobian is an M-matrix, not symmetric: dense elimination only.
func (s *Solver) nodal(ctx context.Context, x point, w *work, eng *dense, limit int) error {
	g := s.graph
	q := 1 / (s.p - 1)
	weight := make([]float64, g.NNZ())
	last := math.Inf(1)
	for range limit {
		for _, v := range s.free {
			// Logarithms of the fluxes, and of their sums on each side.
			up, down := math.Inf(-1), math.Inf(-1)
			lo, hi := g.RowPtr[v], g.RowPtr[v+1]
			for k := lo; k < hi; k++ {
				d := x.diff(v, g.Col[k])
				l := s.p*g.Val[k] + (s.p-1)*lnSize(d, 0)
				weight[k] = l
				if d > 0 {
					down = max(down, l)
				} else {
					up = max(up, l)
				}
			}
			var sumUp, sumDown float64
			for k := lo; k < hi; k++ {
				if x.diff(v, g.Col[k]) > 0 {
					sumDown += math.Exp(weight[k] - down)
				} else {
					sumUp += math.Exp(weight[k] - up)
				}
			}
			lnU, lnD := math.Inf(-1), math.Inf(-1) // of U and D
			if sumUp > 0 {
				lnU = q * (up + math.Log(sumUp))
			}
			if sumDown > 0 {
				lnD = q * (down + math.Log(sumDown))
			}
			// dD/df_i - terms: (phi_ij / sum of the side) * side / |d|, all over the larger of U and D and the
			// smallest |d|, which the row's own scaling takes out again.
			top := math.Inf(-1)
			for k := lo; k < hi; k++ {
				d := x.diff(v, g.Col[k])
				if d > 0 {
					weight[k] += lnD - down - math.Log(sumDown)
				} else {
					weight[k] += lnU - up - math.Log(sumUp)
				}
				weight[k] -= lnSize(d, 0)
				top = max(top, weight[k])
			}
			for k := lo; k < hi; k++ {
				weight[k] = max(math.Exp(weight[k]-top), rowPad)
			}
			w.b[v] = math.Exp(lnU-top) - math.Exp(lnD-top)
		}
		eng.solveRows(weight, w.b, w.x)
		s.counts.Newton++
		step := 0.0
		for _, v := range s.free {
			step = max(step, math.Abs(w.x[v]))
			if x.h != nil {
				x.h[v] += w.x[v]
			} else {
				x.f[v] = min(max(x.f[v]+w.x[v], 0), 1)
			}
		}
		if step < 1e-15 || x.h == nil && step < 1e-9 || step > 0.9*last && step < 1e-12 {
			break
		}
		last = step
		if err := ctx.Err(); err != nil {
			return err
		}
	}
	return nil
}
