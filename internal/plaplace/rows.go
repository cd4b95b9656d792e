package plaplace

import (
	"math"

	"pinfill/internal/parallel"
)

// unit is the unit round-off of float64.
const unit = 0x1p-53

// row is the net flux at a vertex with everything counted, over the largest flux of the row.
type row struct {
	net  float64 // sum_j phi_ij
	sum  float64 // sum_j |phi_ij|, at least 1 unless all differences are 0
	err  float64 // bound on the rounding error of net
	curv float64 // sum_j d phi_ij / d f_i, over the same scale
	step float64 // largest |difference|
	top  float64 // ln of the largest flux, the unit of net, sum, err and curv
}

// rowAt gives the net flux of the point at vertex v, with a bound on everything that rounding can have done to it.
// The point itself is taken as exact. The graph's ln w is taken as exact; math.Log and math.Exp are taken to be
// within 1 unit in the last place (their documented error is below that).
//
// A flux is exp(p a + (p-1) ln|d|). Its exponent carries the error of each product and of the logarithm, its d the
// error that diffBound gives; where d is lost in its own error, the whole flux counts as error.
func (s *Solver) rowAt(x point, v int) row {
	if s.conductance != nil {
		return s.linearRowAt(x, v)
	}
	g := s.graph
	top := math.Inf(-1)
	var r row
	for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
		if d, bound := x.diffBound(int32(v), g.Col[k]); d != 0 || bound != 0 {
			top = max(top, float64(s.p*g.Val[k])+float64((s.p-1)*math.Log(math.Abs(d)+bound)))
			r.step = max(r.step, math.Abs(d))
		}
	}
	if math.IsInf(top, -1) {
		return r
	}
	r.top = top
	terms := 0.0
	for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
		d, bound := x.diffBound(int32(v), g.Col[k])
		if d == 0 && bound == 0 {
			continue
		}
		terms++
		size := math.Abs(d)
		pa := float64(s.p * g.Val[k])
		if bound > 0.25*size || bound*(s.p-1) > 0.25*size {
			// The sign or size of this difference is uncertain: count the most it can be, either way.
			worst := math.Exp(pa + float64((s.p-1)*math.Log(size+bound)) - top)
			r.err += 2.1 * worst
			if d > 0 {
				r.net += worst
			} else {
				r.net -= worst
			}
			r.sum += worst
			continue
		}
		ln := math.Log(size)
		pl := float64((s.p - 1) * ln)
		phi := math.Exp(pa + pl - top)
		inExponent := unit * (float64(2*math.Abs(pa)) + float64(5*math.Abs(pl)) + float64(2*math.Abs(top)) + s.p)
		r.err += float64(phi * (float64(1.4*inExponent) + float64(1.4*(s.p-1)*bound/size) + 4*unit))
		r.sum += phi
		r.curv += (s.p - 1) * phi / size
		if d > 0 {
			r.net += phi
		} else {
			r.net -= phi
		}
	}
	r.err += 1.1 * unit * terms * r.sum
	return r
}

// linearRowAt is rowAt for p = 2: a flux is conductance times difference, and no power need be taken. The unit is 1.
func (s *Solver) linearRowAt(x point, v int) row {
	g := s.graph
	var r row
	lo, hi := g.RowPtr[v], g.RowPtr[v+1]
	for k := lo; k < hi; k++ {
		d, bound := x.diffBound(int32(v), g.Col[k])
		c := s.conductance[k]
		phi := float64(c * d)
		size := math.Abs(phi)
		r.net += phi
		r.sum += size
		r.err += float64(size*s.conductanceError) + float64(c*bound)
		r.curv += c
		r.step = max(r.step, math.Abs(d))
	}
	r.err = 1.01*r.err + 1.1*unit*float64(hi-lo+2)*r.sum
	return r
}

// layoutLinear keeps w^2 for p = 2, unless some weight is so small that it would vanish.
func (s *Solver) layoutLinear() {
	const smallest = -150 // e^-300 is far from the subnormal numbers
	g := s.graph
	for _, a := range g.Val {
		if a < smallest {
			return
		}
	}
	c := make([]float64, len(g.Val))
	parallel.For(s.workers, len(c), edgeChunk, func(lo, hi int) {
		for k := lo; k < hi; k++ {
			c[k] = math.Exp(2 * g.Val[k])
		}
	})
	s.conductance = c
	s.conductanceError = 4 * unit // 2 a is exact, the exponential is within 1 unit in the last place
}
