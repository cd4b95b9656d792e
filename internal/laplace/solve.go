package laplace

import (
	"context"
	"fmt"
	"math"
)

// SolveDirichlet finds the potentials for each right-hand side: values[k] holds one value for each fixed vertex, x[k]
// one for each vertex, on entry a guess (zeros will do) and on return the answer, which is exact at fixed vertices
// and never leaves the range of values[k]. tol bounds both Stats.Residual and Stats.Correction, the latter as a share
// of half the range; a system that cannot reach it is solved as well as double precision allows and reported as not
// converged. The error says that the solve could not start or that ctx ended.
func (s *System) SolveDirichlet(ctx context.Context, values, x [][]float64, tol float64) (Stats, error) {
	if len(values) != len(x) {
		return Stats{}, fmt.Errorf("%d right-hand sides and %d answers", len(values), len(x))
	}
	jobs := make([]job, 0, len(x))
	for k := range x {
		if len(values[k]) != len(s.fixed) || len(x[k]) != s.N() {
			return Stats{}, fmt.Errorf("right-hand side %d: %d values for %d fixed vertices, %d places for %d vertices",
				k, len(values[k]), len(s.fixed), len(x[k]), s.N())
		}
		j, err := s.dirichlet(values[k], x[k])
		if err != nil {
			return Stats{}, fmt.Errorf("right-hand side %d: %w", k, err)
		}
		jobs = append(jobs, j)
	}
	return s.run(ctx, jobs, tol)
}

// SolvePoisson finds the potentials, zero at the fixed vertices, for injected currents: b[k] holds one a vertex
// (entries at fixed vertices are ignored), x[k] a guess on entry and the answer on return. tol is as for
// SolveDirichlet, the scale being max |x|.
func (s *System) SolvePoisson(ctx context.Context, b, x [][]float64, tol float64) (Stats, error) {
	if len(b) != len(x) {
		return Stats{}, fmt.Errorf("%d right-hand sides and %d answers", len(b), len(x))
	}
	jobs := make([]job, 0, len(x))
	for k := range x {
		if len(b[k]) != s.N() || len(x[k]) != s.N() {
			return Stats{}, fmt.Errorf("right-hand side %d: %d currents and %d places for %d vertices", k, len(b[k]), len(x[k]), s.N())
		}
		j, err := s.poisson(b[k], x[k])
		if err != nil {
			return Stats{}, fmt.Errorf("right-hand side %d: %w", k, err)
		}
		jobs = append(jobs, j)
	}
	return s.run(ctx, jobs, tol)
}

// job is one right-hand side in the scaled form in which it is solved: A t = b over the free vertices.
type job struct {
	load  func(b, t []float64) // the right-hand side and the scaled guess
	store func(t []float64)    // the answer, back in the caller's units
	unit  float64              // scale of t if known beforehand, else 0: max |t|
}

// dirichlet scales values to [-1, 1]: y = mid + half t.
func (s *System) dirichlet(values, x []float64) (job, error) {
	low, high := math.Inf(1), math.Inf(-1)
	for k, v := range values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return job{}, fmt.Errorf("value %d is not finite", k)
		}
		low, high = min(low, v), max(high, v)
	}
	mid, half := float64(low/2)+float64(high/2), float64(high/2)-float64(low/2)
	if len(values) == 0 {
		mid, half = 0, 0
	}
	load := func(b, t []float64) {
		if half == 0 {
			clear(b)
			clear(t)
			return
		}
		scaled := make([]float64, len(values))
		for k, v := range values {
			scaled[k] = (v - mid) / half
		}
		s.a.inject(scaled, b)
		for i, v := range s.free {
			t[i] = finite((x[v] - mid) / half)
		}
	}
	store := func(t []float64) {
		for i, v := range s.free {
			x[v] = min(max(mid+float64(half*t[i]), low), high)
		}
		for k, v := range s.fixed {
			x[v] = values[k]
		}
	}
	return job{load: load, store: store, unit: 1}, nil
}

// poisson scales the currents to largest 1.
func (s *System) poisson(b, x []float64) (job, error) {
	largest := 0.0
	for i, v := range s.free {
		if math.IsNaN(b[v]) || math.IsInf(b[v], 0) {
			return job{}, fmt.Errorf("the current at vertex %d is not finite", s.free[i])
		}
		largest = max(largest, math.Abs(b[v]))
	}
	load := func(rhs, t []float64) {
		if largest == 0 {
			clear(rhs)
			clear(t)
			return
		}
		for i, v := range s.free {
			rhs[i] = b[v] / largest
			t[i] = finite(x[v] / s.scale / largest)
		}
	}
	store := func(t []float64) {
		for i, v := range s.free {
			x[v] = float64(t[i]*s.scale) * largest
		}
		for _, v := range s.fixed {
			x[v] = 0
		}
	}
	return job{load: load, store: store}, nil
}

func finite(v float64) float64 {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return 0
	}
	return v
}
