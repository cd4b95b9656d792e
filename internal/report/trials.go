package report

import (
	"fmt"
	"math"
	"slices"
	"strconv"
)

// series names what a trial has besides p.
func series(t Trial) string {
	if t.Neighbors == 0 && t.Kernel == "" {
		return "the one graph"
	}
	s := t.Kernel + " kernel, bandwidth " + t.Bandwidth
	if t.Neighbors > 0 {
		s = strconv.Itoa(t.Neighbors) + " neighbours, " + s
	}
	return s
}

// errorPlot sets the left-out error against p, one shape for each graph, with one standard error to each side. guess
// is what an answer that looks at nothing would get, or NaN.
func errorPlot(trials []Trial, task Task, guess float64) *drawing {
	var ps []float64
	var names []string
	top := 0.0
	for _, t := range trials {
		if !slices.Contains(ps, t.P) {
			ps = append(ps, t.P)
		}
		if !slices.Contains(names, series(t)) {
			names = append(names, series(t))
		}
		if finite(t.Error) {
			top = max(top, t.Error+zeroNaN(t.StdError))
		}
	}
	if len(ps) == 0 {
		return nil
	}
	slices.Sort(ps)
	f := newFrame("errors", "Left-out error by p", 480, 300)
	if finite(guess) && guess < 4*top {
		top = max(top, guess)
	}
	yText, yName := figure, "root mean square error"
	if task == Classes {
		yText, yName = percent, "labels decided wrong"
		top = min(max(top*1.08, .05), 1)
	} else if top *= 1.08; top == 0 {
		top = 1
	}
	f.x0, f.x1, f.y0, f.y1 = -.5, float64(len(ps))-.5, 0, top
	f.yAxis(niceTicks(0, top, 5), yText, yName)
	at := make([]float64, len(ps))
	for i := range at {
		at[i] = float64(i)
	}
	f.xAxis(at, func(v float64) string { return power(ps[int(v)]) }, "p")
	if finite(guess) && guess <= top {
		f.line("ideal", f.left, f.py(guess), f.right, f.py(guess))
		f.text("value", "end", f.right, f.py(guess)-4, guessName(task))
	}
	for _, t := range trials {
		if !finite(t.Error) {
			continue
		}
		s := slices.Index(names, series(t))
		spread := .7 / float64(max(len(names), 1))
		x := f.px(float64(slices.Index(ps, t.P)) + float64(spread*(float64(s)-float64(float64(len(names)-1)/2))))
		y, e := f.py(t.Error), zeroNaN(t.StdError)
		f.line("whisker", x, f.py(max(t.Error-e, 0)), x, f.py(t.Error+e))
		f.line("whisker", x-3, f.py(t.Error+e), x+3, f.py(t.Error+e))
		f.line("whisker", x-3, f.py(max(t.Error-e, 0)), x+3, f.py(max(t.Error-e, 0)))
		f.path(classStyle(s), string(glyph(nil, classShape(s), x, y, 4.5)))
		if t.Advised {
			f.path("ring", string(glyph(nil, 0, x, y, 9)))
			f.Desc += fmt.Sprintf("Chosen: p %s, error %s with a standard error of %s. ", power(t.P), yText(t.Error), yText(t.StdError))
		}
	}
	for s, name := range names {
		k := keyOf(s)
		k.Text = name
		f.Legend = append(f.Legend, k)
	}
	f.Legend = append(f.Legend, legend{Key: string(glyph(nil, 0, 0, 0, 5)), Mark: "ring", Text: "chosen"})
	f.Desc += fmt.Sprintf("%s tried at %s of p; the table lists them.", plural(len(trials), "setting"), plural(len(ps), "value"))
	f.Caption = "Whiskers: one standard error to each side. Settings whose whiskers overlap cannot be told apart by these labels."
	return f.drawing
}

func guessName(task Task) string {
	if task == Classes {
		return "always the commonest class"
	}
	return "always the mean"
}

func zeroNaN(v float64) float64 {
	if !finite(v) {
		return 0
	}
	return v
}

