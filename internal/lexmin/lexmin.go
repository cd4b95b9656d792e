// Package lexmin finds the lexicographic minimiser of a partly labelled weighted graph, the limit p = inf of
// p-Laplacian interpolation: of all f with the given values, the one whose slopes w_ij |f_i - f_j|, sorted from the
// greatest down, come first in the order of the dictionary. It is unique where every component has a label, and it
// is the f at which every free vertex has the steepest slope up equal to the steepest slope down. Solve is the entry
// point; Check measures how far any f is from it.
//
// The method (Kyng, Rao, Sachdeva and Spielman, "Algorithms for Lipschitz learning on graphs", COLT 2015): with
// edge lengths l = 1/w, find the steepest path between two held vertices a, b through free ones, slope
// (y_a - y_b)/length, set its vertices linearly along it, hold them, repeat. A vertex lies on a path steeper than
// alpha only if its greatest lower bound lo = max_t (y_t - alpha d_t) exceeds its least upper bound
// hi = min_t (y_t + alpha d_t); two searches find those vertices, all other can be left aside while paths steeper
// than alpha are sought, and the components of what remains are independent. Three things differ from the paper:
// the next alpha is not the pressure of a random vertex but a quantile of (y_a - y_b)/(d_a + d_b) over the vertices
// found, which the two searches give for nothing; both searches stop at vertices that cannot lie on such a path; and
// nothing is drawn at random.
//
// Cost: about 30 to 60 heap operations a vertex on neighbour graphs; the worst case is O(paths * m log n). Memory is
// about 120 bytes a vertex and 8 a stored edge.
package lexmin

import (
	"context"
	"errors"
	"fmt"
	"math"

	"pinfill/internal/sparse"
)

// Options steer Solve; the zero value is good. The answer depends on none of them.
type Options struct {
	Workers  int                 // goroutines at a time; 0 means GOMAXPROCS
	Progress func(share float64) // called now and then with the share of free vertices settled, from one goroutine at a time
}

// Stats say how much work Solve took.
type Stats struct {
	Paths    int // steepest paths set, single vertices among them
	Flat     int // vertices filled with the one value their part of the graph meets
	Searches int // shortest-path searches
	HeapPops int // entries taken from their heaps
}

// Solve gives the lexicographic minimiser. g is symmetric with Val = ln w, any finite numbers, only their
// differences within a component matter; fixed are the held vertices, strictly increasing, and values their finite
// values, in any unit; they come back unchanged. Every component must hold a fixed vertex. Errors name the first
// vertex that breaks these rules, or are the context's.
func Solve(ctx context.Context, g *sparse.CSR, fixed []int32, values []float64, o Options) ([]float64, Stats, error) {
	if err := validate(g, fixed, values); err != nil {
		return nil, Stats{}, err
	}
	if err := ctx.Err(); err != nil {
		return nil, Stats{}, err
	}
	low, scale := normalise(values)
	s := newSolver(g, fixed, values, low, scale, o)
	cancel := context.AfterFunc(ctx, func() { s.stop.Store(true) })
	defer cancel()
	if err := s.run(); err != nil {
		return nil, s.stats(), err
	}
	if err := ctx.Err(); err != nil {
		return nil, s.stats(), err
	}
	high := low
	for _, y := range values {
		high = max(high, y)
	}
	out := s.f
	for v := range out {
		out[v] = min(max(low+float64(out[v]/scale), low), high)
	}
	for i, v := range fixed {
		out[v] = values[i]
	}
	return out, s.stats(), nil
}

// normalise gives the least value and the power of two that brings the range of the values into [1/2, 1), so that
// the arithmetic is the same bits for values times a power of two.
func normalise(values []float64) (low, scale float64) {
	low, high := math.Inf(1), math.Inf(-1)
	for _, y := range values {
		low, high = min(low, y), max(high, y)
	}
	_, e := math.Frexp(high - low)
	return low, math.Ldexp(1, -min(max(e, -1000), 1000))
}

func validate(g *sparse.CSR, fixed []int32, values []float64) error {
	if len(fixed) != len(values) {
		return fmt.Errorf("%d fixed vertices with %d values", len(fixed), len(values))
	}
	if len(fixed) == 0 {
		return errors.New("no fixed vertex")
	}
	low, high := values[0], values[0]
	for i, v := range fixed {
		if v < 0 || int(v) >= g.N || (i > 0 && fixed[i-1] >= v) {
			return fmt.Errorf("fixed vertex %d (number %d) is out of range or out of order", v, i)
		}
		if y := values[i]; math.IsNaN(y) || math.IsInf(y, 0) {
			return fmt.Errorf("value %v of vertex %d is not finite", y, v)
		}
		low, high = min(low, values[i]), max(high, values[i])
	}
	if math.IsInf(high-low, 0) {
		return fmt.Errorf("the range of the values, %v to %v, overflows", low, high)
	}
	for i := range g.N {
		_, vals := g.Row(i)
		for _, v := range vals {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return fmt.Errorf("an edge of vertex %d has ln w = %v", i, v)
			}
		}
	}
	return nil
}
