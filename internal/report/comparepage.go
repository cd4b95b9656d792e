package report

import (
	"fmt"
	"math"
	"slices"
)

// comparePage is a Comparison with all that its template writes.
type comparePage struct {
	*Comparison
	Sorted []Trial // in the order of the comparison, the advised one marked
	Facts  []fact
	Errors *drawing
	Matrix *drawing
	Maps   []*drawing
	Drawn  string
	Legend []legend
}

// mostMaps is how many small maps a comparison draws.
const mostMaps = 12

func newComparePage(c *Comparison) *comparePage {
	p := &comparePage{Comparison: c}
	trials := slices.Clone(c.Trials)
	for i := range trials {
		trials[i].Advised = i == c.Advised
	}
	p.Sorted = trials
	p.Errors = errorPlot(trials, c.Task, math.NaN())
	p.Matrix = matrixPlot(c.Trials, c.Agreement, c.Advised)
	p.small()
	best := c.Trials[c.Advised]
	p.Facts = append(p.Facts, fact{"Which setting?", "p = " + power(best.P), series(best)})
	e := fact{"How good?", figure(best.Error) + " off", "root mean square error on labels left out, give or take " + figure(best.StdError)}
	if c.Task == Classes {
		e = fact{"How good?", percent(best.Error) + " wrong", "of labels left out, give or take " + percent(best.StdError)}
	}
	p.Facts = append(p.Facts, e)
	within := 0
	for i, t := range c.Trials {
		if i != c.Advised && math.Abs(t.Error-best.Error) <= math.Hypot(zeroNaN(t.StdError), zeroNaN(best.StdError)) {
			within++
		}
	}
	p.Facts = append(p.Facts, fact{"How clear?", fmt.Sprintf("%d of %d others level", within, len(c.Trials)-1), "their error is within the noise of the advised one's"})
	lo, hi := math.Inf(1), math.Inf(-1)
	for i, row := range c.Agreement {
		if a := row[c.Advised]; i != c.Advised && finite(a) {
			lo, hi = min(lo, a), max(hi, a)
		}
	}
	if lo <= hi {
		p.Facts = append(p.Facts, fact{"Does it matter?", percent(lo) + " to " + percent(hi), "agreement of the others with the advised setting"})
	}
	return p
}

// small draws the map of each setting; where there are many, of the first at each p.
func (p *comparePage) small() {
	m := p.Map
	if m == nil || len(m.X) == 0 {
		return
	}
	place := newPlace(m, 240)
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, v := range p.Values {
		for _, x := range v {
			if finite(x) {
				lo, hi = min(lo, x), max(hi, x)
			}
		}
	}
	if !(hi > lo) {
		lo, hi = 0, 1
	}
	seen := []float64{}
	all := len(p.Trials) <= mostMaps
	for i, t := range p.Trials {
		if len(p.Maps) == mostMaps || !all && slices.Contains(seen, t.P) {
			continue
		}
		seen = append(seen, t.P)
		title := "p = " + power(t.P)
		if !onlyP(p.Trials) {
			title = fmt.Sprintf("%d: p = %s", i+1, power(t.P))
		}
		if i == p.Advised {
			title += ", advised"
		}
		d := place.panel(fmt.Sprintf("small-%d", i+1), title)
		if p.Task == Classes {
			place.classesPanel(d, p.Classes[i], p.Names, false)
		} else {
			place.valuesPanel(d, p.Values[i], lo, hi)
		}
		d.Desc = "The answers with " + series(t) + "."
		p.Maps = append(p.Maps, d)
	}
	if p.Task == Classes {
		p.Legend = classLegend(p.Names)
	} else {
		p.Legend = rampLegend("f", lo, hi, ramp, figure)
	}
	p.Drawn = drawnText(m)
}
