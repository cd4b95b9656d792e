package testproblems

import "math"

// Enclose bounds the minimiser for finite p >= 2 on both sides: Gauss-Seidel sweeps, each vertex moved to the
// minimiser of its own terms, started from the least label (which is a subsolution) rise and never pass the answer;
// started from the greatest they fall. It ends when hi - lo <= tolerance * label range everywhere, or after maxSweeps. The
// comparison principle makes this a proof, to the rounding of one vertex's step (about 1e-15 of the range). Every
// component needs a label. Below p = 2 the sweeps stall.
func Enclose(pr Problem, tolerance float64, maxSweeps int) (lo, hi []float64, width float64) {
	held := pr.Hold()
	least, most := math.Inf(1), math.Inf(-1)
	for _, y := range pr.Values {
		least, most = min(least, y), max(most, y)
	}
	lo, hi = append([]float64(nil), held...), append([]float64(nil), held...)
	for v, y := range held {
		if math.IsNaN(y) {
			lo[v], hi[v] = least, most
		}
	}
	for range maxSweeps {
		width = 0
		for v, y := range held {
			if math.IsNaN(y) {
				lo[v] = max(lo[v], NodeMinimum(pr, lo, v))
				hi[v] = min(hi[v], NodeMinimum(pr, hi, v))
				width = max(width, (hi[v]-lo[v])/pr.Range())
			}
		}
		if width <= tolerance {
			break
		}
		reverseSweep(pr, held, lo, hi)
	}
	return lo, hi, width
}

// reverseSweep passes once over the vertices from last to first: on chains information then travels both ways.
func reverseSweep(pr Problem, held, lo, hi []float64) {
	for v := len(held) - 1; v >= 0; v-- {
		if math.IsNaN(held[v]) {
			lo[v] = max(lo[v], NodeMinimum(pr, lo, v))
			hi[v] = min(hi[v], NodeMinimum(pr, hi, v))
		}
	}
}

// NodeMinimum is argmin over t of sum_j (w_j |t - f_j|)^p over the neighbours j of v: for p = inf the value that
// balances the steepest slopes, otherwise the zero of the monotone derivative, by bisection sped up by false position
// (the Illinois rule) on its (p-1)-th root, which is piecewise nearly linear and neither over- nor underflows.
func NodeMinimum(pr Problem, f []float64, v int) float64 {
	cols, logw := pr.Graph.Row(v)
	a, b := math.Inf(1), math.Inf(-1)
	top := math.Inf(-1)
	for k, j := range cols {
		a, b = min(a, f[j]), max(b, f[j])
		top = max(top, logw[k])
	}
	w := make([]float64, len(cols))
	for k := range cols {
		w[k] = math.Exp(logw[k] - top)
	}
	g := func(t float64) float64 { return nodeForce(pr.P, cols, w, f, t) }
	ga, gb := g(a), g(b)
	for i := 0; i < 200 && ga != 0 && gb != 0; i++ {
		t := a - ga*(b-a)/(gb-ga)
		if i%3 == 2 || !(t > a && t < b) {
			t = a + (b-a)/2
		}
		if t <= a || t >= b {
			break // neighbouring floats
		}
		if gt := g(t); gt <= 0 {
			a, ga = t, gt
		} else {
			b, gb = t, gt
		}
	}
	if ga == 0 || -ga < gb {
		return a
	}
	return b
}

// nodeForce is sgn(S) |S|^(1/(p-1)), S = sum_j sgn(t-f_j) w_j (w_j |t-f_j|)^(p-1); for p = inf the steepest slope down
// minus the steepest up.
func nodeForce(p float64, cols []int32, w, f []float64, t float64) float64 {
	var m, up, down float64
	for k, j := range cols {
		u := w[k] * (t - f[j])
		down, up = max(down, u), max(up, -u)
	}
	m = max(up, down)
	if m == 0 || math.IsInf(p, 1) {
		return down - up
	}
	var s float64
	for k, j := range cols {
		u := w[k] * (t - f[j]) / m
		s += math.Copysign(w[k]*math.Pow(math.Abs(u), p-1), u)
	}
	return math.Copysign(m*math.Pow(math.Abs(s), 1/(p-1)), s)
}
