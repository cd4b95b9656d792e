package report

import (
	"fmt"
	"math"
	"slices"
	"strconv"
)

// Maps are drawn on a grid of quarter units, so that a point costs about seven bytes.
const fine = 4

// place is where the map's points fall on a panel.
type place struct {
	x, y       []int32 // in quarter units
	w, h       int     // of the panel, in units
	left, low  float64 // data at the left and lower edge
	perX, perY float64 // units a data unit
	n          int
}

// newPlace fits the map on a panel w units wide.
func newPlace(m *Map, w int) place {
	p := place{n: len(m.X), w: w, h: w}
	x0, x1 := span(m.X)
	y0, y1 := span(m.Y)
	dx, dy := x1-x0, y1-y0
	const pad = 8
	if m.Equal && dx > 0 && dy > 0 {
		p.h = int(math.Round(float64(w) * min(max(dy/dx, .45), 1.25)))
	}
	inX, inY := float64(w-2*pad), float64(p.h-2*pad)
	p.perX, p.perY = scaleOf(inX, dx), scaleOf(inY, dy)
	if m.Equal && dx > 0 && dy > 0 {
		p.perX = min(p.perX, p.perY)
		p.perY = p.perX
	}
	p.left = (x0+x1)/2 - float64(w)/2/p.perX
	p.low = (y0+y1)/2 - float64(p.h)/2/p.perY
	p.x, p.y = make([]int32, p.n), make([]int32, p.n)
	for i := range p.n {
		p.x[i] = int32(math.Round(fine * (m.X[i] - p.left) * p.perX))
		p.y[i] = int32(math.Round(fine * (float64(p.h) - (m.Y[i]-p.low)*p.perY)))
	}
	return p
}

func scaleOf(units, width float64) float64 {
	if s := units / width; finite(s) && s > 0 {
		return s
	}
	return 1
}

func span(v []float64) (lo, hi float64) {
	if len(v) == 0 {
		return 0, 0
	}
	return slices.Min(v), slices.Max(v)
}

// dots draws the points that take says as one path of round dots: a move from each to the next and a stroke of no
// length. Points that fall on one grid place are drawn once.
func (p place) dots(take func(i int) bool) string {
	var d []byte
	var px, py int32
	seen := map[[2]int32]bool{}
	for i := range p.n {
		if !take(i) {
			continue
		}
		at := [2]int32{p.x[i], p.y[i]}
		if seen[at] {
			continue
		}
		seen[at] = true
		d = append(d, 'm')
		d = strconv.AppendInt(d, int64(at[0]-px), 10)
		if at[1] >= py {
			d = append(d, ' ')
		}
		d = strconv.AppendInt(d, int64(at[1]-py), 10)
		d = append(d, "h0"...)
		px, py = at[0], at[1]
	}
	return string(d)
}

// shapes draws the points that take says as glyphs of radius r units.
func (p place) shapes(shape int, r float64, take func(i int) bool) string {
	var d []byte
	for i := range p.n {
		if take(i) {
			d = glyph(d, shape, float64(p.x[i]), float64(p.y[i]), fine*r)
		}
	}
	return string(d)
}

// panel starts a drawing of the map.
func (p place) panel(id, title string) *drawing {
	d := &drawing{ID: id, Title: title, W: p.w, H: p.h}
	d.rect("ground", 0, 0, float64(p.w), float64(p.h))
	return d
}

// add puts a path on a panel, unless it is empty.
func (p place) add(d *drawing, class, data string) {
	if data != "" {
		d.Marks = append(d.Marks, mark{Tag: "path", Class: class, D: data, Transform: "scale(.25)"})
	}
}

// shapely is the number of points up to which classes are drawn in their shapes.
const shapely = 2500

// dotClass is the size of dots: the more points, the smaller.
func (p place) dotClass() string {
	switch {
	case p.n > 8000:
		return "d1"
	case p.n > shapely:
		return "d2"
	}
	return "d3"
}

