package report

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"regexp"
	"strings"
	"testing"
)

// nasty names try to leave the text they are written in: element, attribute, style and script contexts.
var nasty = []string{
	`</script><img src=x onerror=alert(1)>`, `" onload="alert(2)`, `'><svg onload=alert(3)>`, `</title><script>alert(4)</script>`,
	`</style><link rel=stylesheet href=//evil.example>`, `javascript:alert(5)`, "a\u202eb\x00c",
}

// sampleRun makes a run of n rows with invented answers.
func sampleRun(task Task, n, classes int, names []string) *Run {
	rng := rand.New(rand.NewPCG(7, uint64(n)))
	r := &Run{Head: Head{
		Program: "pinfill 1", Table: "tidal.csv", Label: "bottom", Task: task, Rows: n, Labelled: 40, Features: []string{"depth_m", "slope_deg", "rough"},
		Reason: "p=2: the default", Caution: "Estimates for review by a qualified person.", Command: "pinfill label tidal.csv --label=bottom -o out.csv",
		Warnings: []Warning{{"G04", "one column dominates"}}, Files: []File{{"table", "tidal.csv", 12345, strings.Repeat("ab", 32)}},
	}, P: 2, Neighbors: 10, Vertices: n}
	if names == nil {
		for c := range classes {
			names = append(names, fmt.Sprintf("class%d", c))
		}
	}
	if task == Classes {
		r.Names = names
	}
	drawn := Sample(n, MostPoints, 3, nil)
	m := &Map{XName: "easting_m", YName: "northing_m", Sentence: "Drawn by two columns.", Equal: true, Total: n, Seed: 3}
	a := &r.Answers
	a.Origin = make([]Origin, n)
	for row := range n {
		if row%max(n/40, 1) == 0 {
			a.Origin[row] = Given
		} else if row%97 == 5 {
			a.Origin[row] = Bridged
		}
		if task == Classes {
			a.Class = append(a.Class, int32(rng.IntN(len(names))))
			a.Confidence = append(a.Confidence, .3+.7*rng.Float64())
			a.SetSize = append(a.SetSize, int32(rng.IntN(3)))
		} else {
			v := rng.NormFloat64()
			a.Value, a.Low, a.High = append(a.Value, v), append(a.Low, v-1-rng.Float64()), append(a.High, v+1)
		}
	}
	a.SetText = func(int) string { return strings.Join(names, ", ") }
	for _, i := range drawn {
		m.X, m.Y = append(m.X, 1000*rng.Float64()), append(m.Y, 700*rng.Float64())
		m.Given, m.Origin = append(m.Given, a.Origin[i] == Given), append(m.Origin, a.Origin[i])
		m.Doubt = append(m.Doubt, rng.Float64())
		if task == Classes {
			m.Class = append(m.Class, a.Class[i])
		} else {
			m.Value = append(m.Value, a.Value[i])
		}
	}
	r.Map = m
	nan := math.NaN()
	r.Trust = &Trust{
		Promise: "coverage 0.9, if drawn at random", Note: "measured on left-out labels", Coverage: .9, Labels: 40, Accuracy: .9, LogLoss: .3, Brier: .2, ECE: .05, ECEFloor: .04, RMSE: nan, MAE: nan,
		Bins: []Bin{{20, .7, .65}, {20, .95, 1}},
	}
	if task == Numbers {
		r.Trust.Bins, r.Trust.Accuracy, r.Trust.RMSE = nil, nan, .8
		r.Trust.Given, r.Trust.LeftOut = []float64{1, 2, 3}, []float64{1.2, 1.7, nan}
	}
	r.Doubts = Doubts{Audited: 40, List: []Dispute{{"7", "sand", "mud", .01, true, []string{"3", "9"}}, {"8", "mud", "sand", .4, false, nil}}}
	r.Bridges = []Bridge{{12, "44", "mud"}}
	r.Settings = []Setting{{"p", "2", false}, {"neighbors", "10", true}}
	for _, p := range []float64{2, 4, math.Inf(1)} {
		r.Trials = append(r.Trials, Trial{P: p, Neighbors: 10, Kernel: "gaussian", Bandwidth: "local", Error: .1 + p/100*0, StdError: .03, LogLoss: nan, SmallShare: .1, LargeShare: .5, Width: 1e-12, Certified: true, Advised: p == 2})
		r.Windows = append(r.Windows, Window{P: p, NeighborsLow: 7, NeighborsHigh: 3 * min(p, 90), Inside: p > 3, BandwidthLow: nan, BandwidthHigh: nan, Reasons: []string{"a reason"}})
	}
	r.Dimension = &Dimension{Value: 2.1, Low: 1.9, High: 2.4, Columns: 3}
	r.Graph = Graph{Vertices: n, Edges: 6 * n, Components: 2, UnlabelledParts: 1, UnlabelledRows: 12, BridgedParts: 1, MinDegree: 3, MedianDegree: 11, MaxDegree: 30, LogWeightLow: -8, Search: "tree", Recall: 1}
	r.Solves = []Solve{{"sand", 0, "certified", 1e-15, 1e-14, 1e-13, nan, 3, 40}}
	return r
}

