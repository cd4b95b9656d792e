package job

import (
	"context"
	"fmt"
	"math"
	"strings"
	"text/tabwriter"

	"pinfill/internal/dimension"
	"pinfill/internal/encode"
	"pinfill/internal/graph"
	"pinfill/internal/sparse"
)

// Checked is what check reports.
type Checked struct {
	Table     TableFigures      `json:"table"`
	Warnings  []encode.Warning  `json:"warnings"`
	Shares    []ColumnShare     `json:"distance_shares,omitempty"` // largest first
	Copies    int               `json:"identical_rows"`            // rows beyond the first of their vertex
	Graph     GraphFigures      `json:"graph"`
	Hubs      int               `json:"hubs"`
	Isolated  int               `json:"isolated"`
	Effective Number            `json:"median_effective_degree"`
	ReachK    int               `json:"neighbors_that_reach_every_row,omitempty"`
	Dimension *DimensionFigures `json:"dimension,omitempty"`
	Windows   []WindowFigures   `json:"windows,omitempty"`
	Advice    Settings          `json:"advice"`
	Reason    string            `json:"reason"`
}

// ColumnShare is a feature's share of the mean squared distance after scaling.
type ColumnShare struct {
	Column string `json:"column"`
	Share  Number `json:"share"`
}

// DimensionFigures are the estimates of the intrinsic dimension.
type DimensionFigures struct {
	Value      Number      `json:"value"`
	Low        Number      `json:"low"`
	High       Number      `json:"high"`
	Likelihood []FigureAtK `json:"likelihood"` // MacKay and Ghahramani's average of Levina and Bickel's estimate
	TwoNN      Number      `json:"two_nn"`
	Rounded    bool        `json:"rounded_coordinates"`
	BiasedLow  bool        `json:"likely_too_low"`
}

// FigureAtK is an estimate from k neighbours.
type FigureAtK struct {
	K        int    `json:"k"`
	Value    Number `json:"value"`
	StdError Number `json:"std_error"`
}

// WindowFigures judge the graph's number of neighbours at one p.
type WindowFigures struct {
	P             Number   `json:"p"`
	NeighborsLow  Number   `json:"neighbors_low"`  // ln n: below, the graph may fall apart
	NeighborsHigh Number   `json:"neighbors_high"` // n^(1-d/p): above, labels show as spikes
	BandwidthLow  Number   `json:"bandwidth_low"`  // longest edge of the minimum spanning forest
	BandwidthHigh Number   `json:"bandwidth_high"` // where n^(-1/p) falls
	Inside        bool     `json:"inside"`
	Reasons       []string `json:"reasons,omitempty"`
}

// windowPs are the powers that check shows the window for.
var windowPs = []float64{2, 3, 4, 6, 8, 16, math.Inf(1)}

// Check looks at a table and the graph it would give, and changes nothing.
func Check(ctx context.Context, o *Options) (*Checked, error) {
	r, ctx, cancel := start(ctx, o)
	defer cancel()
	warn := r.Warn
	r.Warn = nil // warnings are part of the report here
	d, err := r.load(ctx)
	if err != nil {
		return nil, err
	}
	l := &labelled{data: d, record: r.newRecord("check", d)}
	if l.network, err = r.findNetwork(ctx, d); err != nil {
		return nil, err
	}
	if err := r.placeLabels(d, l.network.vertices); err != nil {
		return nil, err
	}
	if err := r.chooseSetting(ctx, l); err != nil {
		return nil, err
	}
	c := &Checked{Advice: r.settingFigures(l)}
	err = r.stage(ctx, "weights", func() error {
		w, err := r.weighted(l.network, l.setting.Neighbors, l.setting.Kernel, l.setting.Bandwidth)
		if err != nil {
			return err
		}
		return c.lookAt(r, l, w)
	})
	if err != nil {
		return nil, err
	}
	l.record.tableFigures(d, l.network.vertices)
	c.Table = l.record.Table
	if l.record.Choice != nil {
		c.Reason = l.record.Choice.Reason
	}
	c.Warnings = r.warnings
	r.Warn = warn
	return c, nil
}

