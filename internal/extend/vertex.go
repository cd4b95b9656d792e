package extend

import "math"

// Vertex finds the value that one new vertex takes beside neighbours whose values stay as they are: the minimiser of
//
//	sum_j (w_j |t - f_j|)^p                       (1 < p < inf)
//	max_j  w_j |t - f_j|, then the next largest    (p = inf)
//
// logW holds ln w_j, finite; f holds f_j; both have the same length, at least 1. p = 2 is the mean with weights w^2;
// p = inf is the point that splits the steepest pair of neighbours, (f_i w_i + f_j w_j)/(w_i + w_j), found over all
// pairs in O(k^2). For other p the sum's derivative has one root between the least and the largest f_j.
func Vertex(logW, f []float64, p float64) float64 {
	lo, hi := f[0], f[0]
	for _, v := range f[1:] {
		lo, hi = min(lo, v), max(hi, v)
	}
	if lo == hi {
		return lo
	}
	top := logW[0]
	for _, v := range logW[1:] {
		top = max(top, v)
	}
	switch {
	case p == 2:
		return mean(logW, f, top, lo)
	case math.IsInf(p, 1):
		return midrange(logW, f, top)
	}
	return root(logW, f, p, top, lo, hi)
}

// mean is the mean of f with weights w^2, taken of differences from lo so that an offset costs no digits.
func mean(logW, f []float64, top, lo float64) float64 {
	var sum, weight float64
	for j, v := range f {
		c := math.Exp(2 * (logW[j] - top))
		sum += float64(c * (v - lo))
		weight += c
	}
	return lo + sum/weight
}

// midrange splits the steepest pair. With lengths l = 1/w the slope between i and j is (f_j - f_i)/(l_i + l_j).
func midrange(logW, f []float64, top float64) float64 {
	var space [32]float64
	w := space[:0]
	for _, l := range logW {
		w = append(w, math.Exp(l-top))
	}
	best, value := 0.0, f[0]
	for i := range f {
		for j := range f {
			rise := f[j] - f[i]
			if rise <= 0 {
				continue
			}
			wi, wj := w[i], w[j]
			if wi == 0 || wj == 0 {
				continue // beyond the range of float64 beside the nearest neighbour: an infinite length
			}
			if s := rise / (1/wi + 1/wj); s > best {
				best, value = s, f[i]+float64(rise*(wj/(wi+wj)))
			}
		}
	}
	return value
}

// root solves the stationarity condition in root form. With r = p-1 and a_j = w_j^(p/r) it is
//
//	h(t) = |(a_j (t-f_j)+)|_r - |(a_j (f_j-t)+)|_r = 0,
//
// where |.|_r is the r-norm. h rises with t and is close to a line even for large p, so that Newton's steps, kept
// inside the bracket, need few evaluations. t is counted in u = (t-lo)/(hi-lo), which loses no digits near lo.
func root(logW, f []float64, p, top, lo, hi float64) float64 {
	var space [2 * 32]float64
	k := len(f)
	g, c := space[:32], space[32:]
	if k > 32 {
		g, c = make([]float64, k), make([]float64, k)
	}
	g, c = g[:k], c[:k]
	var start, weight float64
	for j, v := range f {
		g[j] = (v - lo) / (hi - lo)
		c[j] = math.Exp(p * (logW[j] - top)) // (w_j / w_top)^p
		start += float64(c[j] * g[j])
		weight += c[j]
	}
	s := star{logW: logW, top: top, p: p, r: p - 1, g: g, c: c}
	return lo + float64((hi-lo)*s.solve(start/weight))
}

// star is a vertex with neighbours at g, from 0 to 1, both ends taken.
type star struct {
	logW, g, c []float64
	top, p, r  float64
}

// side is what one side pulls: the logarithm of its r-norm, and the slope of that logarithm in u.
type side struct{ log, slope float64 }

// solve finds the root in (0, 1), from a first guess.
func (s *star) solve(u float64) float64 {
	lo, hi := 0.0, 1.0
	if !(u > lo && u < hi) {
		u = 0.5
	}
	// Newton takes 3 to 6 steps. Every third after the first eight is a bisection, and 60 of these end any search.
	const steady, most = 8, 8 + 3*60
	for step := range most {
		below, above, near, ok := s.pull(u)
		if !ok {
			below, above = s.pullLog(u, 1), s.pullLog(u, -1)
		}
		// h and its slope, both over the larger norm, so that no r overflows.
		m := max(below.log, above.log)
		a, b := math.Exp(below.log-m), math.Exp(above.log-m)
		h := a - b
		switch {
		case h == 0:
			return u
		case h > 0:
			hi = u
		default:
			lo = u
		}
		next := u - h/(float64(a*below.slope)+float64(b*above.slope))
		if !(next > lo && next < hi) || step >= steady && step%3 == 0 {
			next = lo + float64((hi-lo)/2)
		} else if math.Abs(next-u) <= 1e-9*near {
			return next // Newton squares the error: what is left is below the last digit
		}
		const nothing = 0x1p-60 // of the range of the neighbours' values
		if next == u || next <= lo || next >= hi || hi < nothing {
			return u
		}
		u = next
	}
	return u
}

// pull gives both sides at u from plain powers, and the distance to the nearest neighbour's value. It is not ok where
// a side leaves the range of float64.
func (s *star) pull(u float64) (below, above side, near float64, ok bool) {
	var sb, db, sa, da float64
	near = 1
	for j, g := range s.g {
		switch d := u - g; {
		case d > 0:
			term := s.c[j] * power(d, s.r)
			sb += term
			db += term / d
			near = min(near, d)
		case d < 0:
			term := s.c[j] * power(-d, s.r)
			sa += term
			da += term / -d
			near = min(near, -d)
		}
	}
	const least = 1e-290 // smaller terms have lost digits
	if sb < least || sa < least {
		return below, above, near, false
	}
	return side{math.Log(sb) / s.r, db / sb}, side{math.Log(sa) / s.r, da / sa}, near, true
}

// power is d^r for d in (0, 1]; whole r up to 31 (p = 3, 4, 6, 8, 16, ...) by squaring, at a tenth of the cost.
func power(d, r float64) float64 {
	if r == 0.5 {
		return math.Sqrt(d)
	}
	n := uint(r)
	if float64(n) != r || n > 31 {
		return math.Exp(r * math.Log(d))
	}
	x := 1.0
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			x *= d
		}
		d *= d
	}
	return x
}

// pullLog is pull for one side in logarithms, for powers and weights beyond the range of float64.
func (s *star) pullLog(u, sign float64) side {
	big := math.Inf(-1)
	log := func(j int, d float64) float64 { return math.Log(d) + float64((s.logW[j]-s.top)*(s.p/s.r)) }
	for j, g := range s.g {
		if d := sign * (u - g); d > 0 {
			big = max(big, log(j, d))
		}
	}
	if math.IsInf(big, -1) {
		return side{log: big}
	}
	var sum, slope float64
	for j, g := range s.g {
		if d := sign * (u - g); d > 0 {
			term := math.Exp(s.r * (log(j, d) - big))
			sum += term
			slope += term / d
		}
	}
	return side{big + math.Log(sum)/s.r, slope / sum}
}
