package laplace

import (
	"context"

	"gonum.org/v1/gonum/mat"
)

// harmonicBlock is the number of harmonic measures solved for at a time.
const harmonicBlock = 4

// Harmonic solves for the harmonic measures h_j, the potentials with 1 at the j-th fixed vertex and 0 at the others
// (so that the answer for values y is sum_j y_j h_j, and sum_j h_j = 1), a block of columns at a time, and gives the
// Schur complement on the fixed vertices
//
//	S = L_SS - L_SU L_UU^-1 L_US,   (S y)_i = current out of fixed vertex i for values y.
//
// S includes edges between fixed vertices, which the solves never see. each, if not nil, is called with blocks of
// consecutive columns in order: h[k] is h_{first+k}, one value a vertex; its memory is used again after each returns.
func (s *System) Harmonic(ctx context.Context, tol float64, each func(first int, h [][]float64) error) (*mat.SymDense, Stats, error) {
	l := len(s.fixed)
	total := Stats{Converged: true}
	if l == 0 {
		return nil, total, nil
	}
	full := make([]float64, l*l)
	values := make([][]float64, harmonicBlock)
	h := make([][]float64, harmonicBlock)
	for k := range min(harmonicBlock, l) {
		values[k], h[k] = make([]float64, l), make([]float64, s.N())
	}
	for first := 0; first < l; first += harmonicBlock {
		width := min(harmonicBlock, l-first)
		for k := range width {
			clear(values[k])
			values[k][first+k] = 1
			clear(h[k])
		}
		st, err := s.SolveDirichlet(ctx, values[:width], h[:width], tol)
		if err != nil {
			return nil, total, err
		}
		total.merge(st)
		for k := range width {
			for i, v := range s.fixed {
				if i == first+k {
					continue
				}
				cols, vals := s.network.Row(int(v))
				var t float64
				for e, j := range cols {
					t += float64(vals[e] * h[k][j])
				}
				full[i*l+first+k] = t
			}
		}
		if each != nil {
			if err := each(first, h[:width]); err != nil {
				return nil, total, err
			}
		}
	}
	// Off the diagonal -S_ij >= 0; rows of S sum to zero.
	schur := mat.NewSymDense(l, nil)
	for i := range l {
		for j := range i {
			schur.SetSym(i, j, -(full[i*l+j]+full[j*l+i])/2)
		}
	}
	for i := range l {
		var t float64
		for j := range l {
			if j != i {
				t -= schur.At(i, j)
			}
		}
		schur.SetSym(i, i, t)
	}
	return schur, total, nil
}
