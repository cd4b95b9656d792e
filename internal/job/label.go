package job

import (
	"context"
	"math"
	"slices"
	"strconv"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/graph"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// labelled is a run of label before anything is written.
type labelled struct {
	data    *data
	network *network
	field   *field
	setting choose.Setting
	chosen  *choose.Score
	bridged []bool // by vertex, nil when none is
	result  *encode.Result
	keep    *kept // what confidence rests on; nil when labels are too few
	record  *Record
}

// Label runs the main job: every row labelled, with its record, report and model.
func Label(ctx context.Context, o *Options) error {
	r, ctx, cancel := start(ctx, o)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	if r.SolveOn > 0 {
		return r.labelOnFewer(ctx, w)
	}
	l, err := r.label(ctx)
	if err != nil {
		return err
	}
	err = r.stage(ctx, "write", func() error { return r.writeLabel(ctx, w, l) })
	if err != nil {
		return err
	}
	r.summary(l)
	return nil
}

// label runs the stages of the main job up to the result.
func (r *run) label(ctx context.Context) (*labelled, error) {
	d, err := r.load(ctx)
	if err != nil {
		return nil, err
	}
	l := &labelled{data: d, record: r.newRecord("label", d)}
	if l.network, err = r.findNetwork(ctx, d); err != nil {
		return nil, err
	}
	if err := r.placeLabels(d, l.network.vertices); err != nil {
		return nil, err
	}
	if err := r.stage(ctx, "solve", func() error { return r.chooseSetting(ctx, l) }); err != nil {
		return nil, err
	}
	if err := r.stage(ctx, "trust", func() error { return r.judge(ctx, l) }); err != nil {
		return nil, err
	}
	r.fillRecord(l)
	return l, nil
}

// layField weights the graph for a setting, settles components without a label, and puts the labels on.
func (r *run) layField(ctx context.Context, l *labelled, s choose.Setting) (*laid, error) {
	n := l.network
	out := &laid{setting: s}
	w, err := r.weighted(n, s.Neighbors, s.Kernel, s.Bandwidth)
	if err != nil {
		return nil, err
	}
	if w, out.bridged, err = r.reach(ctx, n, w, s, out); err != nil {
		return nil, err
	}
	out.weights = w
	f := &field{graph: w, labels: r.labelsOf(l.data, n.vertices), n: n.n}
	if r.Tether > 0 {
		if f.graph, f.labels, err = r.tethered(l.data, n.vertices, w); err != nil {
			return nil, err
		}
	}
	out.field = f
	return out, nil
}

// laid is the graph of one setting, ready to be solved on.
type laid struct {
	setting  choose.Setting
	field    *field
	weights  *sparse.CSR // before tethers
	bridged  []bool      // by vertex, nil when none is
	figures  GraphFigures
	warnings []encode.Warning
}

// newResult puts the scores on the table's rows: given labels stand, every other reached row takes its answer.
func (r *run) newResult(l *labelled, decide func(vertex int32) int32) *encode.Result {
	d, v, f := l.data, l.network.vertices, l.field
	rows := d.table.Rows()
	res := &encode.Result{Task: d.labels.Task, Names: d.labels.Names, Origin: make([]encode.Origin, rows), GivenText: d.givenText()}
	if res.Task == encode.Classes {
		res.Class = make([]int32, rows)
	} else {
		res.Value = make([]float64, rows)
	}
	for row := range rows {
		x := v.of[row]
		switch {
		case x < 0 || math.IsNaN(f.scores[0][x]):
			res.Origin[row] = encode.OriginBlank
			r.leave(res, row)
			continue
		case l.bridged != nil && l.bridged[x]:
			res.Origin[row] = encode.Bridged
		}
		if res.Task == encode.Classes {
			res.Class[row] = decide(x)
		} else {
			res.Value[row] = f.scores[0][x]
		}
	}
	for k, row := range d.labels.Rows {
		res.Origin[row] = encode.Given
		if res.Task == encode.Classes {
			res.Class[row] = d.labels.Class[k]
		} else {
			res.Value[row] = d.labels.Value[k]
		}
	}
	if r.Scores {
		res.Scores = onRows(f.scores, v.of)
	}
	return res
}

// leave marks a row that gets no label.
func (r *run) leave(res *encode.Result, row int) {
	if res.Task == encode.Classes {
		res.Class[row] = -1
	} else {
		res.Value[row] = math.NaN()
	}
}

// onRows spreads values by vertex over the table's rows; a row that is out gets NaN.
func onRows(byVertex [][]float64, of []int32) [][]float64 {
	out := make([][]float64, len(byVertex))
	for c, values := range byVertex {
		out[c] = make([]float64, len(of))
		for row, x := range of {
			out[c][row] = math.NaN()
			if x >= 0 {
				out[c][row] = values[x]
			}
		}
	}
	return out
}

// settingFigures writes the setting into the record.
func (r *run) settingFigures(l *labelled) Settings {
	s := Settings{
		P: Number(l.setting.P), Energy: energyText(r.Energy), Tether: Number(r.Tether), Unreachable: string(r.Unreachable),
		Coverage: Number(r.Coverage), Drawn: string(r.Drawn), Tolerance: Number(tolerance(r.Tolerance)), Seed: r.Seed, SolveOn: r.SolveOn,
	}
	if l.data.labels.Task == encode.Classes {
		s.Balance = balanceName(l.setting.Balance)
	}
	if l.network.given == nil {
		s.Scale, s.Metric, s.Kernel = string(r.Scale), string(r.Metric), l.setting.Kernel.String()
		s.Bandwidth = bandwidthText(l.setting.Bandwidth)
		if r.Radius > 0 {
			s.Radius = Number(r.Radius)
		} else {
			s.Neighbors = l.setting.Neighbors
		}
	}
	return s
}

func energyText(e solve.Energy) string {
	if e == solve.Conductance {
		return "conductance"
	}
	return "slope"
}

// bandwidthText writes a bandwidth as the flag takes it.
func bandwidthText(b graph.Bandwidth) string {
	if b.Local && b.H == 1 {
		return "local"
	}
	text := strconv.FormatFloat(b.H, 'g', -1, 64)
	if b.Local {
		return text + " local"
	}
	return text
}

func tolerance(asked float64) float64 {
	if asked == 0 {
		return solve.DefaultTolerance
	}
	return asked
}

// count gives the result's figures for the record.
func resultFigures(res *encode.Result) ResultFigures {
	var f ResultFigures
	byClass := make([]int, len(res.Names))
	var values []float64
	for row, origin := range res.Origin {
		switch origin {
		case encode.Given:
			f.Given++
		case encode.Inferred:
			f.Inferred++
		case encode.Bridged:
			f.Bridged++
		case encode.Abstained:
			f.Abstained++
			continue
		case encode.OriginBlank:
			f.Blank++
			continue
		}
		if res.Task == encode.Classes {
			byClass[res.Class[row]]++
		} else {
			values = append(values, res.Value[row])
		}
	}
	for c, n := range byClass {
		f.Classes = append(f.Classes, ClassCount{res.Names[c], n})
	}
	if len(values) > 0 {
		slices.Sort(values)
		lo, mid, hi := Number(values[0]), Number(values[(len(values)-1)/2]), Number(values[len(values)-1])
		f.Low, f.Median, f.High = &lo, &mid, &hi
	}
	return f
}
