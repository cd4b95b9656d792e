package report

import (
	"math"
	"strconv"
)

// drawing is a hand-set SVG: what the template writes, in this order.
type drawing struct {
	ID, Title, Desc string // Title and Desc speak to those who cannot see it
	W, H            int
	Marks           []mark
	Caption         string
	Legend          []legend
}

// mark is one element. Its colours come from Class, through the page's style.
type mark struct {
	Tag        string // rect, path or text
	Class      string
	X, Y, W, H string
	D          string
	Text       string
	Anchor     string
	Transform  string
}

// legend explains one mark.
type legend struct {
	Key  string // path data within -6..6
	Mark string // class
	Text string
}

func (d *drawing) rect(class string, x, y, w, h float64) {
	d.Marks = append(d.Marks, mark{Tag: "rect", Class: class, X: coord(x), Y: coord(y), W: coord(max(w, 0)), H: coord(max(h, 0))})
}

func (d *drawing) line(class string, x0, y0, x1, y1 float64) {
	d.path(class, "M"+coord(x0)+" "+coord(y0)+"L"+coord(x1)+" "+coord(y1))
}

func (d *drawing) path(class, data string) {
	d.Marks = append(d.Marks, mark{Tag: "path", Class: class, D: data})
}

func (d *drawing) text(class, anchor string, x, y float64, s string) {
	d.Marks = append(d.Marks, mark{Tag: "text", Class: class, Anchor: anchor, X: coord(x), Y: coord(y), Text: s})
}

// frame is the plotting area of a drawing with its scales.
type frame struct {
	*drawing
	left, top, right, bottom float64
	x0, x1, y0, y1           float64 // data at the edges
	log                      bool    // logarithmic y
}

// newFrame makes a drawing of w by h with room for its axes.
func newFrame(id, title string, w, h int) *frame {
	d := &drawing{ID: id, Title: title, W: w, H: h}
	return &frame{drawing: d, left: 46, top: 12, right: float64(w) - 10, bottom: float64(h) - 40}
}

func (f *frame) px(v float64) float64 {
	return f.left + float64((f.right-f.left)*clamp01((v-f.x0)/(f.x1-f.x0)))
}

func (f *frame) py(v float64) float64 {
	t := (v - f.y0) / (f.y1 - f.y0)
	if f.log {
		t = math.Log(v/f.y0) / math.Log(f.y1/f.y0)
	}
	return f.bottom - float64((f.bottom-f.top)*clamp01(t))
}

func clamp01(t float64) float64 {
	if math.IsNaN(t) {
		return 0
	}
	return min(max(t, 0), 1)
}

// xAxis draws the lower edge with its ticks and name.
func (f *frame) xAxis(ticks []float64, label func(float64) string, name string) {
	f.line("axis", f.left, f.bottom, f.right, f.bottom)
	for _, v := range ticks {
		f.line("axis", f.px(v), f.bottom, f.px(v), f.bottom+4)
		f.text("tick", "middle", f.px(v), f.bottom+16, label(v))
	}
	f.text("name", "middle", (f.left+f.right)/2, float64(f.H)-6, name)
}

// yAxis draws the grid lines, their ticks and the name.
func (f *frame) yAxis(ticks []float64, label func(float64) string, name string) {
	for _, v := range ticks {
		f.line("grid", f.left, f.py(v), f.right, f.py(v))
		f.text("tick", "end", f.left-5, f.py(v)+4, label(v))
	}
	y := (f.top + f.bottom) / 2
	f.Marks = append(f.Marks, mark{Tag: "text", Class: "name", Anchor: "middle", X: "0", Y: "0", Text: name, Transform: "translate(11 " + coord(y) + ") rotate(-90)"})
}

// niceTicks gives about want round numbers that span lo to hi: steps of 1, 2 or 5 times a power of ten.
func niceTicks(lo, hi float64, want int) []float64 {
	if !(hi > lo) || math.IsInf(hi-lo, 0) {
		return []float64{lo}
	}
	step := niceStep((hi - lo) / float64(max(want, 1)))
	var ticks []float64
	first := math.Ceil(lo/step - 1e-9)
	for k := 0.0; ; k++ {
		v := (first + k) * step
		if v > hi+float64(1e-9*step) || k > 50 {
			return ticks
		}
		ticks = append(ticks, v)
	}
}

// niceStep is the least 1, 2 or 5 times a power of ten that is at least v.
func niceStep(v float64) float64 {
	base := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range []float64{1, 2, 5, 10} {
		if m*base >= v*(1-1e-9) {
			return m * base
		}
	}
	return 10 * base
}

// logTicks gives the powers of ten from lo to hi, thinned to about six.
func logTicks(lo, hi float64) []float64 {
	from, to := math.Ceil(float64(math.Log10(lo))-1e-9), math.Floor(float64(math.Log10(hi))+1e-9)
	step := max(1, math.Ceil((to-from)/6))
	var ticks []float64
	for e := from; e <= to; e += step {
		ticks = append(ticks, math.Pow(10, e))
	}
	return ticks
}

// glyphs are the shapes of classes: path data about the origin for a radius of 1.
var glyphs = [...][]float64{
	nil,                                    // circle
	{-.9, -.9, .9, -.9, .9, .9, -.9, .9},   // square
	{0, -1.15, 1.05, .8, -1.05, .8},        // triangle
	{0, -1.25, 1.25, 0, 0, 1.25, -1.25, 0}, // diamond
	{-1.05, -.8, 1.05, -.8, 0, 1.15},       // triangle, point down
	{-.4, -1.15, .4, -1.15, .4, -.4, 1.15, -.4, 1.15, .4, .4, .4, .4, 1.15, -.4, 1.15, -.4, .4, -1.15, .4, -1.15, -.4, -.4, -.4}, // cross
	{-1.2, -.55, 1.2, -.55, 1.2, .55, -1.2, .55}, // bar
	{-.55, -1.2, .55, -1.2, .55, 1.2, -.55, 1.2}, // post
}

// glyph is the outline of a shape at a place.
func glyph(dst []byte, shape int, x, y, r float64) []byte {
	put := func(cmd byte, a, b float64) {
		dst = append(dst, cmd)
		dst = append(dst, coord(a)...)
		dst = append(dst, ' ')
		dst = append(dst, coord(b)...)
	}
	points := glyphs[shape%len(glyphs)]
	if points == nil {
		c := coord(r)
		put('M', x-r, y)
		dst = append(dst, "a"+c+" "+c+" 0 1 0 "+coord(2*r)+" 0a"+c+" "+c+" 0 1 0 "+coord(-2*r)+" 0z"...)
		return dst
	}
	for i := 0; i < len(points); i += 2 {
		cmd := byte('L')
		if i == 0 {
			cmd = 'M'
		}
		put(cmd, x+float64(r*points[i]), y+float64(r*points[i+1]))
	}
	return append(dst, 'z')
}

// colours is the number of class colours; further classes repeat them in other shapes.
const colours = 8

// classStyle is the style class of a class's marks.
func classStyle(c int) string { return "c" + strconv.Itoa(c%colours) }

// classShape is a class's glyph.
func classShape(c int) int { return (c + c/colours) % len(glyphs) }

// keyOf is a class's legend key.
func keyOf(c int) legend {
	return legend{Key: string(glyph(nil, classShape(c), 0, 0, 4.5)), Mark: classStyle(c)}
}
