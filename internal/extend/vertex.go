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
	best, value := 0.0, f[0]
	for i := range f {
		for j := range f {
			rise := f[j] - f[i]
			if rise <= 0 {
				continue
			}
			wi, wj := math.Exp(logW[i]-top), math.Exp(logW[j]-top)
			if wi == 0 || wj == 0 {
				continue // beyond the range of float64 beside the nearest neighbour: an infinite length
			}
			if s := rise / (1/wi + 1/wj); s > best {
				best, value = s, f[i]+rise*(wj/(wi+wj))
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
// inside the bracket, need few evaluations; a step that leaves the bracket, or halves it too slowly, is a bisection.
func root(logW, f []float64, p, top, lo, hi float64) float64 {
	r := p - 1
	const maxSteps = 200 // bisection alone needs 53 or so; Newton takes 4 to 12
	t := lo + (hi-lo)/2
	width := hi - lo
	for range maxSteps {
		below, dBelow := side(logW, f, r, p, top, t, 1)
		above, dAbove := side(logW, f, r, p, top, t, -1)
		h := below - above
		switch {
		case h == 0:
			return t
		case h > 0:
			hi = t
		default:
			lo = t
		}
		next := t - h/(dBelow+dAbove)
		if !(next > lo && next < hi) || hi-lo > width/2 {
			next = lo + (hi-lo)/2
		}
		width = hi - lo
		if next == t || next <= lo || next >= hi {
			return t
		}
		if math.Abs(next-t) <= 0x1p-53*math.Abs(t) {
			return next
		}
		t = next
	}
	return t
}

// side is the r-norm of a_j (sign (t - f_j))+ and the size of its slope in t. Powers are taken of ratios to the
// largest term, so that no p overflows.
func side(logW, f []float64, r, p, top, t, sign float64) (norm, slope float64) {
	big := math.Inf(-1)
	for j, v := range f {
		if d := sign * (t - v); d > 0 {
			big = max(big, math.Log(d)+(logW[j]-top)*(p/r))
		}
	}
	if math.IsInf(big, -1) {
		return 0, 0
	}
	var s, ds float64
	for j, v := range f {
		d := sign * (t - v)
		if d <= 0 {
			continue
		}
		log := math.Log(d) + (logW[j]-top)*(p/r) - big
		term := math.Exp(r * log)
		s += term
		ds += term / d
	}
	norm = math.Exp(big + math.Log(s)/r)
	return norm, norm * ds / s
}
