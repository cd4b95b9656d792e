package job

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"sort"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/points"
)

// vertices are the graph's vertices and what is known about them: identical rows are one vertex.
type vertices struct {
	n     int
	of    []int32       // table row -> vertex, or -1 for a row that stays out
	space *points.Space // nil when the graph is given
	names []string      // id of each vertex; only when the graph is given

	fixed   []int32     // vertices that carry a label, increasing
	targets [][]float64 // one slice a class (1 for its labels, 0 for others', a share where labels conflict), or one of numbers
	at      [][]int     // for each fixed vertex its labels, indices into labels.Rows
}

// inRows gives the points.Matrix of the rows that are in, and their table rows (nil when all are).
func inRows(f *encode.Features) (*points.Matrix, []int) {
	if f.Out == nil {
		return f.Matrix, nil
	}
	m := &points.Matrix{D: f.Matrix.D}
	var rows []int
	for i, out := range f.Out {
		if !out {
			rows = append(rows, i)
			m.Data = append(m.Data, f.Matrix.Row(i)...)
		}
	}
	m.N = len(rows)
	return m, rows
}

// findVertices scales the features, merges identical rows and puts the vertices in their canonical order. The raw
// numbers are let go afterwards.
func (r *run) findVertices(ctx context.Context, d *data) (*vertices, error) {
	v := &vertices{}
	err := r.stage(ctx, "points", func() error {
		raw, rows := inRows(d.features)
		var err error
		v.space, err = points.Prepare(ctx, raw, points.Options{Scale: r.Scale, Metric: r.Metric, Workers: r.Workers})
		if err != nil {
			return r.pointsFault(d, rows, err)
		}
		v.n = v.space.Points.N
		v.of = v.space.Vertex
		if rows != nil {
			v.of = make([]int32, d.table.Rows())
			for i := range v.of {
				v.of[i] = -1
			}
			for k, row := range rows {
				v.of[row] = v.space.Vertex[k]
			}
		}
		d.features.Matrix = nil
		return nil
	})
	if err != nil {
		return nil, err
	}
	r.pointWarnings(d, v.space)
	return v, nil
}

// pointsFault says which row and flag a refusal of points.Prepare is about.
func (r *run) pointsFault(d *data, rows []int, err error) error {
	var bad *points.RowError
	switch {
	case errors.Is(err, points.ErrIdentical):
		return fault.Inputf("G01", "%s: all %d rows are identical in the feature columns; name others with --features", fault.Name(r.Table), d.table.Rows())
	case errors.As(err, &bad):
		row := bad.Row
		if rows != nil {
			row = rows[row]
		}
		e := d.table.Fault(row, d.features.Columns[0], "G09", bad.Err.Error(), "leave the row or the column out, or choose another --scale or --metric")
		e.Name, e.Value = "", ""
		return e
	}
	return err
}

// dominating is the share of the squared distance above which one column is said to dominate it.
const dominating = 0.8

func (r *run) pointWarnings(d *data, s *points.Space) {
	for _, c := range s.Constant {
		r.warnf("G03", "column %s is constant and was dropped", fault.Quote(d.features.Names[c]))
	}
	if len(s.Share) > 1 {
		for j, share := range s.Share {
			if share > dominating {
				r.warnf("G04", "column %s makes up %.0f%% of the distance; choose another --scale or --features", fault.Quote(d.features.Names[s.Scaling.Columns[j]]), 100*share)
			}
		}
	}
}

// namedVertices orders the ids of a given graph as text, so that vertices do not depend on row order.
func (r *run) namedVertices(d *data) (*vertices, error) {
	t := d.table
	if _, err := encode.RowsByID(t, d.id, "L12"); err != nil {
		return nil, err
	}
	v := &vertices{n: t.Rows(), of: make([]int32, t.Rows()), names: make([]string, t.Rows())}
	order := make([]int32, t.Rows())
	for row := range order {
		order[row] = int32(row)
	}
	sort.Slice(order, func(a, b int) bool { return t.Text(int(order[a]), d.id) < t.Text(int(order[b]), d.id) })
	for k, row := range order {
		v.of[row] = int32(k)
		v.names[k] = t.Text(int(row), d.id)
	}
	return v, nil
}