func draw(t testing.TB, r *Run) string {
	t.Helper()
	var b bytes.Buffer
	if err := Write(&b, r); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// elements reads the page as strict XML and hands on each start element; the page is written so that it is both.
func elements(t *testing.T, page string, see func(xml.StartElement)) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(page))
	d.Entity = xml.HTMLEntity
	for {
		tok, err := d.Token()
		if errors.Is(err, io.EOF) {
			return
		}
		if err != nil {
			t.Fatalf("the page is not well formed: %v", err)
		}
		if e, ok := tok.(xml.StartElement); ok {
			see(e)
		}
	}
}

var allowed = map[string]bool{}

func init() {
	for _, name := range strings.Fields("html head meta title style body header main footer nav section aside p span strong b h1 h2 h3 dl dt dd div ol ul li a table thead tbody tr th td details summary figure figcaption pre code svg desc rect path text") {
		allowed[name] = true
	}
}

// inert checks that a page loads nothing, runs nothing, and holds only elements and attributes of ours.
func inert(t *testing.T, page string) {
	t.Helper()
	ids := map[string]bool{}
	var refs []string
	elements(t, page, func(e xml.StartElement) {
		if !allowed[e.Name.Local] {
			t.Errorf("element %s", e.Name.Local)
		}
		for _, a := range e.Attr {
			name := a.Name.Local
			if strings.HasPrefix(name, "on") || name == "src" || name == "style" || name == "srcset" {
				t.Errorf("attribute %s=%q on %s", name, a.Value, e.Name.Local)
			}
			switch name {
			case "href":
				if !strings.HasPrefix(a.Value, "#") {
					t.Errorf("link to %q", a.Value)
				}
				refs = append(refs, a.Value[1:])
			case "id":
				if ids[a.Value] {
					t.Errorf("id %q stands twice", a.Value)
				}
				ids[a.Value] = true
			case "aria-labelledby":
				refs = append(refs, strings.Fields(a.Value)...)
			}
		}
	})
	for _, ref := range refs {
		if !ids[ref] {
			t.Errorf("nothing has the id %q", ref)
		}
	}
	if m := regexp.MustCompile(`(?i)url\(|@import|https?://`).FindString(page); m != "" {
		t.Errorf("the page holds %q", m)
	}
	if !strings.Contains(page, `default-src 'none'`) {
		t.Error("no content security policy")
	}
}

