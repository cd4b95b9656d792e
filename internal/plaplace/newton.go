package plaplace

import (
	"context"
	"math"

	"pinfill/internal/parallel"
)

// work holds the vectors of Newton's method, one set a solve.
type work struct {
	d, dx  []float64 // differences of the point and of the step, by edge
	lc     []float64 // ln of the Hessian weight, by edge
	rowMax []float64 // largest lc at each vertex
	b, x   []float64 // right-hand side, scaled as engine says, and step
	upset  [][]int32 // vertices far out of balance, by chunk of rows
}

func (s *Solver) newWork() *work {
	m := len(s.ea)
	return &work{
		d: make([]float64, m), dx: make([]float64, m), lc: make([]float64, m),
		rowMax: make([]float64, s.n), b: make([]float64, s.n), x: make([]float64, s.n),
		upset: make([][]int32, (s.n+rowChunk-1)/rowChunk),
	}
}

// tiny keeps the logarithm of a zero difference finite: 1e-150 squared.
const tiny = 1e-300

// lnSize is ln sqrt(d^2 + eps2).
func lnSize(d, eps2 float64) float64 { return 0.5 * math.Log(float64(d*d)+(eps2+tiny)) }

// linearise sets lc to the logarithms of the second derivatives of the energy smoothed by eps,
// (1/p) sum w^p (d^2 + eps^2)^(p/2), at the differences w.d, and b to minus the net flux over the largest of a row:
//
//	H_e = w^p (d^2+eps^2)^((p-2)/2) (1 + (p-2) d^2/(d^2+eps^2)),  phi_e = w^p (d^2+eps^2)^((p-2)/2) d.
//
// Weights below pad times both rows' largest are raised to it, so that the system stays definite where steps vanish
// (p > 2); the padding follows Adil, Peng and Sachdeva (NeurIPS 2019) but is relative to the row. It returns the
// largest |net flux| / sum |flux|.
func (s *Solver) linearise(w *work, p, eps, pad float64) (imbalance float64) {
	eps2 := eps * eps
	logPad := math.Log(pad)
	if p < 2 {
		logPad = math.Inf(-1) // weights grow where steps vanish
	}
	parallel.For(s.workers, len(s.ea), edgeChunk, func(lo, hi int) {
		for e := lo; e < hi; e++ {
			w.lc[e] = float64(p*s.ea[e]) + float64((p-2)*lnSize(w.d[e], eps2))
		}
	})
	g := s.graph
	parallel.For(s.workers, s.n, rowChunk, func(lo, hi int) {
		for v := lo; v < hi; v++ {
			m := math.Inf(-1)
			for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
				if e := s.slot[k]; e >= 0 {
					m = max(m, w.lc[e])
				}
			}
			w.rowMax[v] = m
		}
	})
	imbalance = parallel.Max(s.workers, s.n, rowChunk, func(lo, hi int) float64 {
		var worst float64
		upset := w.upset[lo/rowChunk][:0]
		defer func() { w.upset[lo/rowChunk] = upset }()
		for v := lo; v < hi; v++ {
			w.b[v] = 0
			if s.isFixed[v] {
				continue
			}
			var net, sum float64
			for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
				e := s.slot[k]
				phi := math.Exp(w.lc[e]-w.rowMax[v]) * w.d[e]
				if s.eu[e] != int32(v) {
					phi = -phi
				}
				net += phi
				sum += math.Abs(phi)
			}
			w.b[v] = -net
			if sum > 0 {
				worst = max(worst, math.Abs(net)/sum)
				if math.Abs(net) > 0.3*sum {
					upset = append(upset, int32(v))
				}
			}
		}
		return worst
	})
	// From flux over difference to second derivative. p > 2 without smoothing: the factor p-1 everywhere.
	parallel.For(s.workers, len(s.ea), edgeChunk, func(lo, hi int) {
		for e := lo; e < hi; e++ {
			d2 := float64(w.d[e] * w.d[e])
			floor := min(w.rowMax[s.eu[e]], w.rowMax[s.ev[e]]) + logPad
			w.lc[e] = max(w.lc[e], floor) + math.Log1p((p-2)*d2/(d2+(eps2+tiny)))
		}
	})
	return imbalance
}

