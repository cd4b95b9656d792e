package job

import (
	"context"
	"math"
	"slices"
	"strings"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/report"
)

// mapNames are the beginnings of column names that are places on the ground: where a table has such a pair, its map is
// drawn by them.
var mapNames = [][2]string{{"easting", "northing"}, {"longitude", "latitude"}, {"lon", "lat"}, {"x", "y"}}

// places gives the coordinates of the drawn vertices.
func (r *run) places(l *labelled, drawn []int32) *report.Map {
	s := l.network.space
	m := &report.Map{X: make([]float64, len(drawn)), Y: make([]float64, len(drawn)), Total: l.network.n, Seed: r.Seed}
	names := make([]string, len(s.Scaling.Columns))
	for j, c := range s.Scaling.Columns {
		names[j] = l.data.features.Names[c]
	}
	raw := func(dst []float64, j int) { // undoes the scaling
		for i, x := range drawn {
			v := float64(s.Points.Row(int(x))[j]*s.Scaling.Spread[j]) + s.Scaling.Centre[j]
			dst[i] = math.Ldexp(v, -s.Scaling.Power[j])
		}
	}
	if a, b, ok := mapColumns(names); ok && !s.Scaling.Unit {
		raw(m.X, a)
		raw(m.Y, b)
		m.XName, m.YName, m.Equal = names[a], names[b], true
		m.Sentence = "Drawn by the columns " + names[a] + " and " + names[b] + "."
		return m
	}
	if s.Points.D <= 2 && !s.Scaling.Unit {
		raw(m.X, 0)
		m.XName, m.YName = names[0], "the answer"
		m.Sentence = "Drawn by the only feature column and the answer."
		if s.Points.D == 2 {
			raw(m.Y, 1)
			m.YName = names[1]
			m.Sentence = "Drawn by the two feature columns."
		}
		return m
	}
	centre, axes, share, ok := report.Directions(s.Points.Data, s.Points.D)
	if !ok {
		return nil
	}
	for i, x := range drawn {
		m.X[i], m.Y[i] = report.Project(s.Points.Row(int(x)), centre, axes)
	}
	m.XName, m.YName, m.Equal = "first principal direction", "second principal direction", true
	m.Sentence = "Drawn by the first two principal directions of the scaled features, which hold " + shareText(share[0]+share[1]) +
		" of their variance: what lies apart here is apart, what lies together may differ in the rest."
	return m
}

func shareText(v float64) string {
	return string(encode.AppendNumber(nil, math.Round(100*v))) + "%"
}

// mapColumns finds a pair of columns that are places on the ground. Their names begin with the words of the trade, up to
// a sign that is no letter.
func mapColumns(names []string) (a, b int, ok bool) {
	find := func(word string) int {
		return slices.IndexFunc(names, func(name string) bool {
			rest, found := strings.CutPrefix(strings.ToLower(name), word)
			return found && (rest == "" || rest[0] < 'a' || rest[0] > 'z')
		})
	}
	for _, pair := range mapNames {
		if a, b = find(pair[0]), find(pair[1]); a >= 0 && b >= 0 {
			return a, b, true
		}
	}
	return 0, 0, false
}

// noPlaces is why a run on a given graph has no map.
const noPlaces = "The graph was given, and the table's columns are not used: there are no coordinates to draw by."

// reportMap draws the vertices with their answers, or says why not.
func (r *run) reportMap(l *labelled) (*report.Map, string) {
	n, res := l.network, l.result
	if n.given != nil {
		return nil, noPlaces
	}
	drawn := report.Sample(n.n, report.MostPoints, r.Seed, n.fixed)
	m := r.places(l, drawn)
	if m == nil {
		return nil, "No direction stands out among the features: there is nothing to draw by."
	}
	rowOf := make([]int32, n.n) // the first row of each vertex
	for row := len(n.of) - 1; row >= 0; row-- {
		if x := n.of[row]; x >= 0 {
			rowOf[x] = int32(row)
		}
	}
	span := math.NaN()
	if t := l.record.Table; t.High != nil {
		span = float64(*t.High - *t.Low)
	}
	for _, x := range drawn {
		_, given := slices.BinarySearch(n.fixed, x)
		row := rowOf[x]
		m.Given, m.Origin = append(m.Given, given), append(m.Origin, reportOrigins[res.Origin[row]])
		empty := res.Origin[row] == encode.Abstained || res.Origin[row] == encode.OriginBlank
		doubt := math.NaN()
		if res.Task == encode.Classes {
			c := res.Class[row]
			if empty {
				c = -1
			}
			m.Class = append(m.Class, c)
			if res.Confidence != nil {
				doubt = 1 - res.Confidence[row]
			}
		} else {
			v := res.Value[row]
			if empty {
				v = math.NaN()
			}
			m.Value = append(m.Value, v)
			if res.Low != nil && span > 0 {
				doubt = (res.High[row] - res.Low[row]) / span
			}
		}
		m.Doubt = append(m.Doubt, doubt)
	}
	if n.space.Points.D == 1 { // the answer is the other axis
		for i := range m.Y {
			if m.Value != nil {
				m.Y[i] = zeroNaN(m.Value[i])
			} else {
				m.Y[i] = float64(m.Class[i])
			}
		}
	}
	return m, ""
}

