package main

import (
	"bytes"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
)

func pText(p float64) string {
	if math.IsInf(p, 1) {
		return "inf"
	}
	return strconv.FormatFloat(p, 'g', -1, 64)
}

func repeat(s string, n int) string { return strings.Repeat(s, n) }

func meanOf(v []float64) float64 {
	var t float64
	for _, x := range v {
		t += x
	}
	return t / float64(len(v))
}

func medianOf(v []float64) float64 {
	s := slices.Clone(v)
	slices.Sort(s)
	return s[len(s)/2]
}

// line is one line of a picture: a value for each position, and a level for the rule.
type line struct {
	name   string
	values []float64
	rule   float64
}

var colours = []string{"#1b5e8a", "#b5521b", "#3c7d3c", "#7a3c8a"}

// draw is a plain line picture: positions along the bottom, the rule's level as a dashed line of the same colour.
func draw(title, axis string, positions []string, lines []line) []byte {
	const w, h, left, right, top, bottom = 640, 360, 60, 150, 36, 46
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, l := range lines {
		lo, hi = min(lo, slices.Min(l.values), l.rule), max(hi, slices.Max(l.values), l.rule)
	}
	pad := (hi - lo) * .06
	lo, hi = lo-pad, hi+pad
	x := func(i int) float64 {
		return left + float64(i)*float64(w-left-right)/float64(max(len(positions)-1, 1))
	}
	y := func(v float64) float64 { return top + (hi-v)/(hi-lo)*float64(h-top-bottom) }
	var b bytes.Buffer
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %d" font-family="sans-serif" font-size="12" role="img"><title>%s</title><rect width="%d" height="%d" fill="#fff"/>`+"\n", w, h, title, w, h)
	fmt.Fprintf(&b, `<text x="%d" y="20" font-size="14">%s</text><text x="%d" y="%d">%s</text>`+"\n", left, title, left, h-8, "p (dashed: the rule)")
	fmt.Fprintf(&b, `<text transform="translate(14 %d) rotate(-90)">%s</text>`+"\n", h-bottom, axis)
	for k := range 5 {
		v := lo + (hi-lo)*float64(k)/4
		fmt.Fprintf(&b, `<line x1="%d" x2="%d" y1="%.1f" y2="%.1f" stroke="#ddd"/><text x="%d" y="%.1f" text-anchor="end">%.3f</text>`+"\n", left, w-right, y(v), y(v), left-6, y(v)+4, v)
	}
	for i, p := range positions {
		fmt.Fprintf(&b, `<text x="%.1f" y="%d" text-anchor="middle">%s</text>`+"\n", x(i), h-bottom+18, p)
	}
	for k, l := range lines {
		c := colours[k%len(colours)]
		var pts []string
		for i, v := range l.values {
			pts = append(pts, fmt.Sprintf("%.1f,%.1f", x(i), y(v)))
		}
		fmt.Fprintf(&b, `<polyline fill="none" stroke="%s" stroke-width="2" points="%s"/>`+"\n", c, strings.Join(pts, " "))
		fmt.Fprintf(&b, `<line x1="%d" x2="%d" y1="%.1f" y2="%.1f" stroke="%s" stroke-dasharray="5 4"/>`+"\n", left, w-right, y(l.rule), y(l.rule), c)
		fmt.Fprintf(&b, `<text x="%d" y="%d" fill="%s">%s</text>`+"\n", w-right+10, top+14+18*k, c, l.name)
	}
	b.WriteString("</svg>\n")
	return b.Bytes()
}

func (st *classStudy) picture() []byte {
	var lines []line
	for _, rate := range rates {
		l := line{name: fmt.Sprintf("%d labels a class", rate), rule: st.over(rate, func(r *classRow) float64 { return r.mean(ruleOf) })}
		for k := range classPs {
			l.values = append(l.values, st.over(rate, func(r *classRow) float64 { return r.mean(func(d classDraw) float64 { return d.fixed[k] }) }))
		}
		lines = append(lines, l)
	}
	var positions []string
	for _, p := range classPs {
		positions = append(positions, pText(p))
	}
	return draw("Classes: mean accuracy by p", "accuracy", positions, lines)
}

func (st *numberStudy) picture() []byte {
	var lines []line
	for _, count := range counts {
		l := line{name: fmt.Sprintf("%d labels", count)}
		over := func(of func(numberDraw) float64) float64 {
			var v []float64
			for i := range st.rows {
				if st.rows[i].count == count {
					v = append(v, st.rows[i].mean(of))
				}
			}
			return meanOf(v)
		}
		l.rule = over(func(d numberDraw) float64 { return d.rule })
		for _, k := range byP {
			l.values = append(l.values, over(func(d numberDraw) float64 { return d.fixed[k] }))
		}
		lines = append(lines, l)
	}
	var positions []string
	for _, k := range byP {
		positions = append(positions, pText(numberPs[k]))
	}
	return draw("Numbers: mean RMSE over spread by p", "RMSE / spread", positions, lines)
}
