package plaplace

import (
	"context"
	"math"

	"pinfill/internal/parallel"
)

// certificate gives the figures for values, near the polished point x with its enclosure c.
//
// Gap: the flux of x, z_e = w^(p-1) |d|^(p-1) sign d, has divergence F_i at free i. For the minimiser u, with
// b = (values at fixed vertices), Hölder's inequality gives ||w D u||_p >= (z . w D u) / ||z||_q, and
// z . w D u = ||r(x)||_p^p - sum_i F_i (x_i - u_i) >= ||r||_p^p - sum_i |F_i| m_i with m_i >= |x_i - u_i|: the reach of
// the enclosure, or 1 without one because both lie in [0, 1]; and ||z||_q = ||r||_p^(p-1). So (primal - dual) / primal,
// to the power 1/p, is at most sum |F_i| m_i / ||r||_p^p.
func (s *Solver) certificate(x point, values []float64, c enclosure, ok bool) Certificate {
	cert := Certificate{Width: math.NaN()}
	if ok {
		cert.Width = 0
		for _, v := range s.free {
			// values - (f + lower) and (f + upper) - values, outward.
			t := values[v] - x.f[v]
			cert.Width = max(cert.Width, t-c.lower[v], c.upper[v]-t)
		}
		cert.Width = float64(cert.Width*(1+8*unit)) + 2*unit
	}
	reach := func(v int) float64 {
		if !ok {
			return 1
		}
		return min(1, max(math.Abs(x.h[v]-c.lower[v]), math.Abs(c.upper[v]-x.h[v])))
	}
	cert.Gap, cert.Imbalance = s.balance(x, reach)
	return cert
}

// Certify bounds the distance of values, one a vertex, from the minimiser for the values they have at the fixed
// vertices. It polishes a copy in extended precision, encloses the minimiser, and measures the given values against
// the enclosure; wrong values widen the result or leave it NaN.
func (s *Solver) Certify(ctx context.Context, values []float64, tolerance float64) (Certificate, error) {
	s.counts, s.eps = Counts{}, 0
	if s.p < 2 {
		s.eps = leastSmoothing
	}
	f := append([]float64(nil), values...)
	w := s.newWork()
	x := point{f: f, h: make([]float64, s.n)}
	for range 30 {
		step, err := s.iterate(ctx, x, w, s.p, s.eps, rowPad, 0, 1e-6, 1, true)
		if err != nil {
			return Certificate{}, err
		}
		if step < 1e-15 {
			break
		}
	}
	c, ok, err := s.enclose(ctx, x, w, 1)
	if err != nil {
		return Certificate{}, err
	}
	return s.certificate(x, values, c, ok), nil
}

// balance gives Certificate.Gap and Certificate.Imbalance of a point, no vertex of which is farther than reach from the
// minimiser. Fluxes are taken over those of the steepest edge, so that the powers neither overflow nor, where they
// matter, vanish.
func (s *Solver) balance(x point, reach func(v int) float64) (gap, imbalance float64) {
	slope := func(a, d float64) float64 { return a + math.Log(math.Abs(d)) }
	top := parallel.Max(s.workers, len(s.ea), edgeChunk, func(lo, hi int) float64 {
		m := math.Inf(-1)
		for e := lo; e < hi; e++ {
			m = max(m, slope(s.ea[e], x.diff(s.eu[e], s.ev[e])))
		}
		return m
	})
	energy := parallel.Sum(s.workers, len(s.ea), edgeChunk, func(lo, hi int) float64 {
		var t float64
		for e := lo; e < hi; e++ {
			t += math.Exp(s.p * (slope(s.ea[e], x.diff(s.eu[e], s.ev[e])) - top))
		}
		return t
	})
	worst := make([]float64, (s.n+rowChunk-1)/rowChunk)
	flow := make([]float64, len(worst))
	parallel.ForChunk(s.workers, s.n, rowChunk, func(_, chunk, lo, hi int) {
		for v := lo; v < hi; v++ {
			if s.isFixed[v] {
				continue
			}
			r := s.rowAt(x, v)
			if r.step > imbalanceFloor && r.sum > 0 {
				worst[chunk] = max(worst[chunk], math.Abs(r.net)/r.sum)
			}
			flow[chunk] += float64(math.Abs(r.net) * math.Exp(r.top-float64((s.p-1)*top)) * reach(v))
		}
	})
	var total float64
	for k := range flow {
		total += flow[k]
		imbalance = max(imbalance, worst[k])
	}
	return total / (math.Exp(top) * energy), imbalance
}

// imbalanceFloor is the step, as a share of the range, below which a vertex is flat and its imbalance is noise.
const imbalanceFloor = 1e-9
