package report

import (
	"fmt"
	"math"
)

// calibrationPlot sets confidence against the share that was right, with 90% Wilson (1927) intervals.
func calibrationPlot(bins []Bin) *drawing {
	f := newFrame("calibration", "Calibration: confidence against the share that was right", 420, 300)
	f.x0, f.x1, f.y0, f.y1 = 0, 1, 0, 1
	ticks := []float64{0, .25, .5, .75, 1}
	f.yAxis(ticks, percent, "share right")
	f.xAxis(ticks, percent, "confidence given to labels left out")
	f.line("ideal", f.px(0), f.py(0), f.px(1), f.py(1))
	desc := ""
	for _, b := range bins {
		lo, hi := wilson(b.Accuracy, float64(b.Count))
		x := f.px(b.Confidence)
		f.line("whisker", x, f.py(lo), x, f.py(hi))
		f.line("whisker", x-4, f.py(lo), x+4, f.py(lo))
		f.line("whisker", x-4, f.py(hi), x+4, f.py(hi))
		f.path("point", string(glyph(nil, 0, x, f.py(b.Accuracy), min(3+float64(math.Sqrt(float64(b.Count))/2), 9))))
		if x > f.right-50 {
			f.text("value", "end", x-10, f.py(lo)+4, "n="+count(b.Count))
		} else {
			f.text("value", "start", x+6, f.py(lo)+4, "n="+count(b.Count))
		}
		desc += fmt.Sprintf("%s at confidence %s, %s right. ", plural(b.Count, "label"), percent(b.Confidence), percent(b.Accuracy))
	}
	f.Desc = desc
	f.Caption = "On the dashed line, 80% confidence means right 8 times in 10. Points below it are too sure, points above it too modest. " +
		"Whiskers: what chance alone leaves open at 90%."
	return f.drawing
}

// wilson is the 90% score interval of a share s of n.
func wilson(s, n float64) (lo, hi float64) {
	const z = 1.6448536269514722 // normal quantile at 0.95
	if !(n > 0) {
		return 0, 1
	}
	mid := (s + z*z/(2*n)) / (1 + z*z/n)
	half := float64(z / (1 + z*z/n) * math.Sqrt(s*(1-s)/n+z*z/(4*n*n)))
	return max(mid-half, 0), min(mid+half, 1)
}

// leftOutPlot sets each given number against its answer without it.
func leftOutPlot(given, left []float64) *drawing {
	lo, hi, n := math.Inf(1), math.Inf(-1), 0
	for k := range given {
		if k < len(left) && finite(given[k]) && finite(left[k]) {
			lo, hi = min(lo, given[k], left[k]), max(hi, given[k], left[k])
			n++
		}
	}
	if n == 0 || !(hi > lo) {
		return nil
	}
	pad := (hi - lo) / 25
	f := newFrame("leftout", "Each given label against its answer without it", 420, 300)
	f.x0, f.x1, f.y0, f.y1 = lo-pad, hi+pad, lo-pad, hi+pad
	f.yAxis(niceTicks(f.y0, f.y1, 5), figure, "answer without the label")
	f.xAxis(niceTicks(f.x0, f.x1, 5), figure, "given label")
	f.line("ideal", f.px(f.x0), f.py(f.y0), f.px(f.x1), f.py(f.y1))
	var d []byte
	for _, k := range Sample(len(given), 2000, 1, nil) {
		if int(k) < len(left) && finite(given[k]) && finite(left[k]) {
			d = glyph(d, 0, f.px(given[k]), f.py(left[k]), 3.2)
		}
	}
	f.path("point", string(d))
	f.Desc = fmt.Sprintf("%s, given values from %s to %s.", plural(n, "label"), figure(lo), figure(hi))
	f.Caption = "On the dashed line an answer would have been exact. The distance from it is the error that the figures above sum up."
	return f.drawing
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
