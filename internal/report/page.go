package report

import (
	"fmt"
	"math"
	"slices"
)

// runPage is a Run with all that its template writes.
type runPage struct {
	*Run
	Facts     []fact
	Origins   []share
	ClassRows []classRow
	ClassRest int // classes that the table leaves out
	ValueHist *drawing
	Spread    []quantile
	SureHist  *drawing
	SetHist   *drawing
	Calibrate *drawing
	TrustRows []row
	Disputed  int
	Closest   []Dispute // what of the doubts is listed
	Weak      []weakRow
	WeakNote  string
	Maps      []*drawing
	Drawn     string // how many points are drawn
	Errors    *drawing
	Window    *drawing
	Sorted    []Trial
	HealthRow []row
	Health    []string
	Solved    []Solve
	SolveRest int
	SolveNote string
}

// fact is one of the few things to read first.
type fact struct{ Question, Answer, More string }

// row is a line of a table of two columns.
type row struct{ Name, Value, Note string }

// share is a part of the rows.
type share struct {
	Name, What string
	Rows       int
	Share      float64
	Bar        *drawing
}

// classRow counts a class.
type classRow struct {
	Class         int
	Name          string
	Given, Filled int
	Share         float64
	Bar           *drawing
}

// quantile is a point of a distribution.
type quantile struct {
	Name  string
	Value float64
}

// mostListed is how many classes, solves or disputes a table lists.
const mostListed = 40

func newRunPage(r *Run) *runPage {
	p := &runPage{Run: r}
	p.countOrigins()
	if r.Task == Classes {
		p.countClasses()
	} else {
		p.spreadValues()
	}
	p.howSure()
	p.whatToDoubt()
	if r.Map != nil {
		p.Maps = mapPanels(r.Map, r.Task, r.Names)
		p.Drawn = drawnText(r.Map)
	}
	p.Sorted = sortedTrials(r.Trials)
	p.Errors = errorPlot(p.Sorted, r.Task, p.guess())
	p.Window = windowPlot(r.Windows, r.P, r.Neighbors)
	p.HealthRow, p.Health = health(&r.Graph)
	p.certificates()
	p.facts()
	return p
}

// drawnText says what of the points is drawn.
func drawnText(m *Map) string {
	if len(m.X) < m.Total {
		text := fmt.Sprintf("%s of %s distinct points are drawn, a random sample with seed %d", count(len(m.X)), count(m.Total), m.Seed)
		if slices.Contains(m.Given, true) {
			text += " that keeps the labelled ones"
		}
		return text + "."
	}
	return fmt.Sprintf("All %s distinct points are drawn.", count(m.Total))
}

func sortedTrials(t []Trial) []Trial {
	t = slices.Clone(t)
	slices.SortStableFunc(t, func(a, b Trial) int {
		switch {
		case a.P < b.P:
			return -1
		case a.P > b.P:
			return 1
		}
		return 0
	})
	return t
}

var originWords = [...]struct{ name, what string }{
	Given:     {"given", "by the expert; come back byte for byte"},
	Inferred:  {"inferred", "from the labels in reach"},
	Bridged:   {"bridged", "in components without a label; their answer came over an edge that was added"},
	Abstained: {"abstained", "left empty: too doubtful"},
	Blank:     {"blank", "left empty: out of reach of any label, or a feature is missing"},
}

func (p *runPage) countOrigins() {
	n := make([]int, len(originWords))
	for _, o := range p.Answers.Origin {
		if int(o) < len(n) {
			n[o]++
		}
	}
	for _, o := range []Origin{Given, Inferred, Bridged, Abstained, Blank} {
		s := float64(n[o]) / float64(max(len(p.Answers.Origin), 1))
		p.Origins = append(p.Origins, share{originWords[o].name, originWords[o].what, n[o], s, bar(s, "bar")})
	}
}

// bar is a share as a bar of a table.
func bar(s float64, class string) *drawing {
	d := &drawing{W: 120, H: 10}
	d.rect("trough", 0, 0, 120, 10)
	if s > 0 {
		d.rect(class, 0, 0, max(120*s, 1), 10)
	}
	return d
}

