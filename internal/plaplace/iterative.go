package plaplace

import (
	"context"
	"math"

	"pinfill/internal/laplace"
	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// iterative hands the systems to package laplace. Conductances that span more decades than a multigrid in single
// precision can bear are taken in bands: first the whole system with low rows lifted, which is right for the rows
// within 14 decades of the largest; then the rows below that with the others held, in their own scale; and so on. What a
// low row pulls at a high one is below 1e-14 of the high row, so one pass downwards is enough for Newton's method.
type iterative struct {
	s      *Solver
	system *laplace.System
	rhs    [][]float64
	out    [][]float64
	place  []int32
}

func newIterative(s *Solver) *iterative {
	return &iterative{s: s, rhs: [][]float64{make([]float64, s.n)}, out: [][]float64{nil}}
}

var _ engine = (*iterative)(nil)

// method leaves the choice to laplace where it sees one system, p = 2; the reweighted systems of other p have contrasts
// that a first look at the unweighted one does not show.
func (it *iterative) method() laplace.Method {
	if it.s.p == 2 || len(it.s.free) < 2000 {
		return laplace.Auto
	}
	return laplace.Multigrid
}

// Widths of a band and of what is squeezed below it, natural logarithms: 14 and 12 decades.
const (
	band = 32.0
	room = 28.0
)

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
	// At p = 2 the conductances are always the same.
	reweigh := it.system == nil || s.p != 2
	var val []float64
	if reweigh {
		val = make([]float64, g.NNZ())
	}
	parallel.For(s.workers, s.n, rowChunk, func(lo, hi int) {
		for v := lo; v < hi; v++ {
			it.rhs[0][v] = 0
			if !s.isFixed[v] {
				it.rhs[0][v] = b[v] * lifted(rowMax[v], rowMax[v], rowMax[v], top)
			}
			if !reweigh {
				continue
			}
			for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
				if e := s.slot[k]; e >= 0 {
					val[k] = lifted(lc[e], rowMax[s.eu[e]], rowMax[s.ev[e]], top)
				}
			}
		}
	})
	var err error
	if it.system == nil {
		it.system, err = laplace.New(ctx, g.WithValues(val), s.fixed, laplace.Options{Workers: s.options.Workers, Method: it.method()})
	} else if reweigh {
		err = it.system.Reweight(ctx, val)
	}
	if err != nil {
		return err
	}
	clear(x)
	it.out[0] = x
	st, err := it.system.SolvePoisson(ctx, it.rhs, it.out, tolerance)
	s.counts.LinearSolves++
	s.counts.Iterations += st.Iterations
	if err != nil {
		return err
	}
	for {
		var low []int32
		next := math.Inf(-1)
		for _, v := range s.free {
			if rowMax[v] < top-band {
				low = append(low, v)
				next = max(next, rowMax[v])
			}
		}
		if len(low) == 0 {
			return nil
		}
		top = next
		if err := it.solveLow(ctx, lc, rowMax, b, x, tolerance, low, top); err != nil {
			return err
		}
	}
}

// lifted is the conductance of log lc, between rows with largest l1 and l2, in units of exp(top), raised so that it
// stays within 1e-26 of that where it counts in its rows: levels more than a band below top are squeezed. Rows keep
// their shape.
func lifted(lc, l1, l2, top float64) float64 {
	return math.Exp(lc - top + max(lift(l1-top), lift(l2-top)))
}

func lift(level float64) float64 {
	excess := -level - band
	if excess <= 0 {
		return 0
	}
	return excess - room*excess/(excess+room)
}

// solveLow solves again for the rows of low, with all others held at x.
func (it *iterative) solveLow(ctx context.Context, lc, rowMax, b, x []float64, tolerance float64, low []int32, top float64) error {
	s, g := it.s, it.s.graph
	if it.place == nil {
		it.place = make([]int32, s.n)
	}
	// Local numbers: the rows of low first, in order, then one vertex that stands for all held ones.
	n := len(low)
	for k, v := range low {
		it.place[v] = int32(k + 1)
	}
	sub := &sparse.CSR{N: n + 1, RowPtr: make([]int, n+2)}
	rhs, out := make([]float64, n+1), make([]float64, n+1)
	toHeld := make([]float64, n)
	for k, v := range low {
		rhs[k] = b[v] * lifted(rowMax[v], rowMax[v], rowMax[v], top)
		for t := g.RowPtr[v]; t < g.RowPtr[v+1]; t++ {
			u, e := g.Col[t], s.slot[t]
			if j := it.place[u]; j > 0 {
				sub.Col = append(sub.Col, j-1)
				sub.Val = append(sub.Val, lifted(lc[e], rowMax[v], rowMax[u], top))
				continue
			}
			// The row's own scale counts here: lc is at most rowMax[v], whatever the held row's is.
			c := lifted(lc[e], rowMax[v], rowMax[v], top)
			toHeld[k] += c
			rhs[k] += float64(c * x[u])
		}
		if toHeld[k] > 0 {
			sub.Col = append(sub.Col, int32(n))
			sub.Val = append(sub.Val, toHeld[k])
		}
		sub.RowPtr[k+1] = len(sub.Col)
	}
	for _, v := range low {
		it.place[v] = 0
	}
	for k, c := range toHeld {
		if c > 0 {
			sub.Col = append(sub.Col, int32(k))
			sub.Val = append(sub.Val, c)
		}
	}
	sub.RowPtr[n+1] = len(sub.Col)
	system, err := laplace.New(ctx, sub, []int32{int32(n)}, laplace.Options{Workers: s.options.Workers})
	if err != nil {
		return err
	}
	st, err := system.SolvePoisson(ctx, [][]float64{rhs}, [][]float64{out}, tolerance)
	if err != nil {
		return err
	}
	s.counts.Iterations += st.Iterations
	for k, v := range low {
		x[v] = out[k]
	}
	return nil
}

// Quadratics gives guesses for Solve, the p = 2 solution for each set of values, found together: one pass over
// the matrix serves several. It gives nil where Solve needs none, the system being small.
func (s *Solver) Quadratics(ctx context.Context, values [][]float64) ([]Guess, error) {
	it, large := s.engine.(*iterative)
	if !large {
		return nil, nil
	}
	if it.system == nil || s.p != 2 {
		// One solve sets up the system with the conductances of p = 2, squeezed as they must be.
		w := s.newWork()
		s.linearise(w, 2, 0, rowPad)
		if err := it.solve(ctx, w.lc, w.rowMax, w.b, w.x, 1); err != nil {
			return nil, err
		}
	}
	guesses := make([]Guess, len(values))
	out := make([][]float64, len(values))
	for k := range out {
		out[k] = make([]float64, s.n)
		guesses[k] = Guess{Values: out[k], Quadratic: true}
	}
	_, err := it.system.SolveDirichlet(ctx, values, out, s.firstTolerance())
	return guesses, err
}