// step finds t > 0 where the smoothed energy along d + t dx is least: its derivative in t,
// sum w^p (D^2+eps^2)^((p-2)/2) D dx at D = d + t dx, rises through 0 there. Newton's own step is t = 1, taken as it
// is where the derivative has fallen to a tenth.
func (s *Solver) step(w *work, p, eps float64) float64 {
	if p == 2 {
		return 1
	}
	eps2 := eps * eps
	top := parallel.Max(s.workers, len(s.ea), edgeChunk, func(lo, hi int) float64 {
		m := math.Inf(-1)
		for e := lo; e < hi; e++ {
			m = max(m, s.ea[e]+lnSize(w.d[e], eps2))
		}
		return m
	})
	slope := func(t float64) float64 {
		return parallel.Sum(s.workers, len(s.ea), edgeChunk, func(lo, hi int) float64 {
			var sum float64
			for e := lo; e < hi; e++ {
				d := w.d[e] + float64(t*w.dx[e])
				l := min(float64(p*(s.ea[e]-top))+float64((p-2)*lnSize(d, eps2))+2*top, 600)
				sum += float64(math.Exp(l) * d * w.dx[e])
			}
			return sum
		})
	}
	g0 := slope(0)
	if !(g0 < 0) {
		return 1 // rounding has the word: Newton's step is as good as any
	}
	g1 := slope(1)
	if math.Abs(g1) <= 0.1*math.Abs(g0) {
		return 1
	}
	lo, hi, glo, ghi := 0.0, 1.0, g0, g1
	for ghi < 0 {
		if hi > 1e6 {
			return hi
		}
		lo, glo = hi, ghi
		hi *= 2
		ghi = slope(hi)
	}
	// Illinois false position, then bisection where it stalls.
	t := hi
	for k := range 60 {
		if k%3 == 2 || math.IsInf(ghi, 0) {
			t = 0.5 * (lo + hi)
		} else {
			t = lo + float64((hi-lo)*(glo/(glo-ghi)))
		}
		g := slope(t)
		if math.Abs(g) <= 0.1*math.Abs(g0) && k >= 1 || hi-lo < 1e-6*hi {
			break
		}
		if g < 0 {
			lo, glo = t, g
			ghi *= 0.5
		} else {
			hi, ghi = t, g
			glo *= 0.5
		}
	}
	return t
}

// iterate takes Newton steps at exponent p until the largest step is below stop or limit steps are done. With
// correct, steps go to x.h.
func (s *Solver) iterate(ctx context.Context, x point, w *work, p, eps, pad, stop, tolerance float64, limit int, correct bool) (last float64, err error) {
	for range limit {
		s.differences(x, w.d)
		s.linearise(w, p, eps, pad)
		if p == s.p && p > 4 {
			var queue []int32
			for _, u := range w.upset {
				queue = append(queue, u...)
			}
			if len(queue) > 0 && len(queue) < 10+s.n/20 {
				s.relax(x, queue, 20*len(queue))
				s.differences(x, w.d)
				s.linearise(w, p, eps, pad)
			}
		}
		if err := s.engine.solve(ctx, w.lc, w.rowMax, w.b, w.x, tolerance); err != nil {
			return last, err
		}
		s.counts.Newton++
		parallel.For(s.workers, len(s.ea), edgeChunk, func(lo, hi int) { // for the line search
			for e := lo; e < hi; e++ {
				w.dx[e] = w.x[s.eu[e]] - w.x[s.ev[e]]
			}
		})
		t := s.step(w, p, eps)
		target := x.f
		if correct {
			target = x.h
		}
		last = t * parallel.Max(s.workers, s.n, rowChunk, func(lo, hi int) float64 {
			var m float64
			for v := lo; v < hi; v++ {
				if s.isFixed[v] {
					continue
				}
				m = max(m, math.Abs(w.x[v]))
				target[v] += float64(t * w.x[v])
				if !correct {
					target[v] = min(max(target[v], 0), 1)
				}
			}
			return m
		})
		if last <= stop {
			break
		}
	}
	return last, nil
}