// answered says whether a row got an answer by the solver.
func (a *Answers) answered(row int) bool {
	return a.Origin[row] == Inferred || a.Origin[row] == Bridged
}

func (p *runPage) countClasses() {
	a := &p.Answers
	given, filled := make([]int, len(p.Names)), make([]int, len(p.Names))
	total := 0
	for row, c := range a.Class {
		switch {
		case c < 0:
		case a.Origin[row] == Given:
			given[c]++
			total++
		case a.answered(row):
			filled[c]++
			total++
		}
	}
	for c, name := range p.Names {
		s := float64(given[c]+filled[c]) / float64(max(total, 1))
		p.ClassRows = append(p.ClassRows, classRow{c, name, given[c], filled[c], s, bar(s, "b"+classStyle(c)[1:])})
	}
	if len(p.ClassRows) > mostListed {
		slices.SortStableFunc(p.ClassRows, func(a, b classRow) int { return b.Given + b.Filled - a.Given - a.Filled })
		p.ClassRest = len(p.ClassRows) - mostListed
		p.ClassRows = p.ClassRows[:mostListed]
	}
}

func (p *runPage) spreadValues() {
	a := &p.Answers
	h := binned(a.Value, a.answered, 0, 0, 24)
	f := h.draw("values", "Distribution of the answers", p.Label, "rows", figure)
	var marks []byte
	givenCount := 0
	for row, v := range a.Value {
		if a.Origin[row] == Given && finite(v) {
			givenCount++
			if givenCount <= 1000 && v >= f.x0 && v <= f.x1 {
				marks = fmt.Appendf(marks, "M%s %sv-7", coord(f.px(v)), coord(f.bottom))
			}
		}
	}
	f.path("rug", string(marks))
	f.Caption = "Bars: rows that were answered. Ticks at the foot: the given labels."
	f.Desc = fmt.Sprintf("%s in bars of width %s.", plural(h.total, "answer"), figure(h.step))
	p.ValueHist = f.drawing
	var v []float64
	for row, x := range a.Value {
		if a.answered(row) && finite(x) {
			v = append(v, x)
		}
	}
	if len(v) == 0 {
		return
	}
	slices.Sort(v)
	for _, q := range []struct {
		name string
		at   float64
	}{{"lowest", 0}, {"5% are below", .05}, {"a quarter below", .25}, {"median", .5}, {"a quarter above", .75}, {"5% are above", .95}, {"highest", 1}} {
		p.Spread = append(p.Spread, quantile{q.name, v[int(math.Round(q.at*float64(len(v)-1)))]})
	}
}

// guess is the error of an answer that looks at nothing: the commonest class, or the mean.
func (p *runPage) guess() float64 {
	a := &p.Answers
	n, sum, sq := 0.0, 0.0, 0.0
	by := make([]int, len(p.Names))
	for row, o := range a.Origin {
		if o != Given {
			continue
		}
		n++
		if p.Task == Classes {
			by[a.Class[row]]++
			continue
		}
		d := a.Value[row] - sum // Welford (1962): sum is the running mean
		sum += d / n
		sq += float64(d * (a.Value[row] - sum))
	}
	switch {
	case n < 2:
		return math.NaN()
	case p.Task == Classes:
		return 1 - float64(slices.Max(by))/n
	}
	return math.Sqrt(sq / (n - 1))
}

func (p *runPage) certificates() {
	all := slices.Clone(p.Solves)
	slices.SortStableFunc(all, func(a, b Solve) int {
		switch x, y := a.bound(), b.bound(); {
		case x > y:
			return -1
		case x < y:
			return 1
		}
		return 0
	})
	if len(all) > 0 {
		p.SolveNote = fmt.Sprintf("In the worst of %s, values are within %s of the label range of the true minimiser.", plural(len(all), "solve"), figure(all[0].bound()))
	}
	if len(all) > mostListed {
		p.SolveRest = len(all) - mostListed
		all = all[:mostListed]
	}
	p.Solved = all
}

