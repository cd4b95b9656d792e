package job

import (
	"context"
	"math"
	"strconv"

	"pinfill/internal/advise"
	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// NextOptions are the options of next.
type NextOptions struct {
	*Options
	Count   int
	Exclude string // table of ids that are not to be named, or ""
}

// Next writes the unlabelled rows worth labelling next, in order.
func Next(ctx context.Context, n *NextOptions) error {
	r, ctx, cancel := start(ctx, n.Options)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	if r.Unreachable == Bridge {
		r.Unreachable = Blank // a part of the data without a label is what should be labelled first, not bridged
	}
	l, err := r.solved(ctx, "next")
	if err != nil {
		return err
	}
	var picks []advise.Pick
	err = r.stage(ctx, "next", func() error {
		p, err := r.nextProblem(ctx, l, n)
		if err != nil {
			return err
		}
		picks, err = advise.Next(ctx, *p)
		return err
	})
	if err != nil {
		return err
	}
	r.fillRecord(l)
	err = r.stage(ctx, "write", func() error {
		if err := r.writePicks(w.byRole["table"], l, picks); err != nil {
			return err
		}
		return r.finish(w, l.record)
	})
	if err != nil {
		return err
	}
	if len(picks) < n.Count {
		r.warnf("", "only %d rows are left to name", len(picks))
	}
	r.note("%s: %d rows to label next; labels chosen this way are no random sample: pass --drawn chosen when you use them", r.Table, len(picks))
	return nil
}

// nextProblem describes the graph and the doubt at each vertex.
func (r *run) nextProblem(ctx context.Context, l *labelled, n *NextOptions) (*advise.NextProblem, error) {
	d, f, v := l.data, l.field, l.network.vertices
	p := &advise.NextProblem{Labelled: v.fixed, Rows: make([]float64, f.n), Count: n.Count, Workers: r.Workers, Exclude: make([]bool, f.n)}
	g, err := r.weighted(l.network, l.setting.Neighbors, l.setting.Kernel, l.setting.Bandwidth)
	if err != nil {
		return nil, err
	}
	p.Conductance = choose.Conductances(g, r.Energy)
	for _, x := range v.of {
		if x >= 0 {
			p.Rows[x]++
		}
	}
	if p.Doubt, err = r.doubtAt(ctx, l); err != nil {
		return nil, err
	}
	if n.Exclude != "" {
		if err := r.exclude(ctx, d, v, n.Exclude, p.Exclude); err != nil {
			return nil, err
		}
	}
	if r.Cost != "" {
		if p.Cost, err = r.costs(ctx, d, v); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// doubtAt is how little is known of each vertex: for classes how near the two leading scores are, for numbers the
// spread of the labels around it over the largest spread.
func (r *run) doubtAt(ctx context.Context, l *labelled) ([]float64, error) {
	f := l.field
	doubt := make([]float64, f.n)
	if l.data.labels.Task == encode.Numbers {
		spread := []float64(nil)
		if l.keep != nil {
			spread = l.keep.spread
		}
		if spread == nil {
			return nil, nil
		}
		var top float64
		for _, s := range spread {
			if s > top {
				top = s
			}
		}
		if top == 0 {
			return nil, nil
		}
		for x, s := range spread {
			doubt[x] = 1
			if !math.IsNaN(s) {
				doubt[x] = s / top
			}
		}
		return doubt, nil
	}
	w := l.chosen.Weights
	for x := range doubt {
		var first, second float64
		for c := range f.scores {
			s := w[c] * f.scores[c][x]
			switch {
			case s > first:
				first, second = s, first
			case s > second:
				second = s
			}
		}
		doubt[x] = 1
		if first > 0 {
			doubt[x] = second / first
		}
	}
	return doubt, nil
}

// exclude marks the vertices of the rows that a table of ids names.
func (r *run) exclude(ctx context.Context, d *data, v *vertices, name string, out []bool) error {
	t, err := r.readTable(ctx, "exclude", name, d)
	if err != nil {
		return err
	}
	c, err := column(t, r.ID, "id")
	if err != nil {
		return err
	}
	rows, err := encode.RowsByID(d.table, d.id, "L12")
	if err != nil {
		return err
	}
	for row := range t.Rows() {
		if at, ok := rows[t.Text(row, c)]; ok && v.of[at] >= 0 {
			out[v.of[at]] = true
		}
	}
	return nil
}

// costs gives the cost of each vertex: that of its cheapest row.
func (r *run) costs(ctx context.Context, d *data, v *vertices) ([]float64, error) {
	c, err := column(d.table, r.Cost, "cost")
	if err != nil {
		return nil, err
	}
	nums, err := d.table.Numbers(ctx, []int{c}, table.NumberOptions{Decimal: r.Decimal, Workers: r.Workers})
	if err != nil {
		return nil, err
	}
	cost := make([]float64, v.n)
	for i := range cost {
		cost[i] = math.Inf(1)
	}
	var refused fault.List
	for row, x := range v.of {
		if x < 0 {
			continue
		}
		if k := nums.Data[row]; k > 0 {
			cost[x] = min(cost[x], k)
		} else {
			refused.Add(d.table.Fault(row, c, "G08", "a cost must be a number greater than 0", "mend the cell"))
		}
	}
	return cost, refused.Err()
}

// writePicks writes one row a pick, named by the first row of its vertex that carries no label.
func (r *run) writePicks(out *table.Output, l *labelled, picks []advise.Pick) error {
	d := l.data
	given := make(map[int]bool, len(d.labels.Rows))
	for _, row := range d.labels.Rows {
		given[row] = true
	}
	first := r.namedBy(d, l.network.vertices)
	w := table.NewWriter(out, ',')
	head := []string{"rank", "row", "now", "expected_gain", "rows_that_follow", "reason"}
	if d.id >= 0 {
		head = append([]string{r.ID}, head...)
	}
	if err := w.Row(head...); err != nil {
		return err
	}
	for i, p := range picks {
		row := int(first[p.Vertex])
		now := ""
		if res := l.result; res.Origin[row] != encode.OriginBlank && !given[row] {
			if res.Task == encode.Classes {
				now = res.Names[res.Class[row]]
			} else {
				now = string(encode.AppendNumber(nil, res.Value[row]))
			}
		}
		cells := []string{strconv.Itoa(i + 1), strconv.Itoa(row + 1), now, numberText(p.Gain), numberText(math.Round(p.Follows)), p.Sentence()}
		if d.id >= 0 {
			cells = append([]string{d.table.Text(row, d.id)}, cells...)
		}
		if err := w.Row(cells...); err != nil {
			return err
		}
	}
	return w.Flush()
}