// classesPanel draws each class in its colour, in its shape where points are few, with its name at its middle.
func (p place) classesPanel(d *drawing, class []int32, names []string, tags bool) {
	for c := range names {
		take := func(i int) bool { return int(class[i]) == c }
		if p.n <= shapely {
			p.add(d, classStyle(c), p.shapes(classShape(c), 2.4, take))
		} else {
			p.add(d, "dot "+p.dotClass()+" s"+strconv.Itoa(c%colours), p.dots(take))
		}
	}
	p.add(d, "dot none "+p.dotClass(), p.dots(func(i int) bool { return class[i] < 0 }))
	if tags && len(names) <= 12 {
		p.tags(d, class, names)
	}
}

// tags writes each class's name where its points are thickest and others few, clear of the tags before it.
func (p place) tags(d *drawing, class []int32, names []string) {
	const side = 14 // of a cell, in units
	wide, high := p.w/side+1, p.h/side+1
	cells := make([][]int, len(names))
	for c := range cells {
		cells[c] = make([]int, wide*high)
	}
	for i, c := range class {
		if c >= 0 {
			cells[c][int(p.y[i])/fine/side*wide+int(p.x[i])/fine/side]++
		}
	}
	type box struct{ x, y, w float64 }
	var taken []box
	for c, name := range names {
		text := short(name, 18)
		half := float64(3.6 * float64(len([]rune(text))))
		best, at := 0, box{}
		for cell, n := range cells[c] {
			if n == 0 {
				continue
			}
			score := 0
			cx, cy := cell%wide, cell/wide
			for y := max(cy-1, 0); y <= min(cy+1, high-1); y++ {
				for x := max(cx-1, 0); x <= min(cx+1, wide-1); x++ {
					for other := range cells {
						if other == c {
							score += 2 * cells[other][y*wide+x]
						} else {
							score -= cells[other][y*wide+x]
						}
					}
				}
			}
			score += 1000 // a class among others still gets its name
			b := box{min(max(side*(float64(cx)+.5), half+3), float64(p.w)-half-3), float64(side * (float64(cy) + .5)), half}
			clear := !slices.ContainsFunc(taken, func(t box) bool { return math.Abs(t.x-b.x) < t.w+b.w+2 && math.Abs(t.y-b.y) < 14 })
			if clear && score > best {
				best, at = score, b
			}
		}
		if best > 0 {
			taken = append(taken, at)
			d.text("tag", "middle", at.x, at.y+4, text)
		}
	}
}

// ramp is the number of colours of numbers, doubtRamp that of doubt.
const (
	ramp      = 8
	doubtRamp = 5
)

// valuesPanel draws numbers in steps from lo to hi.
func (p place) valuesPanel(d *drawing, value []float64, lo, hi float64) {
	for s := range ramp {
		p.add(d, "dot "+p.dotClass()+" v"+strconv.Itoa(s), p.dots(func(i int) bool { return step(value[i], lo, hi, ramp) == s }))
	}
	p.add(d, "dot none "+p.dotClass(), p.dots(func(i int) bool { return math.IsNaN(value[i]) }))
}

// step is the step of a ramp, -1 for none.
func step(v, lo, hi float64, steps int) int {
	if math.IsNaN(v) {
		return -1
	}
	return min(int(float64(steps)*clamp01((v-lo)/(hi-lo))), steps-1)
}

// mapPanels draws the three panels: the labels given, the answers, the doubt.
func mapPanels(m *Map, task Task, names []string) []*drawing {
	if m == nil || len(m.X) == 0 {
		return nil
	}
	p := newPlace(m, 340)
	given := p.panel("map-given", "Labels given")
	p.add(given, "dot cloud "+p.dotClass(), p.dots(func(i int) bool { return !m.Given[i] }))
	answers := p.panel("map-answers", "Answers")
	if task == Classes {
		for c := range names {
			p.add(given, "rim "+classStyle(c), p.shapes(classShape(c), 4.2, func(i int) bool { return m.Given[i] && int(m.Class[i]) == c }))
		}
		p.classesPanel(answers, m.Class, names, true)
		answers.Legend = classLegend(names)
	} else {
		lo, hi := valueSpan(m.Value)
		for s := range ramp {
			p.add(given, "rim f"+strconv.Itoa(s), p.shapes(0, 4, func(i int) bool { return m.Given[i] && step(m.Value[i], lo, hi, ramp) == s }))
		}
		p.valuesPanel(answers, m.Value, lo, hi)
		answers.Legend = rampLegend("f", lo, hi, ramp, figure)
	}
	given.Desc = fmt.Sprintf("Where the given labels lie among the points, by %s and %s.", m.XName, m.YName)
	answers.Desc = "The label of each point drawn."
	return []*drawing{given, answers, p.doubtPanel(m, task)}
}

