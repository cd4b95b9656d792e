// Package solve answers one question: the p-Laplacian interpolation of given values on a weighted graph, with a
// certificate. Run takes a Problem and Settings and gives a Result; it picks the engine (laplace for p = 2, plaplace
// for other finite p, lexmin for p = inf).
package solve

import "pinfill/internal/sparse"

// Energy says how the edge weight enters the energy.
type Energy int

const (
	// Slope is E_p(f) = (1/p) sum over edges of (w |f_i - f_j|)^p; its limit for p -> inf is the largest w |f_i - f_j|.
	Slope Energy = iota
	// Conductance is E_p(f) = (1/p) sum over edges of w |f_i - f_j|^p; p = 2 is the usual L = D - W.
	Conductance
)

// Problem is an interpolation problem: minimise the energy over f with f = Values at Fixed.
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
}

// Certificate proves a result. All figures are relative and dimensionless; NaN means that the figure does not apply.
type Certificate struct {
	Gap            float64 // relative duality gap (primal - dual) / primal, finite p
	Imbalance      float64 // largest |net flow| / sum |flow| over free vertices with a step above the floor, finite p
	Width          float64 // bound on |f - minimiser|, as a share of the label range
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

// Status says how a solve ended.
type Status int

const (
	// Certified means that every figure of the certificate is within its tolerance.
	Certified Status = iota
	// Missed means that the values are the best found and their certificate misses the tolerance.
	Missed
	// Trivial means that nothing had to be solved: no free vertex, or all labels equal.
	Trivial
)
