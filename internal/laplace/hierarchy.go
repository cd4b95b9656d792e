package laplace

import (
	"math"

	"pinfill/internal/parallel"
)

const (
	coarsest     = 128 // vertices at which coarsening stops and the matrix is inverted
	largestLevel = 40  // levels at most
)

// hierarchy is an aggregation multigrid: plain (unsmoothed) aggregation with a K-cycle (Notay, Electron. Trans.
// Numer. Anal. 37, 2010; Napov and Notay, SIAM J. Sci. Comput. 34, 2012), damped Jacobi smoothing, single precision.
// One cycle is the preconditioner of the outer conjugate gradients.
type hierarchy struct {
	workers int
	levels  []*level
	inverse []float32 // A^-1 D of the coarsest level, row by row
	width   int       // right-hand sides for which work is allocated
}

func newHierarchy(fine *sddm, workers int) *hierarchy {
	h := &hierarchy{workers: workers}
	for a := fine; ; {
		l := newLevel(a, workers)
		h.levels = append(h.levels, l)
		if a.n <= coarsest || len(h.levels) == largestLevel {
			h.invert(a)
			return h
		}
		agg, count := aggregate(a, workers, aggregateRows)
		if count > a.n*8/10 && a.n > aggregateRows {
			agg, count = aggregate(a, workers, a.n)
		}
		if count > a.n*9/10 || count == 0 {
			h.invert(a)
			return h
		}
		l.agg, l.m = agg, gather(agg, count)
		a = coarsen(a, agg, l.m, workers)
		l.setShares(a, workers)
	}
}

// refill takes new conductances on the same aggregates.
func (h *hierarchy) refill(fine *sddm) {
	a := fine
	for k, l := range h.levels {
		l.set(a, h.workers)
		if k == len(h.levels)-1 {
			h.invert(a)
			return
		}
		a = coarsen(a, l.agg, l.m, h.workers)
		l.setShares(a, h.workers)
	}
}

// invert forms A^-1 D of the coarsest level, unless that is large: then two sweeps of Jacobi must do.
func (h *hierarchy) invert(a *sddm) {
	h.inverse = nil
	if a.n > 8*coarsest {
		return
	}
	inverse := denseInverse(a)
	h.inverse = make([]float32, len(inverse))
	for k, v := range inverse {
		h.inverse[k] = float32(math.Min(v, largestShare))
	}
}

// reserve allocates the work vectors for width right-hand sides.
func (h *hierarchy) reserve(width int) {
	if h.width >= width {
		return
	}
	h.width = width
	for k, l := range h.levels {
		for v := range l.work {
			if k == 0 && v > 2 {
				break // the finest level has no K-cycle of its own
			}
			l.work[v] = make([]float32, l.n*width)
		}
	}
}

func (h *hierarchy) method() Method { return Multigrid }

// slack: in trials the true error was .8 to 5.3 times max |z|; a factor of 4 is common practice's margin.
func (h *hierarchy) slack(*lanczos) float64 { return 4 }

func (h *hierarchy) patience() int { return 60 }

// apply sets z to one cycle for r. Each column is scaled to largest entry about 1 on the way to single precision.
func (h *hierarchy) apply(k *block, size *scalars) applied {
	h.reserve(k.width)
	l := h.levels[0]
	g, out := l.work[0], l.work[2]
	var up, down scalars
	for c := range k.width {
		up[c], down[c] = 1, 1
		if size[c] > 0 && size[c] <= math.MaxFloat64 {
			_, e := math.Frexp(size[c])
			e = max(min(e, 1000), -1000)
			up[c], down[c] = math.Ldexp(1, -e), math.Ldexp(1, e)
		}
	}
	parallel.For(h.workers, l.n, sumChunk, func(lo, hi int) {
		tiles(lo, hi, func(lo, hi int) {
			for c := range k.width {
				at := lo*k.width + c
				for _, d := range l.d[lo:hi] {
					g[at] = float32(k.r[at] / d * up[c])
					at += k.width
				}
			}
		})
	})
	h.cycle(0, k.width, g, out)
	return k.total(func(lo, hi int) {
		for c := range k.width {
			for at := lo*k.width + c; at < hi*k.width; at += k.width {
				k.z[at] = float64(out[at]) * down[c]
			}
		}
	})
}