// bound is what a certificate proves of the values: their distance from the minimiser, or at p = inf how far the
// steepest slopes up and down differ.
func (s Solve) bound() float64 {
	if finite(s.Width) {
		return s.Width
	}
	return zeroNaN(s.SlopeImbalance)
}

// health puts the graph's figures in rows, and what they mean in sentences.
func health(g *Graph) (rows []row, said []string) {
	rows = []row{
		{"vertices", count(g.Vertices), "distinct points; identical rows are one"},
		{"edges", count(g.Edges), ""},
		{"degree", fmt.Sprintf("%s to %s, median %s", count(g.MinDegree), count(g.MaxDegree), count(g.MedianDegree)), "edges at a vertex"},
		{"components", count(g.Components), "parts that no edge joins"},
		{"without a label", count(g.UnlabelledParts), fmt.Sprintf("%s in them", plural(g.UnlabelledRows, "row"))},
		{"edge weights", fmt.Sprintf("e^%s to e^%s", figure(g.LogWeightLow), figure(g.LogWeightHigh)), "between the weakest and the strongest edge"},
	}
	if g.Search != "" {
		rows = append(rows, row{"search", g.Search, fmt.Sprintf("found %s of the true neighbours on a check", percent(g.Recall))})
	}
	switch {
	case g.UnlabelledParts == 0:
		said = append(said, "Every vertex is in reach of a label.")
	case g.BridgedParts > 0:
		said = append(said, fmt.Sprintf("%s without a label (%s) had to be joined to the rest by an added edge: treat those answers as the weakest.", plural(g.BridgedParts, "component"), plural(g.UnlabelledRows, "row")))
	default:
		said = append(said, fmt.Sprintf("%s without a label (%s) got no answer: label a row of each.", plural(g.UnlabelledParts, "component"), plural(g.UnlabelledRows, "row")))
	}
	if g.LogWeightHigh-g.LogWeightLow > 60 {
		said = append(said, "Weights span more than 26 decades: some edges carry practically nothing. A larger bandwidth or more neighbours evens them out.")
	}
	if g.MedianDegree > 0 && g.MaxDegree > 20*g.MedianDegree {
		said = append(said, "Some vertices are neighbours of very many others (hubs); in many dimensions this blurs the answers.")
	}
	return rows, said
}

func (p *runPage) facts() {
	got := p.Origins
	answered := got[1].Rows + got[2].Rows
	p.Facts = append(p.Facts, fact{"What came out?", plural(answered, "row") + " answered", fmt.Sprintf("from %s of %s", plural(p.Labelled, "label"), plural(p.Rows, "row"))})
	sure := fact{"How sure?", "not known", "too few labels to leave some out"}
	if t := p.Trust; t != nil && p.Task == Classes {
		sure = fact{"How sure?", percent(t.Accuracy) + " right", fmt.Sprintf("of %s answered without their own", plural(t.Labels, "label"))}
	} else if t != nil {
		sure = fact{"How sure?", "± " + figure(t.RMSE), fmt.Sprintf("root mean square error on %s left out", plural(t.Labels, "label"))}
	}
	doubt := fact{"What to doubt?", p.WeakNote, ""}
	switch {
	case p.Doubts.Skipped == "" && p.Disputed > 0:
		doubt.More = plural(p.Disputed, "given label") + " disputed by the others"
	case p.Doubts.Skipped == "" && p.Doubts.Audited > 0:
		doubt.More = "no given label is disputed by the others"
	}
	if got[2].Rows > 0 {
		doubt.More += fmt.Sprintf("; %s bridged", plural(got[2].Rows, "row"))
	}
	why := fact{"Which settings?", "p = " + power(p.P), ""}
	if p.Neighbors > 0 {
		why.More = plural(p.Neighbors, "neighbour") + ", reason in section 5"
	}
	p.Facts = append(p.Facts, sure, doubt, why)
}
