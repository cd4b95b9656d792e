package plaplace

import (
	"context"
	"math"
)

const (
	rowPad      = 1e-10 // least conductance of a Newton system, over the largest of its row
	spreadShare = 1e-3
	widest      = 1e-6 // no enclosure wider than this is looked for, a share of the range
)

// smoothing is the eps under which differences count as this size, p < 2 only.
func (s *Solver) smoothing() float64 {
	if s.p < 2 {
		return 1e-15
	}
	return 0
}

// Solve finds the minimiser with the given values, in [0, 1], at the fixed vertices. start is a guess, one value a
// vertex, or nil; with a guess p is not approached step by step. tolerance is the width to be certified.
func (s *Solver) Solve(ctx context.Context, values, start []float64, tolerance float64) (Result, error) {
	s.counts = Counts{}
	f := make([]float64, s.n)
	if start != nil {
		copy(f, start)
		for v := range f {
			f[v] = min(max(f[v], 0), 1)
		}
	}
	for k, v := range s.fixed {
		f[v] = values[k]
	}
	w := s.newWork()
	x := point{f: f}
	if err := s.descend(ctx, x, w, start != nil); err != nil {
		return Result{Values: f, Counts: s.counts}, err
	}
	return s.finish(ctx, f, w, tolerance)
}

// descend brings x near the minimiser: from the p = 2 solution towards p by factors of 1.5 (Burrus, Barreto and
// Selesnick 1994), or, for p < 2, by decreasing smoothing.
func (s *Solver) descend(ctx context.Context, x point, w *work, warm bool) error {
	if !warm {
		if _, err := s.iterate(ctx, x, w, 2, 0, rowPad, 0, 1e-6, 1, false); err != nil {
			return err
		}
		for p := 2.0; p < s.p; {
			p = min(s.p, 1.5*p)
			limit := 30
			if _, err := s.iterate(ctx, x, w, p, 0, rowPad, 1e-3, 1e-3, limit, false); err != nil {
				return err
			}
		}
	}
	if s.p < 2 {
		for eps := 0.1; eps > 1e-15; eps *= 0.1 {
			if _, err := s.iterate(ctx, x, w, s.p, eps, rowPad, max(eps*1e-2, 1e-13), 1e-4, 30, false); err != nil {
				return err
			}
		}
	}
	_, err := s.iterate(ctx, x, w, s.p, s.smoothing(), rowPad, 1e-9, 1e-4, 60, false)
	return err
}

// finish polishes f in extended precision and certifies it. Where that misses the tolerance and the system is small,
// the nodal form gets a turn.
func (s *Solver) finish(ctx context.Context, f []float64, w *work, tolerance float64) (Result, error) {
	x := point{f: f, h: make([]float64, s.n)}
	if err := s.polish(ctx, x, w, 6); err != nil {
		return Result{Values: f, Counts: s.counts}, err
	}
	c, ok, err := s.enclose(ctx, x, w, max(widest, 100*tolerance))
	if eng, small := s.engine.(*dense); small && s.p > 2 && err == nil && !(ok && c.width <= tolerance) {
		for v := range f {
			f[v] = min(max(x.sum(v), 0), 1)
		}
		clear(x.h)
		err = s.nodal(ctx, point{f: f}, w, eng, 60)
		if err == nil {
			err = s.nodal(ctx, x, w, eng, 8)
		}
		if err == nil {
			c, ok, err = s.enclose(ctx, x, w, max(widest, 100*tolerance))
		}
	}
	if err != nil {
		return Result{Values: f, Counts: s.counts}, err
	}
	res := Result{Values: make([]float64, s.n), Counts: s.counts}
	for v := range f {
		res.Values[v] = min(max(x.sum(v), 0), 1)
	}
	for _, v := range s.fixed {
		res.Values[v] = f[v]
	}
	res.Certificate = s.certificate(x, res.Values, c, ok)
	return res, nil
}

// polish takes up to limit Newton steps that go to x.h, until they no longer shrink.
func (s *Solver) polish(ctx context.Context, x point, w *work, limit int) error {
	last := math.Inf(1)
	for range limit {
		step, err := s.iterate(ctx, x, w, s.p, s.smoothing(), rowPad, 0, 1e-5, 1, true)
		if err != nil {
			return err
		}
		if step < 1e-15 || step > 0.5*last && step < 1e-10 {
			break
		}
		last = step
	}
	return nil
}