func TestPageHoldsEverySection(t *testing.T) {
	for _, task := range []Task{Classes, Numbers} {
		page := draw(t, sampleRun(task, 3000, 4, nil))
		inert(t, page)
		last := 0
		for _, want := range []string{
			"Estimates, not measurements", "What came out</h2>", "How sure</h2>", "What the promise rests on", "What to doubt</h2>", "disputed", "Weakest rows", "Bridged components",
			"The picture</h2>", "All 3,000 distinct points", "Why these settings</h2>", "Left-out error by p", "2.1 dimensions", "Settings tried",
			"health</h2>", "Certificates</h3>", "one column dominates", "To repeat it</h2>", "pinfill label tidal.csv", "abababab",
		} {
			at := strings.Index(page[last:], want)
			if at < 0 {
				t.Fatalf("%s: %q is not on the page after the one before it", task, want)
			}
			last += at
		}
		if strings.Contains(page, "NaN") || strings.Contains(page, "Inf") || strings.Contains(page, "ZgotmplZ") {
			t.Errorf("%s: a figure without a value is shown as a number", task)
		}
	}
}

func TestNamesAreInert(t *testing.T) {
	r := sampleRun(Classes, 300, 0, nasty)
	r.Table, r.Label, r.Reason, r.Command, r.Features, r.Constant = nasty[3], nasty[0], nasty[1], nasty[2], nasty, nasty
	r.Answers.RowName = func(row int) string { return nasty[row%len(nasty)] }
	r.Map.XName, r.Map.YName, r.Map.Sentence = nasty[0], nasty[1], nasty[4]
	r.Warnings = []Warning{{nasty[1], nasty[0]}}
	r.Files[0].Name = nasty[4]
	r.Doubts.List[0] = Dispute{nasty[0], nasty[1], nasty[2], .01, true, nasty}
	r.Trials[0].Kernel, r.Trials[0].Bandwidth = nasty[1], nasty[0]
	r.Solves[0].What = nasty[3]
	page := strings.ReplaceAll(draw(t, r), "\x00", "")
	inert(t, page)
	if !strings.Contains(page, "&lt;img src=x onerror=alert(1)&gt;") {
		t.Error("the name itself is not shown")
	}
}

// TestInertSees plants what inert must refuse.
func TestInertSees(t *testing.T) {
	page := draw(t, sampleRun(Classes, 100, 3, nil))
	for _, bad := range []string{`<script>1</script>`, `<img src="x"/>`, `<p onclick="x">y</p>`, `<a href="//x">y</a>`, `<p id="out">y</p>`, `<p>https://x</p>`} {
		probe := &testing.T{}
		inert(probe, strings.Replace(page, "<main>", "<main>"+bad, 1))
		if !probe.Failed() {
			t.Errorf("%s passed", bad)
		}
	}
}

func TestSameBytes(t *testing.T) {
	for _, task := range []Task{Classes, Numbers} {
		r := sampleRun(task, 2000, 5, nil)
		first, again := draw(t, r), draw(t, r)
		if first != again {
			t.Errorf("%s: two drawings of one run differ", task)
		}
	}
}

func TestBareRuns(t *testing.T) {
	for name, change := range map[string]func(*Run){
		"no trust": func(r *Run) {
			r.Trust, r.Answers.Confidence, r.Answers.SetSize, r.Answers.Low, r.Answers.High = nil, nil, nil, nil, nil
			for i := range r.Map.Doubt {
				r.Map.Doubt[i] = math.NaN()
			}
		},
		"no map":           func(r *Run) { r.Map, r.NoMap = nil, "a given graph" },
		"no trials":        func(r *Run) { r.Trials, r.Windows, r.Dimension, r.Neighbors = nil, nil, nil, 0 },
		"nothing answered": func(r *Run) { fill(r.Answers.Origin, Blank) },
		"all given":        func(r *Run) { fill(r.Answers.Origin, Given) },
		"one place":        func(r *Run) { zero(r.Map.X); zero(r.Map.Y) },
		"one line":         func(r *Run) { zero(r.Map.Y) },
		"no doubts":        func(r *Run) { r.Doubts = Doubts{Skipped: "too large"} },
		"far away": func(r *Run) {
			for i := range r.Map.X {
				r.Map.X[i] *= 1e300
			}
		},
		"endless intervals": func(r *Run) {
			for i := range r.Answers.Low {
				r.Answers.Low[i], r.Answers.High[i] = math.Inf(-1), math.Inf(1)
				if i < len(r.Map.Doubt) {
					r.Map.Doubt[i] = math.Inf(1)
				}
			}
		},
		"one value": func(r *Run) { zero(r.Answers.Value); zero(r.Map.Value) },
	} {
		for _, task := range []Task{Classes, Numbers} {
			r := sampleRun(task, 200, 3, nil)
			change(r)
			t.Run(name+" "+string(task), func(t *testing.T) { inert(t, draw(t, r)) })
		}
	}
}

