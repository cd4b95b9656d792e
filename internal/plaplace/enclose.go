package plaplace

import (
	"context"
	"math"

	"pinfill/internal/parallel"
)

// An enclosure of the minimiser u: vectors f + lower <= u <= f + upper.
//
// A vector g that equals u at the fixed vertices (or lies below) and has F_i(g) <= 0 at every free vertex, a
// subsolution, lies below u everywhere: where g - u is largest, every difference g_i - g_j is at least
// u_i - u_j, so F_i(g) >= F_i(u) = 0, hence equality, and the largest value spreads along edges to a fixed vertex,
// where g - u <= 0. That g is below u needs no trust in how g was found, only the sign of each F_i(g), which
// rowAt gives with its rounding counted.
//
// Candidates are f + h -+ e psi, where psi solves J psi = 2 (|F| + rounding) + spread with the Hessian J at f + h; e is
// doubled until the signs hold. A few vertices where they do not are moved one by one, downwards for a
// subsolution, until they hold there and at their neighbours.
type enclosure struct {
	lower, upper []float64 // corrections to f
	width        float64   // largest upper - lower
}

// enclose tries to enclose the minimiser near the point x, whose h is not nil. It gives false where no candidate
// could be verified within the width allowed.
func (s *Solver) enclose(ctx context.Context, x point, w *work, allowed float64) (enclosure, bool, error) {
	s.differences(x, w.d)
	s.linearise(w, s.p, s.eps, rowPad)
	// The excess asked of each row: the imbalance there, its rounding, and a share that makes psi bend
	// downwards everywhere by more than the linear solver's own error.
	spread := parallel.Max(s.workers, s.n, rowChunk, func(lo, hi int) float64 {
		var m float64
		for v := lo; v < hi; v++ {
			if s.isFixed[v] {
				continue
			}
			r := s.rowAt(x, v)
			t := 0.0
			if r.sum > 0 {
				t = 2 * (math.Abs(r.net) + r.err) * math.Exp(r.top-w.rowMax[v])
			}
			w.b[v] = t
			m = max(m, t)
		}
		return m
	})
	if _, exact := s.engine.(*dense); !exact {
		spread = max(spread*spreadShare, 1e-18)
		for _, v := range s.free {
			w.b[v] += spread
		}
	}
	// What psi misses of its equation is within the share that spread adds, or is found below and repaired.
	tolerance := 1e-3
	if s.p == 2 {
		tolerance = 1e-2
	}
	psi := w.x
	if err := s.engine.solve(ctx, w.lc, w.rowMax, w.b, psi, tolerance); err != nil {
		return enclosure{}, false, err
	}
	var top float64
	for _, v := range s.free {
		psi[v] = math.Abs(psi[v])
		top = max(top, psi[v])
	}
	if !(top > 0) || math.IsInf(top, 0) {
		return enclosure{}, false, nil
	}
	c := enclosure{lower: make([]float64, s.n), upper: make([]float64, s.n)}
	okLow, okHigh := false, false
	for e := max(1, 1e-16/top); e*top <= allowed && !(okLow && okHigh); e *= 4 {
		if err := ctx.Err(); err != nil {
			return c, false, err
		}
		if !okLow {
			shift(c.lower, x.h, psi, -e)
			okLow = s.repair(point{x.f, c.lower}, -1, allowed)
		}
		if !okHigh {
			shift(c.upper, x.h, psi, e)
			okHigh = s.repair(point{x.f, c.upper}, 1, allowed)
		}
	}
	if !(okLow && okHigh) {
		return c, false, nil
	}
	for v := range s.n {
		c.width = max(c.width, c.upper[v]-c.lower[v])
	}
	return c, true, nil
}

func shift(out, h, psi []float64, e float64) {
	for v := range out {
		out[v] = h[v] + float64(e*psi[v])
	}
}

// holds says whether vertex v satisfies its sign: F <= 0 for side -1, F >= 0 for side 1, rounding counted.
func (s *Solver) holds(x point, v int, side float64) (bool, row) {
	r := s.rowAt(x, v)
	return side*r.net >= r.err, r
}

// repair checks the sign of every free vertex and moves those that fail in the direction of side until all hold. It
// gives false where more than a few steps a vertex would be needed, or a value left the allowed band.
func (s *Solver) repair(x point, side, allowed float64) bool {
	bad := make([][]int32, (s.n+rowChunk-1)/rowChunk)
	parallel.ForChunk(s.workers, s.n, rowChunk, func(_, chunk, lo, hi int) {
		for v := lo; v < hi; v++ {
			if s.isFixed[v] {
				continue
			}
			if ok, _ := s.holds(x, v, side); !ok {
				bad[chunk] = append(bad[chunk], int32(v))
			}
		}
	})
	var queue []int32
	for _, b := range bad {
		queue = append(queue, b...)
	}
	if len(queue) == 0 {
		return true
	}
	if len(queue) > 64+s.n/20 && s.n > denseLimit {
		return false
	}
	queued := make([]bool, s.n)
	for _, v := range queue {
		queued[v] = true
	}
	g := s.graph
	for budget := 2000 + 4*s.n; len(queue) > 0; budget-- {
		if budget == 0 {
			return false
		}
		v := queue[0]
		queue = queue[1:]
		queued[v] = false
		ok, r := s.holds(x, int(v), side)
		for k := 0; !ok; k++ {
			if k == 60 || !(r.curv > 0) && r.sum > 0 && k > 40 {
				return false
			}
			move := 1e-18 * math.Ldexp(1, k)
			if r.curv > 0 {
				move = max(move, 1.5*(r.err+math.Abs(r.net))/r.curv)
			}
			x.h[v] += side * move
			if math.Abs(x.h[v]) > allowed {
				return false
			}
			ok, r = s.holds(x, int(v), side)
		}
		for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
			u := g.Col[k]
			if s.isFixed[u] || queued[u] {
				continue
			}
			if ok, _ := s.holds(x, int(u), side); !ok {
				queue = append(queue, u)
				queued[u] = true
			}
		}
	}
	return true
}
