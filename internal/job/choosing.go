package job

import (
	"context"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/graph"
	"pinfill/internal/sparse"
)

// ChoiceFigures say how settings that were not given were chosen.
type ChoiceFigures struct {
	Reason     string         `json:"reason"`
	Candidates []ScoreFigures `json:"candidates"`
}

// ScoreFigures are one setting tried.
type ScoreFigures struct {
	P          Number       `json:"p"`
	Neighbors  int          `json:"neighbors,omitempty"`
	Kernel     string       `json:"kernel,omitempty"`
	Bandwidth  string       `json:"bandwidth,omitempty"`
	Error      Number       `json:"left_out_error"` // share decided wrong, or RMSE
	StdError   Number       `json:"std_error"`
	LogLoss    Number       `json:"log_loss"`
	LeftOut    int          `json:"labels_left_out"`
	LabelDrop  Number       `json:"label_drop"` // S_p
	Bulk       Number       `json:"bulk_range"` // B_p
	AtLabels   Number       `json:"energy_share_at_labels"`
	Shares     []ClassShare `json:"class_shares,omitempty"`
	Width      Number       `json:"width"`
	Gap        Number       `json:"gap"`
	Solves     int          `json:"linear_solves"`
	Iterations int          `json:"iterations"`
	Certified  bool         `json:"certified"`
	Advised    bool         `json:"advised"`
}

// ClassShare is a class and its share of the unlabelled rows.
type ClassShare struct {
	Class string `json:"class"`
	Share Number `json:"share"`
}

// asked gives what the user fixed.
func (r *run) asked(d *data, n *network) choose.Asked {
	a := choose.Asked{P: r.P, Neighbors: r.Neighbors, Kernel: r.Kernels, Bandwidth: r.Bandwidths, Balance: balanceOf(r.Balance, d.labels)}
	if n.given != nil || n.ragged != nil {
		a.Neighbors = []int{0}
	} else if len(a.Neighbors) == 0 && n.lists.K < choose.DefaultNeighbors {
		a.Neighbors = []int{n.lists.K}
	}
	if n.given != nil { // one graph: nothing to choose but p and the balance
		a.Kernel = []graph.Kernel{graph.Gaussian}
		a.Bandwidth = []graph.Bandwidth{{Local: true, H: 1}}
	}
	return a
}

// balanceOf puts a balance in the order of the classes.
func balanceOf(b encode.Balance, l *encode.Labels) choose.Balance {
	out := choose.Balance{Mode: balanceModes[b.Mode]}
	if out.Mode == choose.Given {
		for _, name := range l.Names {
			out.Shares = append(out.Shares, b.Shares[name])
		}
	}
	return out
}

var balanceModes = map[string]choose.Mode{
	"auto": choose.AutoBalance, "none": choose.NoBalance, "uniform": choose.Uniform, "labels": choose.FromLabels, "shares": choose.Given,
}

// balanceName writes a balance as the flag takes it.
func balanceName(b choose.Balance) string {
	for name, mode := range balanceModes {
		if mode == b.Mode {
			return name // one name a mode: the order of the map does not matter
		}
	}
	return ""
}

// chooseSetting settles what the user left open, solves, and keeps the chosen solution.
func (r *run) chooseSetting(ctx context.Context, l *labelled) error {
	grounds := map[*sparse.CSR]*laid{}
	var last *laid
	source := func(ctx context.Context, s choose.Setting) (*sparse.CSR, error) {
		out, err := r.layField(ctx, l, s)
		if err != nil {
			return nil, err
		}
		grounds[out.field.graph] = out
		last = out
		return out.field.graph, nil
	}
	labels, err := r.chosenLabels(l)
	if err != nil {
		return err
	}
	d, err := choose.Auto(ctx, source, labels, r.asked(l.data, l.network), choose.Options{
		Energy: r.Energy, Tolerance: r.Tolerance, Workers: r.Workers, Seed: r.Seed, Progress: r.progressFor("solve"), Scores: !r.byMoments(l),
	})
	if err != nil {
		return err
	}
	out := last
	for _, g := range grounds {
		if sameGraph(g.setting, d.Setting) {
			out = g
		}
	}
	l.setting, l.chosen, l.field, l.bridged = d.Setting, d.Chosen, out.field, out.bridged
	out.figures.measure(out.weights, r.Workers)
	l.record.Graph = out.figures
	r.warn(out.warnings...)
	for _, text := range d.Warnings {
		r.warnf("", "%s", text)
	}
	l.record.Choice = r.choiceFigures(l, d)
	return r.takeScores(l.data, l.field, d.Chosen)
}

// byMoments says that p = 2 is all that is asked for numbers: the spread of the labels then brings the left-out answers
// with it (judgeNumbers), at no further solve.
func (r *run) byMoments(l *labelled) bool {
	return l.data.labels.Task == encode.Numbers && len(r.P) == 1 && r.P[0] == 2 && len(r.Neighbors) <= 1 && len(r.Kernels) <= 1 && len(r.Bandwidths) <= 1
}

// chosenLabels gives the labels on the graph that choose will see: with tethers, on the extra vertices.
func (r *run) chosenLabels(l *labelled) (choose.Labels, error) {
	if r.Tether == 0 {
		return r.labelsOf(l.data, l.network.vertices), nil
	}
	empty := &sparse.CSR{N: l.network.n, RowPtr: make([]int, l.network.n+1)}
	_, labels, err := r.tethered(l.data, l.network.vertices, empty)
	return labels, err
}

func sameGraph(a, b choose.Setting) bool {
	return a.Neighbors == b.Neighbors && a.Kernel == b.Kernel && a.Bandwidth == b.Bandwidth
}

func (r *run) choiceFigures(l *labelled, d *choose.Decision) *ChoiceFigures {
	c := &ChoiceFigures{Reason: d.Reason}
	for _, s := range d.Scores {
		c.Candidates = append(c.Candidates, scoreFigures(s, l))
	}
	return c
}

func scoreFigures(s *choose.Score, l *labelled) ScoreFigures {
	f := ScoreFigures{
		P: Number(s.P), Error: Number(s.Error), StdError: Number(s.StdError), LogLoss: Number(s.LogLoss), LeftOut: s.LeftOut,
		LabelDrop: Number(s.Spike), Bulk: Number(s.Bulk), AtLabels: Number(s.Kappa), Width: Number(s.Certificate.Width), Gap: Number(s.Certificate.Gap),
		Solves: s.Count.LinearSolves, Iterations: s.Count.Iterations, Certified: s.Certified, Advised: s.Advised,
	}
	if l.network.given == nil {
		f.Neighbors, f.Kernel, f.Bandwidth = s.Neighbors, s.Kernel.String(), bandwidthText(s.Bandwidth)
	}
	for c, share := range s.Shares {
		f.Shares = append(f.Shares, ClassShare{l.data.labels.Names[c], Number(share)})
	}
	return f
}

// plainSetting is the setting of commands that do not choose: the flags, or the middle of the road.
func (r *run) plainSetting(n *network) choose.Setting {
	s := choose.Setting{P: 2, Neighbors: choose.DefaultNeighbors, Kernel: graph.Gaussian, Bandwidth: graph.Bandwidth{Local: true, H: 1}}
	if len(r.Neighbors) > 0 {
		s.Neighbors = r.Neighbors[0]
	}
	if len(r.Kernels) > 0 {
		s.Kernel = r.Kernels[0]
	}
	if len(r.Bandwidths) > 0 {
		s.Bandwidth = r.Bandwidths[0]
	}
	if n.lists != nil {
		s.Neighbors = min(s.Neighbors, n.lists.K)
	}
	return s
}