func fill(o []Origin, v Origin) {
	for i := range o {
		o[i] = v
	}
}

func zero(v []float64) {
	for i := range v {
		v[i] = 0
	}
}

func TestWrongLengthsAreRefused(t *testing.T) {
	for name, change := range map[string]func(*Run){
		"confidence": func(r *Run) { r.Answers.Confidence = r.Answers.Confidence[1:] },
		"class":      func(r *Run) { r.Answers.Class[3] = 99 },
		"map":        func(r *Run) { r.Map.Y = r.Map.Y[1:] },
		"map class":  func(r *Run) { r.Map.Class[0] = 99 },
		"task":       func(r *Run) { r.Task = Numbers },
	} {
		r := sampleRun(Classes, 50, 3, nil)
		change(r)
		if err := Write(io.Discard, r); err == nil {
			t.Errorf("%s: drawn", name)
		}
	}
}

func sampleComparison(n int) *Comparison {
	r := sampleRun(Classes, 2000, 4, nil)
	c := &Comparison{Head: r.Head, Map: r.Map, Advised: 1}
	for i := range n {
		c.Trials = append(c.Trials, Trial{P: float64(i + 2), Neighbors: 10, Kernel: "gaussian", Bandwidth: "local", Error: .1, StdError: .02, LogLoss: .4, SmallShare: .1, LargeShare: .6, Certified: true})
		c.Classes = append(c.Classes, r.Map.Class)
		row := make([]float64, n)
		for j := range row {
			row[j] = 1 - .05*math.Abs(float64(i-j))
		}
		c.Agreement = append(c.Agreement, row)
	}
	return c
}

func TestComparison(t *testing.T) {
	for _, n := range []int{2, 5, 30} {
		var b bytes.Buffer
		if err := WriteComparison(&b, sampleComparison(n)); err != nil {
			t.Fatal(err)
		}
		inert(t, b.String())
		for _, want := range []string{"Left-out error by p", "Agreement of each two settings", "p = 3, advised", "All figures", "Estimates, not measurements"} {
			if !strings.Contains(b.String(), want) {
				t.Errorf("%d settings: no %q", n, want)
			}
		}
	}
	c := sampleComparison(3)
	c.Agreement = c.Agreement[1:]
	if err := WriteComparison(io.Discard, c); err == nil {
		t.Error("a matrix of another size was drawn")
	}
}

// TestSizeOfALargeRun holds the page of a million rows under 3 MB.
func TestSizeOfALargeRun(t *testing.T) {
	rows := 1_000_000
	if testing.Short() {
		rows = 100_000
	}
	for _, task := range []Task{Classes, Numbers} {
		page := draw(t, sampleRun(task, rows, 10, nil))
		if len(page) > 3_000_000 {
			t.Errorf("%s: %d bytes", task, len(page))
		}
		if !strings.Contains(page, "20,000 of "+count(rows)+" distinct points are drawn") {
			t.Errorf("%s: the page does not say that it is a sample", task)
		}
		t.Logf("%s: %d rows, %d bytes", task, rows, len(page))
	}
}

func BenchmarkWriteMillion(b *testing.B) {
	for _, task := range []Task{Classes, Numbers} {
		r := sampleRun(task, 1_000_000, 10, nil)
		b.Run(string(task), func(b *testing.B) {
			for b.Loop() {
				if err := Write(io.Discard, r); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