// windowPlot shows the numbers of neighbours that each p admits, and the chosen pair.
func windowPlot(windows []Window, p float64, neighbors int) *drawing {
	if len(windows) == 0 || neighbors <= 0 {
		return nil
	}
	lo, hi := float64(neighbors), float64(neighbors)
	for _, w := range windows {
		lo, hi = min(lo, max(w.NeighborsLow, 1), max(w.NeighborsHigh, 1)), max(hi, w.NeighborsLow, w.NeighborsHigh)
	}
	f := newFrame("window", "Numbers of neighbours that each p admits", 480, 300)
	f.log = true
	f.x0, f.x1, f.y0, f.y1 = -.5, float64(len(windows))-.5, max(lo/1.6, .8), hi*1.6
	f.yAxis(logTicks(f.y0, f.y1), compact, "neighbours")
	at := make([]float64, len(windows))
	for i := range at {
		at[i] = float64(i)
	}
	f.xAxis(at, func(v float64) string { return power(windows[int(v)].P) }, "p")
	for i, w := range windows {
		x := f.px(float64(i))
		if w.NeighborsHigh > w.NeighborsLow {
			f.rect("window", x-11, f.py(w.NeighborsHigh), 22, f.py(w.NeighborsLow)-f.py(w.NeighborsHigh))
		} else {
			y := f.py(max(w.NeighborsLow, 1))
			f.path("whisker", fmt.Sprintf("M%s %sl8 8m0-8l-8 8", coord(x-4), coord(y-4)))
		}
		if w.P == p {
			y := f.py(float64(neighbors))
			f.path("c1", string(glyph(nil, 3, x, y, 5)))
			f.path("ring", string(glyph(nil, 0, x, y, 9)))
			verdict := "outside"
			if w.Inside {
				verdict = "inside"
			}
			f.Desc = fmt.Sprintf("The chosen pair, p %s and %d neighbours, is %s the window of %s to %s. ", power(p), neighbors, verdict, figure(w.NeighborsLow), figure(w.NeighborsHigh))
		}
	}
	f.line("ideal", f.left, f.py(float64(neighbors)), f.right, f.py(float64(neighbors)))
	f.Legend = []legend{
		{Key: "M-4-6h8v12h-8z", Mark: "window", Text: "admissible"},
		{Key: "M-4-4l8 8m0-8l-8 8", Mark: "whisker", Text: "no number of neighbours will do"},
		{Key: string(glyph(nil, 3, 0, 0, 4)), Mark: "c1", Text: "chosen"},
	}
	f.Caption = "From ln n, so that the graph holds together, to n^(1−d/p), so that labels do not stand out as spikes (Slepčev and Thorpe 2019). " +
		"It is the limit of many rows: a guide whose ends are not sharp. The left-out error decides."
	f.Desc += "Dashed line: the chosen number of neighbours."
	return f.drawing
}

// matrixPlot shows the agreement of each two settings.
func matrixPlot(trials []Trial, agreement [][]float64, advised int) *drawing {
	n := len(trials)
	if n < 2 || n > 40 {
		return nil
	}
	const left, top = 46.0, 26.0
	cell := min(max(420/float64(n), 11), 52)
	d := &drawing{ID: "agreement", Title: "Agreement of each two settings", W: int(left + float64(cell*float64(n)) + 8), H: int(top + float64(cell*float64(n)) + 24)}
	lowest, pair := 2.0, [2]int{}
	for i := range n {
		y := top + float64(cell*float64(i))
		d.text("tick", "end", left-6, y+float64(cell/2)+4, matrixName(trials, i))
		if cell >= 24 || i%int(math.Ceil(24/cell)) == 0 {
			d.text("tick", "middle", left+float64(cell*(float64(i)+.5)), top-8, matrixName(trials, i))
		}
		for j := range n {
			a := agreement[i][j]
			if finite(a) && a < lowest && i != j {
				lowest, pair = a, [2]int{i, j}
			}
			d.rect("a"+strconv.Itoa(shade(a)), left+float64(cell*float64(j))+.5, y+.5, cell-1, cell-1)
			if cell >= 30 && finite(a) {
				class := "cell"
				if shade(a) >= 4 {
					class = "cell on"
				}
				text := strconv.FormatFloat(100*a, 'f', 0, 64)
				if a < 1 && text == "100" {
					text = ">99"
				}
				d.text(class, "middle", left+float64(cell*(float64(j)+.5)), y+float64(cell/2)+4, text)
			}
		}
	}
	d.rect("outline", left, top+float64(cell*float64(advised)), cell*float64(n), cell)
	d.text("name", "middle", left+float64(cell*float64(n)/2), float64(d.H)-6, matrixAxis(trials)+"; the outlined row is the advised one")
	if lowest <= 1 {
		d.Desc = fmt.Sprintf("Least agreement: settings %d and %d, %s.", pair[0]+1, pair[1]+1, percent(lowest))
	}
	return d
}

// matrixName names a setting by its p where that is enough.
func matrixName(trials []Trial, i int) string {
	if onlyP(trials) {
		return power(trials[i].P)
	}
	return strconv.Itoa(i + 1)
}

func matrixAxis(trials []Trial) string {
	if onlyP(trials) {
		return "p"
	}
	return "number of the setting in the table"
}

func onlyP(trials []Trial) bool {
	var ps []float64
	for _, t := range trials {
		if slices.Contains(ps, t.P) {
			return false
		}
		ps = append(ps, t.P)
	}
	return true
}

// shade is a step of the agreement's colours, 0 for none to 6.
func shade(a float64) int {
	edges := []float64{.5, .7, .8, .9, .95, .99}
	if !finite(a) {
		return 0
	}
	s := 0
	for s < len(edges) && a >= edges[s] {
		s++
	}
	return s
}