// lookAt measures the graph, the dimension and the windows.
func (c *Checked) lookAt(r *run, l *labelled, w *sparse.CSR) error {
	n := l.network
	reach, err := graph.FindReach(w, n.fixed)
	if err != nil {
		return err
	}
	h := c.Graph.measure(w, r.Workers)
	c.Graph.Components, c.Graph.UnlabelledParts = len(reach.Size), len(reach.Unlabelled())
	if lost := reach.Blank(); lost != nil {
		for _, x := range n.of {
			if x >= 0 && lost[x] {
				c.Graph.UnlabelledRows++
			}
		}
	}
	c.Hubs, c.Isolated, c.Effective = h.HubCount, h.IsolatedCount, Number(h.EffectiveMedian)
	if n.given != nil {
		return nil
	}
	c.Graph.Search, c.Graph.Recall = n.search.Engine, Number(n.search.Recall)
	for _, count := range n.space.Count {
		c.Copies += int(count) - 1
	}
	for j, share := range n.space.Share {
		c.Shares = append(c.Shares, ColumnShare{l.data.features.Names[n.space.Scaling.Columns[j]], Number(share)})
	}
	sortShares(c.Shares)
	if n.lists == nil {
		return nil
	}
	if c.Graph.UnlabelledParts > 0 {
		mask := make([]bool, n.n)
		for _, x := range n.fixed {
			mask[x] = true
		}
		c.ReachK = graph.SmallestK(n.lists, mask)
	}
	return c.lookAtDimension(r, l)
}

func (c *Checked) lookAtDimension(r *run, l *labelled) error {
	var err error
	c.Dimension, c.Windows, err = r.dimensionFigures(l, windowPs, true)
	return err
}

// dimensionFigures estimates the dimension and judges the chosen number of neighbours at each p; nil where there are
// too few rows to say. The bandwidths' windows cost a spanning forest each.
func (r *run) dimensionFigures(l *labelled, ps []float64, bandwidths bool) (*DimensionFigures, []WindowFigures, error) {
	n := l.network
	dim, err := dimension.Estimate(n.lists, dimension.Options{Columns: n.space.Points.D, Workers: r.Workers})
	if err != nil || math.IsNaN(dim.Value) {
		return nil, nil, nil // too few rows to say
	}
	d := &DimensionFigures{
		Value: Number(dim.Value), Low: Number(dim.Low), High: Number(dim.High), TwoNN: Number(dim.TwoNN.Value), Rounded: dim.Rounded, BiasedLow: dim.BiasedLow,
	}
	for _, f := range dim.Likelihood {
		d.Likelihood = append(d.Likelihood, FigureAtK{f.K, Number(f.Value), Number(f.StdError)})
	}
	g, err := n.graph(l.setting.Neighbors, r.Workers)
	if err != nil {
		return nil, nil, err
	}
	var windows []WindowFigures
	for _, p := range ps {
		v := dimension.Judge(n.n, dim, float64(l.setting.Neighbors), p)
		w := WindowFigures{
			P: Number(p), NeighborsLow: Number(v.Low), NeighborsHigh: Number(v.High), Inside: v.Inside,
			BandwidthLow: Number(math.NaN()), BandwidthHigh: Number(math.NaN()),
		}
		if bandwidths {
			b := g.BandwidthWindow(dim.Value, p, false, 1, r.Workers)
			w.BandwidthLow, w.BandwidthHigh = Number(b.Connect*n.space.Unit), Number(b.High*n.space.Unit)
		}
		for _, reason := range v.Reasons {
			w.Reasons = append(w.Reasons, reason.String())
		}
		windows = append(windows, w)
	}
	return d, windows, nil
}

func sortShares(s []ColumnShare) {
	for i := 1; i < len(s); i++ { // insertion keeps table order among equals
		for j := i; j > 0 && s[j].Share > s[j-1].Share; j-- {
			s[j], s[j-1] = s[j-1], s[j]
		}
	}
}

// JSON writes the report for scripts.
func (c *Checked) JSON() (string, error) {
	b, err := encodeJSON(c)
	return string(b), err
}

