package plaplace

import (
	"context"
	"math"

	"pinfill/internal/laplace"
	"pinfill/internal/parallel"
)

// iterative hands the systems to package laplace.
type iterative struct {
	s      *Solver
	system *laplace.System
	val    []float64
	rhs    [][]float64
	out    [][]float64
}

func newIterative(s *Solver) *iterative {
	return &iterative{s: s, rhs: [][]float64{make([]float64, s.n)}, out: [][]float64{nil}}
}

var _ engine = (*iterative)(nil)

func (it *iterative) solve(ctx context.Context, lc, rowMax, b, x []float64, tolerance float64) error {
	s := it.s
	g := s.graph
	top := parallel.Max(s.workers, len(rowMax), rowChunk, func(lo, hi int) float64 {
		m := math.Inf(-1)
		for _, v := range rowMax[lo:hi] {
			m = max(m, v)
		}
		return m
	})
	fresh := make([]float64, g.NNZ())
	parallel.For(s.workers, s.n, rowChunk, func(lo, hi int) {
		for v := lo; v < hi; v++ {
			for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
				if e := s.slot[k]; e >= 0 {
					raise := max(lift(rowMax[s.eu[e]]-top), lift(rowMax[s.ev[e]]-top))
					fresh[k] = math.Exp(lc[e] - top + raise)
				}
			}
			it.rhs[0][v] = 0
			if !s.isFixed[v] {
				it.rhs[0][v] = b[v] * math.Exp(rowMax[v]-top+lift(rowMax[v]-top))
			}
		}
	})
	it.val = fresh
	var err error
	if it.system == nil {
		it.system, err = laplace.New(ctx, g.WithValues(it.val), s.fixed, laplace.Options{Workers: s.options.Workers})
	} else {
		err = it.system.Reweight(ctx, it.val)
	}
	if err != nil {
		return err
	}
	clear(x)
	it.out[0] = x
	st, err := it.system.SolvePoisson(ctx, it.rhs, it.out, tolerance)
	s.counts.LinearSolves++
	s.counts.Iterations += st.Iterations
	return err
}

// lift says by how much to raise the logarithm of conductances around a vertex whose largest is level below the
// largest of all, so that the system stays within 1e-36 of it: levels below 1e-20 are squeezed. Rows keep their
// shape, only the pull of low rows on high ones grows, from below 1e-20 to below 1e-20.
func lift(level float64) float64 {
	const knee, room = 46.0, 37.0 // 1e-20 and 16 decades more
	if level >= -knee {
		return 0
	}
	excess := -level - knee
	return excess - room*excess/(excess+room)
}
