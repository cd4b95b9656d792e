package plaplace

import (
	"math"

	"pinfill/internal/parallel"
)

// point is a vector f + h, kept as an unevaluated sum: f holds the values as float64 can, h a correction far smaller,
// so that differences along edges keep their digits where they are tiny beside the values (flat stretches, long
// chains). h may be nil for 0.
type point struct {
	f, h []float64
}

// diff is the difference f_u + h_u - f_v - h_v, with a relative error of at most about 3 units in the last place of
// the larger of itself and the difference of the corrections.
func (x point) diff(u, v int32) float64 {
	a, b := x.f[u], x.f[v]
	s := a - b
	if x.h == nil {
		return s
	}
	bb := s - a
	t := (a - (s - bb)) - (b + bb) // s + t = a - b exactly (Knuth's two-sum)
	return s + (t + (x.h[u] - x.h[v]))
}

// diffBound is diff with a bound on its absolute error.
func (x point) diffBound(u, v int32) (d, bound float64) {
	const unit = 0x1p-53
	a, b := x.f[u], x.f[v]
	s := a - b
	bb := s - a
	t := (a - (s - bb)) - (b + bb)
	var dh float64
	if x.h != nil {
		dh = x.h[u] - x.h[v]
	}
	c := t + dh
	d = s + c
	if t == 0 && dh == 0 {
		return d, 0
	}
	return d, 1.01 * unit * (math.Abs(dh) + math.Abs(c) + math.Abs(d))
}

// differences fills d with diff along every edge.
func (s *Solver) differences(x point, d []float64) {
	parallel.For(s.workers, len(d), edgeChunk, func(lo, hi int) {
		for e := lo; e < hi; e++ {
			d[e] = x.diff(s.eu[e], s.ev[e])
		}
	})
}

// sum is the value of the point at v, rounded once.
func (x point) sum(v int) float64 {
	if x.h == nil {
		return x.f[v]
	}
	return x.f[v] + x.h[v]
}

// move adds t to the value at v: to h if there is one, else to f, within [0, 1].
func (x point) move(v int32, t float64) {
	if x.h != nil {
		x.h[v] += t
	} else {
		x.f[v] = min(max(x.f[v]+t, 0), 1)
	}
}
