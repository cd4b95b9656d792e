// Package solve answers one question: the p-Laplacian interpolation of given values on a weighted graph, with a
// certificate. Run takes a Problem and Settings and gives a Result; RunMany does the same for several sets of values
// on one graph; Verify checks any vector against the minimiser. The engine is package plaplace for finite p and
// package lexmin for p = inf.
//
// An error says that a solve could not start or was stopped. How a solve ended is in Result.Status, and how far the
// values can be from the minimiser in Result.Certificate.
package solve

import (
	"context"

	"pinfill/internal/sparse"
)

// Energy says how the edge weight enters the energy.
type Energy int

const (
	// Slope is E_p(f) = (1/p) sum over edges of (w |f_i - f_j|)^p; its limit for p -> inf is the largest w |f_i - f_j|.
	Slope Energy = iota
	// Conductance is E_p(f) = (1/p) sum over edges of w |f_i - f_j|^p; p = 2 is the usual L = D - W. Its limit for
	// p -> inf forgets the weights: every edge counts the same.
	Conductance
)

// Problem is an interpolation problem: minimise the energy over f with f = Values at Fixed. Every component must hold
// a fixed vertex; edges between fixed vertices are ignored.
type Problem struct {
	Graph  *sparse.CSR // Val holds ln w for each edge, any finite size
	Fixed  []int32     // vertices held, strictly increasing
	Values []float64   // value of each vertex of Fixed
	P      float64     // > 1, or +Inf
	Energy Energy
}

// Settings steer a solve. The zero value means the defaults.
type Settings struct {
	Tolerance float64                           // largest Certificate.Width that is certified, a share of the label range; 0 means 1e-9
	Workers   int                               // 0 means GOMAXPROCS; the answer does not depend on it
	Start     []float64                         // a guess at the answer, one value a vertex, or nil
	Progress  func(stage string, share float64) // called now and then, share in [0, 1]; may be nil

	// Rough stops within about 1e-4 of the label range, without a certificate: Status Rough. For evidence that is
	// compared with the labels' own noise, such as left-out answers, never for an answer.
	Rough bool
}

// DefaultTolerance is the tolerance that Settings.Tolerance = 0 stands for.
const DefaultTolerance = 1e-9

func (s Settings) tolerance() float64 {
	if s.Tolerance > 0 {
		return s.Tolerance
	}
	return DefaultTolerance
}

// Certificate proves a result. All figures are relative and dimensionless; NaN means that the figure does not apply
// or, for Width, that no bound could be verified.
type Certificate struct {
	Gap            float64 // relative duality gap (primal - dual) / primal of the energies to the power 1/p, finite p
	Imbalance      float64 // largest |net flow| / sum |flow| over free vertices with a step above 1e-9, finite p
	Width          float64 // bound on |f - minimiser|, as a share of the label range, apart from the last rounding of f
	SlopeImbalance float64 // largest |steepest up - steepest down| over the steepest slope, p = inf
}

// Counts say how much work a solve took.
type Counts struct {
	LinearSolves int // grounded Laplacian systems solved
	Iterations   int // conjugate-gradient iterations in all of them
	Newton       int // outer steps, finite p
	Paths        int // steepest paths fixed, p = inf
}

// Result is what a solve found.
type Result struct {
	Values      []float64 // one a vertex; exactly Problem.Values at Problem.Fixed
	Status      Status
	Certificate Certificate
	Counts      Counts
}

// Run solves one problem. The error is a *ProblemError where the problem is not well posed, an *UnreachableError where
// a component holds no fixed vertex, an *RangeError where the range of the values overflows, or the context's own.
func Run(ctx context.Context, p Problem, s Settings) (Result, error) {
	var starts [][]float64
	if s.Start != nil {
		starts = [][]float64{s.Start}
	}
	r, err := RunMany(ctx, p, [][]float64{p.Values}, starts, s)
	if err != nil {
		return Result{}, err
	}
	return r[0], nil
}

// RunMany solves the problem for each of several sets of values, with one set-up; p.Values and s.Start are ignored.
// starts holds a guess for each set of values, or is nil, as each of its entries may be. Errors are as for Run. When
// the context ends, the results found so far come back with the error; the others have Status Stopped and no values.
func RunMany(ctx context.Context, p Problem, values, starts [][]float64, s Settings) ([]Result, error) {
	pl, err := newPlan(ctx, p, s)
	if err != nil {
		return nil, err
	}
	for k := range values {
		if err := checkValues(p.Fixed, values[k]); err != nil {
			return nil, err
		}
	}
	out := make([]Result, len(values))
	for k := range out {
		out[k].Status = Stopped
	}
	for k := range values {
		var start []float64
		if starts != nil {
			start = starts[k]
		}
		if start != nil && len(start) != p.Graph.N {
			return nil, &ProblemError{Vertex: -1, Reason: "the guess does not hold one value a vertex"}
		}
		pl.progress = func(share float64) {
			if s.Progress != nil {
				s.Progress("solve", (float64(k)+share)/float64(len(values)))
			}
		}
		if len(values) > 1 && starts == nil && k%together == 0 {
			if err := pl.prepare(ctx, values[k:min(k+together, len(values))]); err != nil {
				return out, err
			}
		}
		r, err := pl.run(ctx, k%together, values[k], start)
		if err != nil {
			return out, err
		}
		out[k] = r
	}
	return out, nil
}

// Verify gives the certificate of any vector, one value a vertex, for a problem: how far it can be from the minimiser
// for p.Values. A wrong vector shows as a wide or missing bound. Where the vector differs from p.Values at a fixed
// vertex, the width counts that too. Errors are as for Run.
func Verify(ctx context.Context, p Problem, values []float64, s Settings) (Certificate, error) {
	if len(values) != p.Graph.N {
		return Certificate{}, &ProblemError{Vertex: -1, Reason: "the vector does not hold one value a vertex"}
	}
	if err := checkValues(p.Fixed, p.Values); err != nil {
		return Certificate{}, err
	}
	pl, err := newPlan(ctx, p, s)
	if err != nil {
		return Certificate{}, err
	}
	return pl.verify(ctx, p.Values, values)
}
