package job

import (
	"context"
	"fmt"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// data is what was read: the table, its labels and its features.
type data struct {
	table       *table.Table
	labelsTable *table.Table // nil when labels stand in the table itself
	label       int          // label column of table, or -1
	id          int          // id column of table, or -1
	labels      *encode.Labels
	features    *encode.Features // nil when the graph is given
	group       []string         // group of each labelled row, or nil
	inputs      []FileSum
	memory      int64 // estimated peak, bytes; 0 for a given graph
}

// readTable reads one input and notes its checksum.
func (r *run) readTable(ctx context.Context, role, name string, d *data) (*table.Table, error) {
	t, err := table.Read(ctx, name, r.Stdin, table.Options{
		Delimiter: r.Delimiter, Decimal: r.Decimal, NA: r.NA, NoHeader: r.NoHeader,
		MaxField: r.MaxField, MaxColumns: r.MaxColumns, Memory: r.MemoryLimit, Workers: r.Workers,
	})
	if err != nil {
		return nil, err
	}
	d.inputs = append(d.inputs, sumOf(role, t))
	return t, nil
}

func sumOf(role string, t *table.Table) FileSum {
	return FileSum{Role: role, Name: t.Name(), Bytes: t.Bytes(), SHA256: fmt.Sprintf("%x", t.SHA256())}
}

// load reads the table, the labels and, unless the graph is given, the features.
func (r *run) load(ctx context.Context) (*data, error) {
	d := &data{label: -1, id: -1}
	err := r.stage(ctx, "read", func() error {
		var err error
		d.table, err = r.readTable(ctx, "table", r.Table, d)
		return err
	})
	if err != nil {
		return nil, err
	}
	err = r.stage(ctx, "labels", func() error { return r.loadLabels(ctx, d) })
	if err != nil {
		return nil, err
	}
	if r.Edges != "" {
		return d, nil
	}
	return d, r.loadFeatures(ctx, d)
}

// loadFeatures chooses the feature columns and reads their numbers.
func (r *run) loadFeatures(ctx context.Context, d *data) error {
	return r.stage(ctx, "features", func() error {
		var w []encode.Warning
		var err error
		d.features, w, err = encode.ReadFeatures(ctx, d.table, encode.FeatureOptions{
			Reserved: r.reserved(d), Features: r.Features, Ignore: r.Ignore, Missing: r.Missing, Decimal: r.Decimal, Workers: r.Workers,
		})
		r.warn(w...)
		return err
	})
}

// reserved are the columns that cannot be features because they have another role.
func (r *run) reserved(d *data) []int {
	cols := []int{}
	for _, name := range []string{r.Label, r.ID, r.Group, r.Cost} {
		if c, ok := d.table.ColumnIndex(name); ok && name != "" {
			cols = append(cols, c)
		}
	}
	return cols
}

// column finds a column that a flag names.
func column(t *table.Table, name, flag string) (int, error) {
	c, ok := t.ColumnIndex(name)
	if !ok {
		return -1, encode.NoColumn(t, name, flag)
	}
	return c, nil
}

func (r *run) loadLabels(ctx context.Context, d *data) (err error) {
	if r.ID != "" {
		if d.id, err = column(d.table, r.ID, "id"); err != nil {
			return err
		}
	}
	o := encode.LabelOptions{Task: r.Task, Decimal: r.Decimal, AllowConstant: r.AllowConstant, Strict: r.Strict, NAHint: len(r.NA) == 0}
	var w []encode.Warning
	if r.LabelsFile == "" {
		if d.label, err = column(d.table, r.Label, "label"); err != nil {
			return err
		}
		o.Column = d.label
		d.labels, w, err = encode.ReadLabels(d.table, o)
	} else {
		if d.labelsTable, err = r.readTable(ctx, "labels", r.LabelsFile, d); err != nil {
			return err
		}
		if o.Column, err = column(d.labelsTable, r.Label, "label"); err != nil {
			return err
		}
		j := encode.JoinOptions{LabelOptions: o, TableID: d.id, LabelName: r.Label}
		if j.LabelsID, err = column(d.labelsTable, r.ID, "id"); err != nil {
			return err
		}
		d.labels, w, err = encode.JoinLabels(d.table, d.labelsTable, j)
	}
	if err != nil {
		return err
	}
	r.warn(w...)
	if len(d.labels.Rows) == d.table.Rows() {
		r.warnf("L03", "all %d rows carry a label: nothing to fill", d.table.Rows())
	}
	if err := r.checkShares(d.labels); err != nil {
		return err
	}
	return r.loadGroups(d)
}

// checkShares refuses --balance shares for classes that the labels do not have, or that miss one.
func (r *run) checkShares(l *encode.Labels) error {
	if r.Balance.Mode != "shares" {
		return nil
	}
	if l.Task != encode.Classes {
		return fault.Usagef("P09", "--balance has class shares but the labels are numbers")
	}
	for _, name := range l.Names {
		if _, ok := r.Balance.Shares[name]; !ok {
			return fault.Usagef("P09", "--balance gives no share to class %s", fault.Quote(name))
		}
	}
	if len(r.Balance.Shares) != len(l.Names) {
		for name := range r.Balance.Shares {
			if near, ok := encode.Nearest(name, l.Names); ok && near != name {
				return fault.Usagef("P09", "--balance names classes that no row carries; did you mean %s?", fault.Quote(near))
			}
		}
		return fault.Usagef("P09", "--balance names %d classes, the labels have %d", len(r.Balance.Shares), len(l.Names))
	}
	return nil
}

// loadGroups reads the group of each labelled row.
func (r *run) loadGroups(d *data) error {
	if r.Group == "" {
		return nil
	}
	c, err := column(d.table, r.Group, "group")
	if err != nil {
		return err
	}
	d.group = make([]string, len(d.labels.Rows))
	for k, row := range d.labels.Rows {
		d.group[k] = d.table.Text(row, c)
	}
	return nil
}

// givenText gives the given label's own bytes, by table row.
func (d *data) givenText() func(row int) []byte {
	text := make(map[int][]byte, len(d.labels.Rows))
	for k, row := range d.labels.Rows {
		text[row] = d.labels.Text[k]
	}
	return func(row int) []byte { return text[row] }
}