func zeroNaN(v float64) float64 {
	if math.IsNaN(v) {
		return 0
	}
	return v
}

// reportBridges lists the components that were joined, largest first: what hangs together of the bridged vertices.
func (r *run) reportBridges(l *labelled) []report.Bridge {
	if l.bridged == nil {
		return nil
	}
	rowOf := make([]int32, l.network.n)
	for row := len(l.network.of) - 1; row >= 0; row-- {
		if x := l.network.of[row]; x >= 0 {
			rowOf[x] = int32(row)
		}
	}
	var out []report.Bridge
	seen := make([]bool, len(l.bridged))
	for x := range l.bridged {
		if !l.bridged[x] || seen[x] {
			continue
		}
		b := report.Bridge{Row: l.data.rowName(int(rowOf[x])), Answer: r.rowAnswer(l, int(rowOf[x]))}
		seen[x] = true
		for queue := []int32{int32(x)}; len(queue) > 0; {
			v := queue[len(queue)-1]
			queue = queue[:len(queue)-1]
			b.Vertices++
			for _, u := range l.field.graph.Col[l.field.graph.RowPtr[v]:l.field.graph.RowPtr[v+1]] {
				if int(u) < len(l.bridged) && l.bridged[u] && !seen[u] {
					seen[u] = true
					queue = append(queue, u)
				}
			}
		}
		out = append(out, b)
	}
	slices.SortStableFunc(out, func(a, b report.Bridge) int { return b.Vertices - a.Vertices })
	const most = 12
	return out[:min(len(out), most)]
}

// rowAnswer writes a row's answer for a person.
func (r *run) rowAnswer(l *labelled, row int) string {
	res := l.result
	switch {
	case res.Origin[row] == encode.Abstained || res.Origin[row] == encode.OriginBlank:
		return ""
	case res.Task == encode.Classes:
		return res.Names[res.Class[row]]
	}
	return figureText(res.Value[row])
}

// writeCompareReport writes the comparison as one HTML file, if one was asked for.
func (r *run) writeCompareReport(ctx context.Context, w *outputs, l *labelled, sweep *compared) error {
	o := w.byRole["report"]
	if o == nil {
		return nil
	}
	return r.stage(ctx, "report", func() error {
		written, err := w.sums("table")
		if err != nil {
			return err
		}
		page := &report.Comparison{
			Head: r.reportHead(l), Trials: reportTrials(l.record.Choice.Candidates), Advised: sweep.advised(sweep.labels.Task),
			Agreement: choose.Agreement(sweep.answers, sweep.labels),
		}
		page.Files = append(page.Files, reportFiles(written)...)
		r.compareMaps(l, sweep, page)
		return report.WriteComparison(o, page)
	})
}

// smallPoints is how many points each of a comparison's small maps draws.
const smallPoints = 4000

// compareMaps puts each setting's answers on the map.
func (r *run) compareMaps(l *labelled, sweep *compared, page *report.Comparison) {
	n := l.network
	if n.given != nil {
		page.NoMap = noPlaces
		return
	}
	held := make([]bool, n.n)
	for _, x := range sweep.labels.Vertex {
		if int(x) < n.n {
			held[x] = true
		}
	}
	var free []int32
	fields := sweep.scores[0].Fields
	for x := range n.n {
		if !held[x] && (fields == nil || !math.IsNaN(fields[0][x])) {
			free = append(free, int32(x))
		}
	}
	for _, a := range sweep.answers {
		if len(a.Class)+len(a.Value) != len(free) {
			page.NoMap = "The settings answer different rows, or come from parts that do not say which: there is no one map."
			return
		}
	}
	chosen := report.Sample(len(free), smallPoints, r.Seed, nil)
	drawn := make([]int32, len(chosen))
	for i, k := range chosen {
		drawn[i] = free[k]
	}
	m := r.places(l, drawn)
	if m == nil {
		page.NoMap = "No direction stands out among the features: there is nothing to draw by."
		return
	}
	m.Total = len(free)
	for _, a := range sweep.answers {
		var class []int32
		var value []float64
		for _, k := range chosen {
			if a.Class != nil {
				class = append(class, a.Class[k])
			} else {
				value = append(value, a.Value[k])
			}
		}
		page.Classes, page.Values = append(page.Classes, class), append(page.Values, value)
	}
	page.Map = m
}
