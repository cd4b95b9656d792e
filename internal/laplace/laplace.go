// Package laplace solves grounded Laplacian systems: potentials on a network of conductances in which some vertices
// are held. New takes a network and the held ("fixed") vertices and gives a System; SolveDirichlet finds the
// potentials for given values at the fixed vertices, SolvePoisson for currents injected at the free ones, Harmonic
// the response to each fixed vertex alone and the Schur complement on the fixed vertices. Reweight changes the
// conductances and keeps what still serves, for the reweighted systems of Newton's method and IRLS.
//
// With U the free and S the fixed vertices, L = D - C the Laplacian of the conductances c_ij >= 0, the system is
//
//	L_UU x_U = b_U - L_US x_S,
//
// symmetric positive definite and an M-matrix once every component holds a fixed vertex. It is stored as
// off-diagonal conductances and an excess e_i = sum of c_ij over fixed j, never as a bare diagonal, and applied in
// difference form, e_i x_i + sum_j c_ij (x_i - x_j), so that contrast between conductances costs no digits.
//
// Every answer depends on the input alone, not on the number of workers.
package laplace

import (
	"context"
	"errors"
	"fmt"
	"math"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// Method names a way to solve a system.
type Method int

const (
	// Auto starts with Jacobi, predicts how long it would take, and changes to Multigrid where that is shorter;
	// small systems, and middling ones solved for many right-hand sides, are factorised (Direct).
	Auto Method = iota
	// Jacobi is conjugate gradients preconditioned by the diagonal.
	Jacobi
	// Multigrid is flexible conjugate gradients preconditioned by one aggregation multigrid K-cycle.
	Multigrid
	// Elimination is conjugate gradients preconditioned by a randomised approximate elimination, fixed seed.
	Elimination
	// Direct is exact sparse elimination without subtractions: accurate in every entry at any contrast.
	Direct
)

var methodNames = [...]string{"auto", "jacobi", "multigrid", "elimination", "direct"}

func (m Method) String() string {
	if m < 0 || int(m) >= len(methodNames) {
		return fmt.Sprintf("Method(%d)", int(m))
	}
	return methodNames[m]
}

// Options steer a System. The zero value means the defaults.
type Options struct {
	Workers int    // 0 means GOMAXPROCS; answers do not depend on it
	Method  Method // Auto by default; another value is meant for tests and measurements
}

// Stats says how a solve went. Over several right-hand sides Iterations adds up, the figures are the largest and
// Converged is true if all converged.
type Stats struct {
	Method     Method  // what gave the last answer
	Iterations int     // conjugate-gradient iterations
	Residual   float64 // ||b - L x|| / ||b|| in the norm ||r||^2 = sum r_i^2 / L_ii, recomputed from the answer
	Correction float64 // estimate of max |x - exact| over the scale of x, from the preconditioned residual
	Converged  bool    // Residual and Correction are both within the tolerance asked for
}

func (s *Stats) merge(t Stats) {
	s.Method = t.Method
	s.Iterations += t.Iterations
	s.Residual = math.Max(s.Residual, t.Residual)
	s.Correction = math.Max(s.Correction, t.Correction)
	s.Converged = s.Converged && t.Converged
}

// UngroundedError reports a component that holds no fixed vertex: its potentials are undefined.
type UngroundedError struct {
	Vertex int // a vertex of the component, the smallest
}

func (e *UngroundedError) Error() string {
	return fmt.Sprintf("the component of vertex %d holds no fixed vertex", e.Vertex)
}

// ErrNegative reports a conductance that is negative, infinite or not a number.
var ErrNegative = errors.New("a conductance is negative or not finite")

// System is a network with its fixed vertices, ready to be solved. It must not be used by two goroutines at once.
type System struct {
	options Options
	network *sparse.CSR
	fixed   []int32 // strictly increasing
	free    []int32 // the others, increasing
	place   []int32 // of each vertex: k >= 0, the k-th free vertex; -1-k, the k-th fixed vertex
	scale   float64 // power of two by which conductances are multiplied inside
	a       grounded
	engines
}

// New prepares the system of the network c (Val holds conductances >= 0) with the vertices of fixed, strictly
// increasing, held. A conductance of zero is no edge. The error is an *UngroundedError where a component holds no
// fixed vertex.
func New(ctx context.Context, c *sparse.CSR, fixed []int32, o Options) (*System, error) {
	o.Workers = parallel.Workers(o.Workers)
	s := &System{options: o, network: c, fixed: fixed, place: make([]int32, c.N)}
	for k, v := range fixed {
		if v < 0 || int(v) >= c.N || k > 0 && fixed[k-1] >= v {
			return nil, fmt.Errorf("fixed vertices must be strictly increasing and below %d, found %d at position %d", c.N, v, k)
		}
		s.place[v] = int32(-1 - k)
	}
	s.free = make([]int32, 0, c.N-len(fixed))
	for v := range c.N {
		if s.place[v] == 0 {
			s.place[v] = int32(len(s.free))
			s.free = append(s.free, int32(v))
		}
	}
	if err := s.fill(true); err != nil {
		return nil, err
	}
	return s, ctx.Err()
}

// N is the number of vertices, free and fixed.
func (s *System) N() int { return s.network.N }

// Free gives the free vertices in increasing order, to be read only.
func (s *System) Free() []int32 { return s.free }

// Reweight gives the system new conductances, one for each entry of the network's pattern, symmetric. Orders and
// aggregates that still serve are kept.
func (s *System) Reweight(ctx context.Context, val []float64) error {
	if len(val) != s.network.NNZ() {
		return fmt.Errorf("%d conductances for %d entries", len(val), s.network.NNZ())
	}
	s.network = s.network.WithValues(val)
	if err := s.fill(false); err != nil {
		return err
	}
	s.reweighted()
	return ctx.Err()
}

// Currents sets out_i = sum_j c_ij (x_i - x_j), the current that leaves vertex i, for free i, and 0 for fixed i.
// x and out hold one value a vertex. For a solution of SolveDirichlet it is the residual, up to sign; for one of
// SolvePoisson it is b.
func (s *System) Currents(x, out []float64) {
	c := s.network
	parallel.For(s.options.Workers, c.N, rowChunk, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			out[i] = 0
			if s.place[i] < 0 {
				continue
			}
			cols, vals := c.Row(i)
			var t float64
			for k, j := range cols {
				t += float64(vals[k] * (x[i] - x[j]))
			}
			out[i] = t
		}
	})
}