// placeLabels puts the labels on their vertices. Identical rows with different labels are refused unless --conflicts
// says how to settle them, or --tether gives each label its own say.
func (r *run) placeLabels(d *data, v *vertices) error {
	l := d.labels
	on := map[int32][]int{}
	lost := 0
	for k, row := range l.Rows {
		if x := v.of[row]; x >= 0 {
			on[x] = append(on[x], k)
		} else {
			lost++
		}
	}
	if lost > 0 {
		r.warnf("G08", "%d labelled rows miss a feature and cannot help", lost)
	}
	if len(on) == 0 {
		return fault.Inputf("L01", "%s: no labelled row has all its features", fault.Name(r.Table))
	}
	for x := range on {
		v.fixed = append(v.fixed, x)
	}
	slices.Sort(v.fixed)
	var refused fault.List
	settled := 0
	v.at = make([][]int, len(v.fixed))
	for f, x := range v.fixed {
		ks := on[x]
		sort.Slice(ks, func(a, b int) bool { return labelLess(l, ks[a], ks[b]) }) // not by row order
		v.at[f] = ks
		if !labelLess(l, ks[0], ks[len(ks)-1]) {
			continue // they agree
		}
		if r.Conflicts == encode.ConflictsStop && r.Tether == 0 {
			refused.Add(conflictFault(d, ks))
		}
		settled++
	}
	if err := refused.Err(); err != nil {
		return err
	}
	if settled > 0 {
		r.warnf("L11", "%d groups of identical rows carry different labels; settled by %s", settled, r.conflictRule())
	}
	if l.Task == encode.Classes {
		v.targets = classTargets(l, v.at, r.Conflicts)
	} else {
		v.targets = [][]float64{numberTargets(l, v.at)}
	}
	return nil
}

func (r *run) conflictRule() string {
	if r.Conflicts == encode.ConflictsStop {
		return "the tethers"
	}
	return string(r.Conflicts)
}

func labelLess(l *encode.Labels, a, b int) bool {
	if l.Task == encode.Classes {
		return l.Class[a] < l.Class[b]
	}
	return l.Value[a] < l.Value[b]
}

func conflictFault(d *data, ks []int) *fault.Error {
	a, b := d.labels.Rows[ks[0]], d.labels.Rows[ks[len(ks)-1]]
	if a > b {
		a, b = b, a
	}
	col := max(d.label, 0)
	line, _ := d.table.At(a, col)
	e := d.table.Fault(b, col, "L11", fmt.Sprintf("line %d is identical in the features and has another label", line), "settle it with --conflicts=majority or --conflicts=mean")
	return e
}

// classTargets gives each fixed vertex its indicator, or under mean the share of its labels. A tied majority goes to
// the first class in name order.
func classTargets(l *encode.Labels, at [][]int, rule encode.Conflicts) [][]float64 {
	targets := make([][]float64, len(l.Names))
	for c := range targets {
		targets[c] = make([]float64, len(at))
	}
	count := make([]int, len(l.Names))
	for f, ks := range at {
		clear(count)
		for _, k := range ks {
			count[l.Class[k]]++
		}
		if rule == encode.ConflictsMajority {
			best := 0
			for c, n := range count {
				if n > count[best] {
					best = c
				}
			}
			targets[best][f] = 1
			continue
		}
		for c, n := range count {
			targets[c][f] = float64(n) / float64(len(ks))
		}
	}
	return targets
}

// numberTargets gives each fixed vertex the mean of its labels, the label itself where they agree. Majority means the
// most frequent value's own mean here too: numbers rarely repeat, so both rules are the mean.
func numberTargets(l *encode.Labels, at [][]int) []float64 {
	y := make([]float64, len(at))
	for f, ks := range at {
		lo, hi := l.Value[ks[0]], l.Value[ks[len(ks)-1]]
		if lo == hi {
			y[f] = lo
			continue
		}
		var sum float64 // of differences from the lowest, so that large offsets cost no digits
		for _, k := range ks {
			sum += l.Value[k] - lo
		}
		y[f] = lo + sum/float64(len(ks))
	}
	return y
}
