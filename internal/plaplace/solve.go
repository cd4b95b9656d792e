package plaplace

import (
	"context"
	"math"
)

const (
	rowPad      = 1e-10 // least conductance of a Newton system, over the largest of its row
	spreadShare = 1e-3
	loose       = 1e-2 // tolerance of the linear systems while far from the minimiser
	widest      = 1e-6 // no enclosure wider than this is looked for, a share of the range
)

// Guess is where Solve starts.
type Guess struct {
	Values    []float64 // one a vertex; nil for none
	Quadratic bool      // Values solve p = 2: p is still approached step by step. Otherwise it is not
}

// Solve finds the minimiser with the given values, in [0, 1], at the fixed vertices. tolerance is the width to be
// certified.
func (s *Solver) Solve(ctx context.Context, values []float64, guess Guess, tolerance float64) (Result, error) {
	s.counts, s.eps = Counts{}, 0
	f := make([]float64, s.n)
	if guess.Values != nil {
		copy(f, guess.Values)
		for v := range f {
			f[v] = min(max(f[v], 0), 1)
		}
	}
	for k, v := range s.fixed {
		f[v] = values[k]
	}
	w := s.newWork()
	x := point{f: f}
	if err := s.descend(ctx, x, w, guess); err != nil {
		return Result{Values: f, Counts: s.counts}, err
	}
	if s.options.Rough {
		for v := range f {
			f[v] = min(max(f[v], 0), 1)
		}
		nan := math.NaN()
		return Result{Values: f, Counts: s.counts, Certificate: Certificate{Gap: nan, Imbalance: nan, Width: nan}}, nil
	}
	return s.finish(ctx, f, w, tolerance)
}

// descend brings x near the minimiser: from the p = 2 solution towards p by factors of 1.5 (Burrus, Barreto and
// Selesnick 1994), or, for p < 2, by decreasing smoothing.
func (s *Solver) descend(ctx context.Context, x point, w *work, guess Guess) error {
	if guess.Values == nil || guess.Quadratic {
		if guess.Values == nil {
			if _, err := s.iterate(ctx, x, w, 2, 0, rowPad, 0, s.firstTolerance(), 1, false); err != nil {
				return err
			}
		}
		if s.p == 2 {
			return nil
		}
		for p := 1.5 * 2.0; p < s.p; p *= 1.5 {
			if _, err := s.iterate(ctx, x, w, p, 0, rowPad, 0.1, loose, 30, false); err != nil {
				return err
			}
		}
	}
	if s.p < 2 {
		for s.eps = 1e-2; s.eps > leastSmoothing; s.eps *= 1e-2 {
			if _, err := s.iterate(ctx, x, w, s.p, s.eps, rowPad, 10*s.eps, loose, 30, false); err != nil {
				return err
			}
		}
		s.eps = leastSmoothing
	}
	_, err := s.iterate(ctx, x, w, s.p, s.eps, rowPad, 1e-4, loose, 60, false)
	return err
}

// firstTolerance is that of the linear system for p = 2: the answer itself, or a first guess.
func (s *Solver) firstTolerance() float64 {
	switch {
	case s.p == 2 && s.options.Rough:
		return 1e-5
	case s.p == 2:
		return 1e-8
	}
	return 1e-3
}

// leastSmoothing is the eps, for p < 2, at which the answer is first certified.
const leastSmoothing = 1e-15

// finish polishes f in extended precision and certifies it. Where that misses the tolerance and the system is small,
// the nodal form gets a turn.
func (s *Solver) finish(ctx context.Context, f []float64, w *work, tolerance float64) (Result, error) {
	x := point{f: f, h: make([]float64, s.n)}
	allowed := max(widest, 100*tolerance)
	var c enclosure
	var cert Certificate
	var values []float64
	round := func() {
		values = make([]float64, s.n)
		for v := range f {
			values[v] = min(max(x.sum(v), 0), 1)
		}
		for _, v := range s.fixed {
			values[v] = f[v]
		}
	}
	attempt := func(improve func() error) error {
		if err := improve(); err != nil {
			return err
		}
		var ok bool
		var err error
		if c, ok, err = s.enclose(ctx, x, w, allowed); err == nil {
			round()
			cert = s.certificate(x, values, c, ok)
		}
		return err
	}
	polish := func() error { return s.polish(ctx, x, w, 12) }
	err := attempt(polish)
	missed := func() bool {
		return err == nil && !(cert.Width <= tolerance && cert.Gap <= min(tolerance, 1e-9))
	}
	for k := 0; k < 2 && missed(); k++ {
		err = attempt(func() error {
			_, err := s.iterate(ctx, x, w, s.p, s.eps, rowPad, 1e-14, 1e-6, 4, true)
			return err
		})
	}
	for ; missed() && s.p < 2 && s.eps > 1e-40; s.eps *= 1e-5 {
		err = attempt(polish)
	}
	if eng, small := s.engine.(*dense); small && s.p > 2 && missed() {
		err = attempt(func() error {
			round()
			copy(f, values)
			clear(x.h)
			if err := s.nodal(ctx, point{f: f}, w, eng, 60); err != nil {
				return err
			}
			return s.nodal(ctx, x, w, eng, 8)
		})
	}
	if err != nil {
		return Result{Values: f, Counts: s.counts}, err
	}
	return Result{Values: values, Certificate: cert, Counts: s.counts}, nil
}

// polish takes up to limit Newton steps that go to x.h, until one is so short that the next would be below rounding.
func (s *Solver) polish(ctx context.Context, x point, w *work, limit int) error {
	stop, tolerance := 1e-8, 1e-5
	if s.p == 2 {
		stop, tolerance = 1e-6, 1e-5 // linear: the product is what is left
	}
	_, err := s.iterate(ctx, x, w, s.p, s.eps, rowPad, stop, tolerance, limit, true)
	return err
}
