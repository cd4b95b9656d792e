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
	weight := make([]float64, g.NNZ())
	last := math.Inf(1)
	for range limit {
		for _, v := range s.free {
			w.b[v] = s.rootRow(x, v, weight[g.RowPtr[v]:g.RowPtr[v+1]])
		}
		eng.solveRows(weight, w.b, w.x)
		s.counts.Newton++
		step := 0.0
		for _, v := range s.free {
			step = max(step, math.Abs(w.x[v]))
			x.move(v, w.x[v])
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

// rootRow gives the row of the root form at free vertex v: weight_j = d(D - U)/df_i by neighbour and b = U - D, both
// over the largest of the weights, so that sum_j weight_j (step_i - step_j) = b is Newton's equation.
func (s *Solver) rootRow(x point, v int32, weight []float64) (b float64) {
	g := s.graph
	q := 1 / (s.p - 1)
	lo := g.RowPtr[v]
	// Logarithms of the fluxes, and of their sums on each side.
	up, down := math.Inf(-1), math.Inf(-1)
	for k := range weight {
		d := x.diff(v, g.Col[lo+k])
		l := float64(s.p*g.Val[lo+k]) + float64((s.p-1)*lnSize(d, 0))
		weight[k] = l
		if d > 0 {
			down = max(down, l)
		} else {
			up = max(up, l)
		}
	}
	var sumUp, sumDown float64
	for k := range weight {
		if x.diff(v, g.Col[lo+k]) > 0 {
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
	// The weight is side * (flux / sum of the side) / |d|.
	top := math.Inf(-1)
	for k := range weight {
		d := x.diff(v, g.Col[lo+k])
		if d > 0 {
			weight[k] += lnD - down - math.Log(sumDown)
		} else {
			weight[k] += lnU - up - math.Log(sumUp)
		}
		weight[k] -= lnSize(d, 0)
		top = max(top, weight[k])
	}
	for k := range weight {
		weight[k] = max(math.Exp(weight[k]-top), rowPad)
	}
	return math.Exp(lnU-top) - math.Exp(lnD-top)
}

// relax moves the vertices of queue, and neighbours that this upsets, one by one to balance their own root form,
// until no imbalance above coarse is left among them or budget moves are done. It brings the few vertices whose fluxes
// are too small for the line search to see into the reach of Newton's method.
func (s *Solver) relax(x point, queue []int32, budget int) {
	const coarse = 0.3
	g := s.graph
	queued := map[int32]bool{}
	for _, v := range queue {
		queued[v] = true
	}
	var weight []float64
	for ; len(queue) > 0 && budget > 0; budget-- {
		v := queue[0]
		queue = queue[1:]
		delete(queued, v)
		lo, hi := g.RowPtr[v], g.RowPtr[v+1]
		weight = append(weight[:0], make([]float64, hi-lo)...)
		for range 4 {
			b := s.rootRow(x, v, weight)
			var sum float64
			for _, c := range weight {
				sum += c
			}
			x.move(v, b/sum)
		}
		for _, u := range g.Col[lo:hi] {
			if s.isFixed[u] || queued[u] {
				continue
			}
			if r := s.rowAt(x, int(u)); math.Abs(r.net) > coarse*r.sum {
				queue = append(queue, u)
				queued[u] = true
			}
		}
	}
}
