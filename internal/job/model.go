package job

import (
	"encoding/json"
	"io"
	"math"
	"os"
	"slices"

	"pinfill/internal/encode"
	"pinfill/internal/extend"
	"pinfill/internal/fault"
	"pinfill/internal/neighbors"
)

// newModel reduces a run to what new rows need.
func (r *run) newModel(l *labelled) (*extend.Model, error) {
	n := l.network
	if n.given != nil {
		return nil, fault.Usagef("P09", "--model needs a graph built from features: with --edges a new row has no distances")
	}
	settings, err := json.Marshal(l.record.Settings)
	if err != nil {
		return nil, err
	}
	g, err := n.graph(l.setting.Neighbors, r.Workers)
	if err != nil {
		return nil, err
	}
	m := &extend.Model{
		Version: Version, Label: r.Label, Features: l.data.features.Names, Missing: string(r.Missing), Median: l.data.features.Median,
		Scaling: n.space.Scaling, Metric: n.space.Metric, Kernel: l.setting.Kernel.String(), Width: r.inUnits(n, l.setting.Bandwidth), Rank: g.Rank,
		P: l.setting.P, Energy: energyText(r.Energy), Settings: settings,
		Points: n.space.Points, Local: g.Local, Scores: l.field.scores,
	}
	if r.Radius > 0 {
		m.Radius = r.Radius / n.space.Unit
	} else {
		m.K = l.setting.Neighbors
	}
	if l.data.labels.Task == encode.Classes {
		m.Classes = l.data.labels.Names
	}
	keep := l.keep
	if keep == nil {
		keep = &kept{Weights: l.chosen.Weights, Coverage: r.Coverage, Drawn: drawn[r.Drawn]}
	}
	keep.far = farthest(n.lists)
	if m.Trust, err = json.Marshal(keep); err != nil {
		return nil, err
	}
	m.Spread = keep.spread
	if r.Tether == 0 {
		m.Labelled = n.fixed
	}
	for v, bridged := range l.bridged {
		if bridged {
			m.Bridged = append(m.Bridged, int32(v))
		}
	}
	return m, nil
}

// farthest is the distance to the nearest neighbour that 99 of 100 vertices keep.
func farthest(lists *neighbors.Lists) float64 {
	if lists == nil {
		return math.Inf(1)
	}
	near := make([]float64, lists.N)
	for i := range near {
		near[i] = lists.Dist[i*lists.K]
	}
	slices.Sort(near)
	return near[len(near)*99/100]
}

// writeModel writes the model, if one was asked for.
func (r *run) writeModel(w *outputs, l *labelled) error {
	o := w.byRole["model"]
	if o == nil {
		return nil
	}
	m, err := r.newModel(l)
	if err != nil {
		return err
	}
	_, err = m.WriteTo(o)
	return err
}

// readModel reads a saved run.
func readModel(path string) (*extend.Model, error) {
	b, err := readFile(path)
	if err != nil {
		return nil, err
	}
	m, err := extend.Read(b)
	if err != nil {
		return nil, &fault.Error{Exit: fault.Input, File: path, Message: err.Error(), Hint: "save it again with pinfill label --model", Err: err}
	}
	return m, nil
}

// readFile reads a whole file that the user named.
func readFile(path string) ([]byte, error) {
	f, err := os.Open(path)
	if err == nil {
		defer f.Close()
		var b []byte
		if b, err = io.ReadAll(f); err == nil {
			return b, nil
		}
	}
	return nil, &fault.Error{Exit: fault.File, Code: "S16", File: path, Message: "cannot read: " + reason(err), Err: err}
}