// Text writes the report for a person, on one screen.
func (c *Checked) Text() string {
	var b strings.Builder
	t := c.Table
	fmt.Fprintf(&b, "table      %d rows, %d columns, %d labelled (%s)\n", t.Rows, t.Columns, t.Labelled, labelText(t))
	if len(t.Classes) > 0 {
		parts := make([]string, len(t.Classes))
		for i, k := range t.Classes {
			parts[i] = fmt.Sprintf("%s %d", k.Class, k.Rows)
		}
		fmt.Fprintf(&b, "labels     %s\n", cut(strings.Join(parts, ", "), 100))
	}
	if len(t.Features) > 0 {
		fmt.Fprintf(&b, "features   %d: %s\n", len(t.Features), cut(strings.Join(t.Features, ", "), 100))
	}
	if len(c.Shares) > 0 {
		fmt.Fprintf(&b, "distance   the largest share is %s's, %.0f%%; %d rows are copies of others\n", c.Shares[0].Column, 100*float64(c.Shares[0].Share), c.Copies)
	}
	g := c.Graph
	fmt.Fprintf(&b, "graph      %d vertices, %d edges, degree %d to %d (median %d, effectively %.1f), weights exp(%.3g) to exp(%.3g)\n",
		g.Vertices, g.Edges, g.MinDegree, g.MaxDegree, g.MedianDegree, float64(c.Effective), float64(g.LogWeightLow), float64(g.LogWeightHigh))
	fmt.Fprintf(&b, "reach      %s, %d without a label (%s); %s, %s", plural(g.Components, "component"), g.UnlabelledParts, plural(g.UnlabelledRows, "row"), plural(c.Isolated, "isolated row"), plural(c.Hubs, "hub"))
	if c.ReachK > 0 {
		fmt.Fprintf(&b, "; %d neighbours would reach every row", c.ReachK)
	}
	b.WriteString("\n")
	c.dimensionText(&b)
	c.windowText(&b)
	if c.Reason != "" {
		fmt.Fprintf(&b, "advice     %s\n           %s\n", settingText(c.Advice), c.Reason)
	}
	for _, w := range c.Warnings {
		code := ""
		if w.Code != "" {
			code = " [" + w.Code + "]"
		}
		fmt.Fprintf(&b, "warning    %s%s\n", w.Text, code)
	}
	return b.String()
}

func (c *Checked) dimensionText(b *strings.Builder) {
	d := c.Dimension
	if d == nil {
		if len(c.Shares) > 0 {
			b.WriteString("dimension  too few rows to say, so no window either\n")
		}
		return
	}
	fmt.Fprintf(b, "dimension  %.1f (between %.1f and %.1f): likelihood", float64(d.Value), float64(d.Low), float64(d.High))
	for _, f := range d.Likelihood {
		fmt.Fprintf(b, " %.1f at k=%d,", float64(f.Value), f.K)
	}
	fmt.Fprintf(b, " two nearest %.1f", float64(d.TwoNN))
	if d.Rounded {
		b.WriteString("; coordinates are rounded")
	}
	if d.BiasedLow {
		b.WriteString("; the true one is likely higher")
	}
	b.WriteString("\n")
}

func (c *Checked) windowText(b *strings.Builder) {
	if len(c.Windows) == 0 {
		return
	}
	b.WriteString("window     neighbours from ln n to n^(1-d/p), bandwidth from connectivity to n^(-1/p):\n")
	tw := tabwriter.NewWriter(b, 0, 0, 2, ' ', 0)
	fmt.Fprintf(tw, "           p\tneighbours\tbandwidth\tat %d neighbours\n", c.Advice.Neighbors)
	for _, w := range c.Windows {
		verdict := "inside"
		if !w.Inside {
			verdict = "outside"
		}
		if len(w.Reasons) > 0 {
			short, _, _ := strings.Cut(w.Reasons[0], ":")
			verdict += ": " + short
		}
		fmt.Fprintf(tw, "           %s\t%.0f to %.0f\t%.3g to %.3g\t%s\n", PText(float64(w.P)), float64(w.NeighborsLow), float64(w.NeighborsHigh),
			float64(w.BandwidthLow), float64(w.BandwidthHigh), verdict)
	}
	tw.Flush()
}

// cut shortens a list for one line.
func cut(s string, n int) string {
	if len(s) <= n {
		return s
	}
	i := strings.LastIndexByte(s[:n], ' ')
	return s[:max(i, 0)] + " ..."
}
