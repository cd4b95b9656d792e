package laplace

import (
	"math"

	"pinfill/internal/parallel"
)

// block is a set of width right-hand sides (1 or maxWidth) in lockstep, their vectors interleaved: entry i of
// right-hand side c stands at i*width+c. Each column goes through the operations it would go through alone.
type block struct {
	a                *sddm
	workers, width   int
	b, x, r, z, p, q []float64
	unit             scalars // scale of x against which corrections are judged; 0: max |x|
}

func newBlock(a *sddm, workers, width int) *block {
	v := func() []float64 { return make([]float64, a.n*width) }
	return &block{a: a, workers: workers, width: width, b: v(), x: v(), r: v(), z: v(), p: v(), q: v()}
}

// tileRows is the number of rows over which one vector after the other is worked on, so that they stay in the
// nearest cache.
const tileRows = 256

func tiles(lo, hi int, body func(lo, hi int)) {
	for ; lo < hi; lo += tileRows {
		body(lo, min(lo+tileRows, hi))
	}
}

// reduce adds part over the tiles of rows in order.
func (k *block) reduce(part func(lo, hi int, to *[2]scalars)) (sum scalars, largest scalars) {
	parts := make([][2]scalars, (k.a.n+sumChunk-1)/sumChunk)
	parallel.ForChunk(k.workers, k.a.n, sumChunk, func(_, n, lo, hi int) {
		to := &parts[n]
		tiles(lo, hi, func(lo, hi int) {
			var t [2]scalars
			part(lo, hi, &t)
			for c := range k.width {
				to[0][c] += t[0][c]
				to[1][c] = max(to[1][c], t[1][c])
			}
		})
	})
	for _, p := range parts {
		for c := range k.width {
			sum[c] += p[0][c]
			largest[c] = max(largest[c], p[1][c]) // a NaN stays
		}
	}
	return sum, largest
}

// norm2 is sum b_i^2 / A_ii.
func (k *block) norm2(b []float64) scalars {
	sum, _ := k.reduce(func(lo, hi int, to *[2]scalars) { k.measure(b, to, lo, hi) })
	return sum
}

// measure sets to[0] = sum r_i^2 / A_ii and to[1] = max |r_i| / A_ii.
func (k *block) measure(r []float64, to *[2]scalars, lo, hi int) {
	d := k.a.diag[lo:hi]
	for c := range k.width {
		var s, m float64
		at := lo*k.width + c
		for _, di := range d {
			t := r[at] / di
			s += float64(t * r[at])
			m = max(m, math.Abs(t))
			at += k.width
		}
		to[0][c], to[1][c] = s, m
	}
}

// residual sets r = b - A x and gives sum r_i^2 / A_ii and max |r_i| / A_ii.
func (k *block) residual() (rr, size scalars) {
	return k.reduce(func(lo, hi int, to *[2]scalars) {
		k.a.apply(k.width, k.x, k.r, lo, hi)
		for at := lo * k.width; at < hi*k.width; at++ {
			k.r[at] = k.b[at] - k.r[at]
		}
		k.measure(k.r, to, lo, hi)
	})
}

// multiply sets q = A p and gives p . q.
func (k *block) multiply() scalars {
	pq, _ := k.reduce(func(lo, hi int, to *[2]scalars) {
		k.a.apply(k.width, k.p, k.q, lo, hi)
		for c := range k.width {
			var s float64
			for at := lo*k.width + c; at < hi*k.width; at += k.width {
				s += float64(k.p[at] * k.q[at])
			}
			to[0][c] = s
		}
	})
	return pq
}

// direct sets p = z + beta p.
func (k *block) direct(beta *scalars) {
	parallel.For(k.workers, k.a.n, sumChunk, func(lo, hi int) {
		tiles(lo, hi, func(lo, hi int) {
			for c := range k.width {
				b := beta[c]
				for at := lo*k.width + c; at < hi*k.width; at += k.width {
					k.p[at] = k.z[at] + float64(b*k.p[at])
				}
			}
		})
	})
}

// advance sets x += alpha p, r -= alpha q and gives sum r_i^2 / A_ii and max |r_i| / A_ii.
func (k *block) advance(alpha *scalars) (rr, size scalars) {
	return k.reduce(func(lo, hi int, to *[2]scalars) {
		d := k.a.diag[lo:hi]
		for c := range k.width {
			var s, m float64
			a := alpha[c]
			at := lo*k.width + c
			for _, di := range d {
				k.x[at] += float64(a * k.p[at])
				r := k.r[at] - float64(a*k.q[at])
				k.r[at] = r
				t := r / di
				s += float64(t * r)
				m = max(m, math.Abs(t))
				at += k.width
			}
			to[0][c], to[1][c] = s, m
		}
	})
}

// scale is the size of x against which the corrections of column c are judged.
func (k *block) scale(c int) float64 {
	if k.unit[c] > 0 {
		return k.unit[c]
	}
	return parallel.Max(k.workers, k.a.n, sumChunk, func(lo, hi int) float64 {
		m := math.SmallestNonzeroFloat64
		for at := lo*k.width + c; at < hi*k.width; at += k.width {
			m = max(m, math.Abs(k.x[at]))
		}
		return m
	})
}

// inspect gives z . r, z . q and max |z| over rows lo..hi-1.
func (k *block) inspect(to *[3]scalars, lo, hi int) {
	for c := range k.width {
		var zr, zq, m float64
		for at := lo*k.width + c; at < hi*k.width; at += k.width {
			z := k.z[at]
			zr += float64(z * k.r[at])
			zq += float64(z * k.q[at])
			m = max(m, math.Abs(z))
		}
		to[0][c], to[1][c], to[2][c] = zr, zq, m
	}
}

// applied is what a preconditioner reports of z.
type applied struct{ zr, zq, largest scalars }

// total adds up what chunk leaves in z, tile by tile.
func (k *block) total(chunk func(lo, hi int)) (out applied) {
	parts := make([][3]scalars, (k.a.n+sumChunk-1)/sumChunk)
	parallel.ForChunk(k.workers, k.a.n, sumChunk, func(_, n, lo, hi int) {
		to := &parts[n]
		tiles(lo, hi, func(lo, hi int) {
			chunk(lo, hi)
			var t [3]scalars
			k.inspect(&t, lo, hi)
			for c := range k.width {
				to[0][c] += t[0][c]
				to[1][c] += t[1][c]
				to[2][c] = max(to[2][c], t[2][c])
			}
		})
	})
	for _, p := range parts {
		for c := range k.width {
			out.zr[c] += p[0][c]
			out.zq[c] += p[1][c]
			out.largest[c] = max(out.largest[c], p[2][c])
		}
	}
	return out
}
