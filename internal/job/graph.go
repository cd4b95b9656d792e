package job

import (
	"context"

	"pinfill/internal/graph"
	"pinfill/internal/table"
)

// Format is a file format for the neighbour graph.
type Format string

// Formats of the graph command.
const (
	FormatEdges        Format = "edges" // from,to,weight
	FormatMatrixMarket Format = "mtx"   // coordinate real symmetric
)

// Graph writes the neighbour graph with its weights. Identical rows are one vertex, named by their first id in order,
// or by their first row number when there are no ids.
func Graph(ctx context.Context, o *Options, format Format) error {
	r, ctx, cancel := start(ctx, o)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	d, err := r.loadUnlabelled(ctx)
	if err != nil {
		return err
	}
	n, err := r.findNetwork(ctx, d)
	if err != nil {
		return err
	}
	s := r.plainSetting(n)
	return r.stage(ctx, "write", func() error {
		weights, err := r.weighted(n, s.Neighbors, s.Kernel, s.Bandwidth)
		if err != nil {
			return err
		}
		out := w.byRole["table"]
		var raised int
		if format == FormatMatrixMarket {
			raised, err = graph.WriteMatrixMarket(out, weights, nil, r.Workers)
		} else {
			names := r.vertexNames(d, n)
			if _, err = out.Write([]byte("from,to,weight\n")); err == nil {
				raised, err = graph.WriteEdgeList(out, weights, func(dst []byte, v int32) []byte { return append(dst, names(v)...) }, ',', r.Workers)
			}
		}
		if err != nil {
			return err
		}
		if raised > 0 {
			r.warnf("P07", "%d weights are below the smallest float64 and were written as 5e-324", raised)
		}
		r.note("%d vertices, %d edges, weights from exp(%.4g) to exp(%.4g)", weights.N, weights.NNZ()/2, lowest(weights.Val), highest(weights.Val))
		return r.finish(w, r.newRecord("graph", d))
	})
}

// loadUnlabelled reads the table and its features; labels are not looked at, but their column is no feature.
func (r *run) loadUnlabelled(ctx context.Context) (*data, error) {
	d := &data{label: -1, id: -1}
	err := r.stage(ctx, "read", func() error {
		var err error
		if d.table, err = r.readTable(ctx, "table", r.Table, d); err != nil {
			return err
		}
		if r.Label != "" && r.LabelsFile == "" {
			if d.label, err = column(d.table, r.Label, "label"); err != nil {
				return err
			}
		}
		if r.ID != "" {
			d.id, err = column(d.table, r.ID, "id")
		}
		return err
	})
	if err != nil || r.Edges != "" {
		return d, err
	}
	return d, r.loadFeatures(ctx, d)
}

// namedBy gives each vertex the row it is named by: the first of its rows by id, or by position without ids.
func (r *run) namedBy(d *data, v *vertices) []int32 {
	first := make([]int32, v.n)
	for i := range first {
		first[i] = -1
	}
	for row, x := range v.of {
		if x < 0 {
			continue
		}
		if f := first[x]; f < 0 || (d.id >= 0 && d.table.Text(row, d.id) < d.table.Text(int(f), d.id)) {
			first[x] = int32(row)
		}
	}
	return first
}

// vertexNames gives each vertex a name quoted for CSV.
func (r *run) vertexNames(d *data, n *network) func(int32) []byte {
	first := r.namedBy(d, n.vertices)
	return func(v int32) []byte { return table.AppendCell(nil, []byte(d.rowName(int(first[v]))), ',') }
}

func lowest(v []float64) float64 {
	var m float64
	for _, x := range v {
		m = min(m, x)
	}
	return m
}

func highest(v []float64) float64 {
	m := v[0]
	for _, x := range v {
		m = max(m, x)
	}
	return m
}
