package plaplace

import (
	"context"
	"math"
)

// denseLimit is the largest number of free vertices solved by elimination of a full matrix.
const denseLimit = 160

// engine solves the weighted Laplacian systems of Newton's method and of the enclosure.
//
// lc holds the logarithm of a conductance for each edge, rowMax its largest over the edges of each vertex. The
// system is sum_j exp(lc_ij - rowMax_i) (x_i - x_j) = b_i at free i with x = 0 at fixed vertices: each row is scaled
// by its own largest conductance, so that b and x have the units of f. tolerance is relative. x is one a vertex.
type engine interface {
	solve(ctx context.Context, lc, rowMax, b, x []float64, tolerance float64) error
}

// dense eliminates without subtractions: the diagonal is never stored but summed afresh from the off-diagonals and
// the excess to fixed vertices, as in the algorithm of Grassmann, Taksar and Heyman (1985), so that every entry
// of the inverse is accurate to a small multiple of n units in the last place at any contrast of conductances
// (O'Cinneide 1993). Rows are scaled one by one, so the matrix need not be symmetric. Time O(n^3), n <= denseLimit.
type dense struct {
	s     *Solver
	place []int32
	a     []float64 // n rows of n+1: off-diagonals (positive), the diagonal slot unused, excess last
	rhs   []float64
	pivot []float64

	weight []float64 // scratch of solve, one a stored entry
}

func newDense(s *Solver) *dense {
	n := len(s.free)
	d := &dense{s: s, place: make([]int32, s.n), a: make([]float64, n*(n+1)), rhs: make([]float64, n), pivot: make([]float64, n), weight: make([]float64, s.graph.NNZ())}
	for k, v := range s.free {
		d.place[v] = int32(k)
	}
	return d
}

var _ engine = (*dense)(nil)

func (d *dense) solve(ctx context.Context, lc, rowMax, b, x []float64, _ float64) error {
	s, g := d.s, d.s.graph
	for _, v := range s.free {
		for t := g.RowPtr[v]; t < g.RowPtr[v+1]; t++ {
			d.weight[t] = math.Exp(lc[s.slot[t]] - rowMax[v])
		}
	}
	d.solveRows(d.weight, b, x)
	return ctx.Err()
}

// solveRows solves sum_j weight_ij (x_i - x_j) = b_i; weight is one a stored entry of the graph.
func (d *dense) solveRows(weight, b, x []float64) {
	s, n := d.s, len(d.s.free)
	w := n + 1
	clear(d.a)
	for k, v := range s.free {
		row := d.a[k*w : (k+1)*w]
		g := s.graph
		for t := g.RowPtr[v]; t < g.RowPtr[v+1]; t++ {
			if u := g.Col[t]; s.isFixed[u] {
				row[n] += weight[t]
			} else {
				row[d.place[u]] = weight[t]
			}
		}
		d.rhs[k] = b[v]
	}
	for k := range n {
		pr := d.a[k*w : (k+1)*w]
		pivot := pr[n]
		for j := k + 1; j < n; j++ {
			pivot += pr[j]
		}
		pivot = max(pivot, 1e-290) // a block cut off by underflow: no step across it
		d.pivot[k] = pivot
		for i := k + 1; i < n; i++ {
			row := d.a[i*w : (i+1)*w]
			if row[k] == 0 {
				continue
			}
			m := row[k] / pivot
			for j := k + 1; j <= n; j++ {
				row[j] += float64(m * pr[j])
			}
			d.rhs[i] += float64(m * d.rhs[k])
		}
	}
	clear(x)
	for k := n - 1; k >= 0; k-- {
		t := d.rhs[k]
		row := d.a[k*w : (k+1)*w]
		for j := k + 1; j < n; j++ {
			t += float64(row[j] * x[s.free[j]])
		}
		x[s.free[k]] = t / d.pivot[k]
	}
	s.counts.LinearSolves++
}
