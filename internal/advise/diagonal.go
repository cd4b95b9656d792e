package advise

import (
	"context"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"

	"pinfill/internal/laplace"
)

// solver is the part of a laplace.System that Next needs.
type solver interface {
	SolvePoisson(ctx context.Context, b, x [][]float64, tol float64) (laplace.Stats, error)
	Free() []int32
}

var _ solver = (*laplace.System)(nil)

const (
	denseFree = 600  // free vertices up to which the inverse is computed as a dense matrix
	probes    = 16   // random right-hand sides otherwise: each G_kk within 35 % or so
	probeTol  = 1e-2 // of their solves
)

// diagonal gives G_kk for free vertices, exactly or estimated; 0 for held ones.
func (g *greedy) diagonal(ctx context.Context) ([]float64, error) {
	if len(g.system.Free()) <= denseFree {
		if d := g.denseDiagonal(); d != nil {
			for v := range g.exact {
				g.exact[v] = true
			}
			return d, nil
		}
	}
	return g.probeDiagonal(ctx)
}

// denseDiagonal inverts the grounded Laplacian; nil if it is too ill-conditioned for that.
func (g *greedy) denseDiagonal() []float64 {
	free := g.system.Free()
	place := make([]int, g.p.Conductance.N)
	for v := range place {
		place[v] = -1
	}
	for k, v := range free {
		place[v] = k
	}
	a := mat.NewSymDense(len(free), nil)
	for k, v := range free {
		cols, vals := g.p.Conductance.Row(int(v))
		var total float64
		for e, w := range cols {
			total += vals[e]
			if j := place[w]; j > k {
				a.SetSym(k, j, -vals[e])
			}
		}
		a.SetSym(k, k, total)
	}
	var chol mat.Cholesky
	var inv mat.SymDense
	if !chol.Factorize(a) || chol.Cond() > 1e12 || chol.InverseTo(&inv) != nil {
		return nil
	}
	d := make([]float64, g.p.Conductance.N)
	for k, v := range free {
		d[v] = inv.At(k, k)
	}
	return d
}

// probeDiagonal estimates G_kk as the mean of x_k^2 over solves G x = B' C^(1/2) z with random signs z on the edges
// (E[x x'] = G B' C B G = G). An estimate is no smaller than 1 / L_kk, which G_kk never is.
func (g *greedy) probeDiagonal(ctx context.Context) ([]float64, error) {
	c := g.p.Conductance
	d := make([]float64, c.N)
	held := make([]bool, c.N)
	for v := range held {
		held[v] = true
	}
	for _, v := range g.system.Free() {
		held[v] = false
	}
	r := rand.New(rand.NewPCG(2, uint64(c.N)))
	b, x := make([][]float64, columnBlock), make([][]float64, columnBlock)
	for k := range b {
		b[k], x[k] = make([]float64, c.N), make([]float64, c.N)
	}
	for range probes / columnBlock {
		for k := range b {
			clear(b[k])
			clear(x[k])
		}
		for v := range c.N {
			cols, vals := c.Row(v)
			for e, w := range cols {
				if int(w) < v || held[v] && held[w] {
					continue
				}
				root := math.Sqrt(vals[e])
				signs := r.Uint64()
				for k := range b {
					s := root
					if signs>>k&1 == 0 {
						s = -root
					}
					b[k][v] += s
					b[k][w] -= s
				}
			}
		}
		if _, err := g.system.SolvePoisson(ctx, b, x, probeTol); err != nil {
			return nil, err
		}
		for k := range x {
			for v, t := range x[k] {
				d[v] += float64(t*t) / probes
			}
		}
	}
	for v := range c.N {
		if held[v] {
			d[v] = 0
			continue
		}
		_, vals := c.Row(v)
		var total float64
		for _, w := range vals {
			total += w
		}
		d[v] = max(d[v], 1/total)
	}
	return d, nil
}
