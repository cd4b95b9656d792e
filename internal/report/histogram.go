package report

import (
	"math"
	"slices"
)

// histogram counts values in equal bins.
type histogram struct {
	lo, step float64
	bins     []int
	total    int
	endless  int  // infinite values, which no bin holds
	whole    bool // whole numbers only
}

// binned counts the values that keep accepts in about want bins with round edges; NaN is left out. lo and hi, if
// hi > lo, fix the span.
func binned(values []float64, keep func(i int) bool, lo, hi float64, want int) histogram {
	fixed := hi > lo
	if !fixed {
		lo, hi = math.Inf(1), math.Inf(-1)
		for i, v := range values {
			if keep(i) && !math.IsNaN(v) && !math.IsInf(v, 0) {
				lo, hi = min(lo, v), max(hi, v)
			}
		}
		if !(hi > lo) { // one value, or none
			if math.IsInf(lo, 0) {
				lo = 0
			}
			w := max(math.Abs(lo)*.1, 1e-300, .5*min(1, math.Abs(lo)))
			if lo == 0 {
				w = .5
			}
			lo, hi = lo-w, lo+w
		}
	}
	step := niceStep(hi/float64(want) - lo/float64(want))
	if fixed {
		step = (hi - lo) / float64(want)
	} else {
		lo = math.Floor(lo/step) * step
	}
	h := histogram{lo: lo, step: step, bins: make([]int, 0, want+2)}
	n := max(1, int(math.Ceil((hi-lo)/step-1e-9)))
	h.bins = make([]int, min(n, 4*want))
	for i, v := range values {
		switch {
		case math.IsNaN(v) || !keep(i):
			continue
		case math.IsInf(v, 0):
			h.endless++
			continue
		}
		b := int((v - lo) / step)
		h.bins[min(max(b, 0), len(h.bins)-1)]++
		h.total++
	}
	return h
}

// draw makes bars of a histogram.
func (h histogram) draw(id, title, xName, yName string, xText func(float64) string) *frame {
	f := newFrame(id, title, 420, 250)
	f.x0, f.x1 = h.lo, h.lo+h.step*float64(len(h.bins))
	most := float64(max(1, slices.Max(h.bins)))
	step := niceStep(most / 4)
	f.y0, f.y1 = 0, math.Ceil(most/step)*step
	yTicks := niceTicks(0, f.y1, 4)
	whole := yTicks[:0]
	for _, v := range yTicks {
		if v == math.Trunc(v) {
			whole = append(whole, v)
		}
	}
	f.yAxis(whole, func(v float64) string { return compact(v) }, yName)
	for b, n := range h.bins {
		if n == 0 {
			continue
		}
		x, y := f.px(h.lo+h.step*float64(b)), f.py(float64(n))
		w := (f.right - f.left) / float64(len(h.bins))
		f.rect("bar", x+.5, min(y, f.bottom-1), w-1, max(f.bottom-y, 1))
	}
	xTicks := niceTicks(f.x0, f.x1, 5)
	if h.whole {
		xTicks = slices.DeleteFunc(xTicks, func(v float64) bool { return v != math.Trunc(v) })
	}
	f.xAxis(xTicks, xText, xName)
	return f
}

// compact writes a count for an axis.
func compact(v float64) string {
	switch {
	case v >= 1e6:
		return figure(v/1e6) + "M"
	case v >= 1e4:
		return figure(v/1e3) + "k"
	}
	return count(int(v))
}