// doubtEdges part the doubt of classes: most answers of a good run are in the first steps. The last edge is one less
// unsureBelow.
var doubtEdges = [doubtRamp - 1]float64{.02, .1, .2, 1 - unsureBelow}

// doubtPanel draws the doubt in steps, the doubtful larger and over the sure.
func (p place) doubtPanel(m *Map, task Task) *drawing {
	d := p.panel("map-doubt", "Doubt")
	d.Desc = "How unsure the answer of each point is."
	lo, hi := doubtSpan(m.Doubt)
	some := false
	for s := range doubtRamp {
		data := p.dots(func(i int) bool {
			if task == Classes {
				return doubtStep(m.Doubt[i]) == s
			}
			return step(m.Doubt[i], lo, hi, doubtRamp) == s
		})
		some = some || data != ""
		p.add(d, "dot "+p.dotClass()+" u"+strconv.Itoa(s), data)
	}
	p.add(d, "dot none "+p.dotClass(), p.dots(func(i int) bool { return !m.Given[i] && math.IsNaN(m.Doubt[i]) }))
	switch {
	case !some:
		d.Legend = []legend{{Key: string(glyph(nil, 0, 0, 0, 4)), Mark: "none-key", Text: "not known: too few labels to leave some out"}}
	case task == Numbers:
		d.Legend = rampLegend("w", lo, hi, doubtRamp, percent)
	default:
		d.Legend = rampLegend("w", 0, 1, doubtRamp, percent)
		for s := range d.Legend {
			switch s {
			case doubtRamp - 1:
				d.Legend[s].Text = "over " + percent(doubtEdges[s-1])
			case 0:
				d.Legend[s].Text = "under " + percent(doubtEdges[0])
			default:
				d.Legend[s].Text = percent(doubtEdges[s-1]) + " to " + percent(doubtEdges[s])
			}
		}
	}
	return d
}

// doubtStep is the step of a class's doubt, -1 where it is not known.
func doubtStep(v float64) int {
	if math.IsNaN(v) {
		return -1
	}
	s := 0
	for s < len(doubtEdges) && v >= doubtEdges[s] {
		s++
	}
	return s
}

func classLegend(names []string) []legend {
	var out []legend
	for c, name := range names {
		if c == 24 {
			return append(out, legend{Text: fmt.Sprintf("and %d more", len(names)-c)})
		}
		k := keyOf(c)
		k.Text = name
		out = append(out, k)
	}
	return out
}

func rampLegend(class string, lo, hi float64, steps int, text func(float64) string) []legend {
	var out []legend
	for s := range steps {
		a := lo + (hi-lo)*float64(s)/float64(steps)
		b := lo + (hi-lo)*float64(s+1)/float64(steps)
		out = append(out, legend{Key: string(glyph(nil, 0, 0, 0, 4.5)), Mark: class + strconv.Itoa(s), Text: text(a) + " to " + text(b)})
	}
	return out
}

// valueSpan is the range of the finite values.
func valueSpan(v []float64) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, x := range v {
		if finite(x) {
			lo, hi = min(lo, x), max(hi, x)
		}
	}
	if lo > hi {
		return 0, 1
	}
	if lo == hi {
		return lo, lo + 1
	}
	return lo, hi
}

// doubtSpan is the range of interval widths, from nothing where they are all alike.
func doubtSpan(v []float64) (lo, hi float64) {
	lo, hi = valueSpan(v)
	if hi-lo < .2*hi {
		lo = 0
	}
	return lo, hi
}
