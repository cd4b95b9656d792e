// Package plaplace minimises the p-energy on a weighted graph for finite p > 1 and proves how near its answer is to
// the minimiser. New takes a graph, its fixed vertices and p; Solver.Solve finds the minimiser for given values at the
// fixed vertices; Solver.Certify bounds the distance of any vector from it.
//
// The energy is E(f) = (1/p) sum over edges of |r_e|^p with r_e = w_e (f_i - f_j), the slope convention. With the flux
// phi_e = w_e^p |f_i - f_j|^(p-1) sign(f_i - f_j), the minimiser is the one f with net flux
//
//	F_i(f) = sum_j phi_ij = 0 at every free vertex i.
//
// Everything that can be large or small without bound (weights, conductances, fluxes) is kept as a logarithm and is
// scaled row by row, so that p has no upper limit set by the exponent range of float64.
package plaplace

import (
	"context"
	"errors"
	"fmt"
	"math"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// Options steer a Solver. The zero value means the defaults.
type Options struct {
	Workers  int                 // 0 means GOMAXPROCS; answers do not depend on it
	Progress func(share float64) // called now and then with the share of the work done; may be nil
	// Rough stops within about 1e-4 of the range of the minimiser, without a certificate.
	Rough bool
}

// Counts say how much work a solve took.
type Counts struct {
	LinearSolves int // linear systems solved
	Iterations   int // conjugate-gradient iterations in all of them
	Newton       int // Newton steps
}

// Certificate proves a vector f. The figures are relative to the range of the fixed values.
type Certificate struct {
	Gap       float64 // 1 - (dual bound / energy), both to the power 1/p; at least 0 up to rounding
	Imbalance float64 // largest |F_i| / sum_j |phi_ij| over free i with a step |f_i - f_j| above 1e-9 of the range
	Width     float64 // largest distance to the far side of the enclosure; NaN if none was verified
}

// Result is what Solve found.
type Result struct {
	Values      []float64 // one a vertex; the given values at fixed vertices
	Certificate Certificate
	Counts      Counts
}

// ErrP reports a p outside (1, inf).
var ErrP = errors.New("p must be a finite number above 1")

// Solver is a graph with its fixed vertices and p, ready to be solved for values. It must not be used by two
// goroutines at once.
type Solver struct {
	p                float64
	n                int
	workers          int
	options          Options
	graph            *sparse.CSR // Val holds ln w, the largest 0
	fixed            []int32
	free             []int32
	isFixed          []bool
	slot             []int32 // edge of each stored entry of graph
	eu, ev           []int32 // ends of each edge, eu < ev
	ea               []float64
	engine           engine
	conductance      []float64 // w^2 by stored entry, p = 2 only, else nil
	conductanceError float64   // relative error of each
	eps              float64   // differences count as at least this, p < 2 only
	counts           Counts
}

// New prepares a solver. Val of g holds ln w; fixed is strictly increasing; every component must hold a fixed vertex.
// Edges between fixed vertices are allowed and ignored.
func New(ctx context.Context, g *sparse.CSR, fixed []int32, p float64, o Options) (*Solver, error) {
	if !(p > 1) || math.IsInf(p, 1) {
		return nil, fmt.Errorf("%w, got %v", ErrP, p)
	}
	s := &Solver{p: p, n: g.N, workers: parallel.Workers(o.Workers), options: o, graph: g, fixed: fixed}
	s.isFixed = make([]bool, g.N)
	for _, v := range fixed {
		s.isFixed[v] = true
	}
	s.free = make([]int32, 0, g.N-len(fixed))
	for v := range g.N {
		if !s.isFixed[v] {
			s.free = append(s.free, int32(v))
		}
	}
	s.layoutEdges()
	if p == 2 {
		s.layoutLinear()
	}
	if len(s.free) <= denseLimit {
		s.engine = newDense(s)
	} else {
		s.engine = newIterative(s)
	}
	return s, ctx.Err()
}

// layoutEdges numbers the edges with at least one free end in the order of their first end.
func (s *Solver) layoutEdges() {
	g := s.graph
	s.slot = make([]int32, g.NNZ())
	m := 0
	for u := range g.N {
		for k := g.RowPtr[u]; k < g.RowPtr[u+1]; k++ {
			v := g.Col[k]
			if int(v) > u && !(s.isFixed[u] && s.isFixed[v]) {
				m++
			}
		}
	}
	s.eu, s.ev, s.ea = make([]int32, m), make([]int32, m), make([]float64, m)
	back := make([]int, g.N) // next entry of row v that leads to a smaller vertex
	copy(back, g.RowPtr[:g.N])
	m = 0
	for u := range g.N {
		for k := g.RowPtr[u]; k < g.RowPtr[u+1]; k++ {
			v := g.Col[k]
			if int(v) <= u {
				continue
			}
			// Columns are sorted, so row v meets its smaller neighbours in the order in which this loop does.
			t := back[v]
			back[v]++
			if s.isFixed[u] && s.isFixed[v] {
				s.slot[k], s.slot[t] = -1, -1
				continue
			}
			s.eu[m], s.ev[m], s.ea[m] = int32(u), v, g.Val[k]
			s.slot[k], s.slot[t] = int32(m), int32(m)
			m++
		}
	}
}

const (
	edgeChunk = 8192
	rowChunk  = 4096
)
