package encode

import (
	"context"
	"fmt"
	"math"
	"path"
	"slices"
	"strings"

	"pinfill/internal/fault"
	"pinfill/internal/points"
	"pinfill/internal/table"
)

// FeatureOptions say which columns are features and how their cells are read.
type FeatureOptions struct {
	Reserved []int    // columns with another role: label, id, group, cost
	Features []string // names or * patterns; empty means every numeric column
	Ignore   []string // names or * patterns
	Missing  Missing
	Decimal  byte
	Workers  int
}

// Features are the chosen columns and their numbers, one matrix row a table row. Rows with Out set have a missing
// feature and stay out of the graph; their numbers are zero.
type Features struct {
	Columns []int
	Names   []string
	Matrix  *points.Matrix
	Out     []bool    // nil when every row is in
	Median  []float64 // per column, when missing cells were filled; nil otherwise
}

// ReadFeatures chooses the feature columns and reads their numbers.
func ReadFeatures(ctx context.Context, t *table.Table, o FeatureOptions) (*Features, []Warning, error) {
	cols, err := featureColumns(t, o)
	if err != nil {
		return nil, nil, err
	}
	nums, err := t.Numbers(ctx, cols, table.NumberOptions{Decimal: o.Decimal, Workers: o.Workers})
	if err != nil {
		return nil, nil, err
	}
	f := &Features{Columns: cols, Matrix: &points.Matrix{N: t.Rows(), D: len(cols), Data: nums.Data}}
	for _, c := range cols {
		f.Names = append(f.Names, t.Header(c))
	}
	warnings := numberWarnings(nums)
	if nums.Missing == 0 && o.Missing != MissingMedian { // medians are kept for rows to come
		return f, warnings, nil
	}
	w, err := f.fillMissing(t, o)
	return f, append(warnings, w...), err
}

func numberWarnings(n *table.Numbers) []Warning {
	var w []Warning
	if n.Trimmed > 0 {
		w = append(w, Warning{"C30", fmt.Sprintf("spaces round %d numbers were trimmed", n.Trimmed)})
	}
	if n.BigIntegers > 0 {
		w = append(w, Warning{"C29", fmt.Sprintf("%d whole numbers exceed 2^53 and lose digits; name an id column with --id", n.BigIntegers)})
	}
	return w
}

// featureColumns gives the feature columns in table order.
func featureColumns(t *table.Table, o FeatureOptions) ([]int, error) {
	reserved := func(c int) bool { return slices.Contains(o.Reserved, c) }
	ignored, err := matchColumns(t, o.Ignore, "ignore")
	if err != nil {
		return nil, err
	}
	if len(o.Features) > 0 {
		chosen, err := matchColumns(t, o.Features, "features")
		if err != nil {
			return nil, err
		}
		var cols []int
		for c := range t.Columns() {
			if chosen[c] && !ignored[c] && !reserved(c) {
				cols = append(cols, c)
			}
		}
		if len(cols) == 0 {
			return nil, fault.Usagef("P09", "--features and --ignore leave no feature column")
		}
		return cols, nil
	}
	var cols []int
	var refused fault.List
	for c := range t.Columns() {
		if reserved(c) || ignored[c] {
			continue
		}
		if row := t.FirstNonNumber(c); row >= 0 {
			refused.Add(textColumn(t, row, c, o))
			continue
		}
		cols = append(cols, c)
	}
	if err := refused.Err(); err != nil {
		return nil, err
	}
	if len(cols) == 0 {
		return nil, fault.Inputf("C25", "%s: no numeric feature column is left beside the label and id", fault.Name(t.Name()))
	}
	return cols, nil
}

// textColumn refuses a column that was not named and is not numeric. The reader's own diagnosis is kept where the
// cell looks like a damaged number (decimal comma, thousands, ...); otherwise the column is text.
func textColumn(t *table.Table, row, c int, o FeatureOptions) *fault.Error {
	if e := t.NumberFault(row, c, o.Decimal); e != nil && e.Code != "C25" {
		return e
	}
	return t.Fault(row, c, "C25", "a text column cannot be a feature", "leave it out with --ignore="+t.Header(c)+", or name it with --id")
}

// matchColumns marks the columns that names or * patterns stand for. A name may also be #N, the N-th column.
func matchColumns(t *table.Table, names []string, flag string) (map[int]bool, error) {
	set := map[int]bool{}
	for _, name := range names {
		if c, ok := t.ColumnIndex(name); ok {
			set[c] = true
			continue
		}
		hit := false
		if strings.ContainsAny(name, "*?[") {
			for c := range t.Columns() {
				if ok, err := path.Match(name, t.Header(c)); err == nil && ok {
					set[c], hit = true, true
				}
			}
		}
		if !hit {
			return nil, NoColumn(t, name, flag)
		}
	}
	return set, nil
}

// NoColumn refuses a column name that the table does not have, with the nearest one it has.
func NoColumn(t *table.Table, name, flag string) *fault.Error {
	e := fault.Usagef("L04", "--%s: %s has no column %s", flag, fault.Name(t.Name()), fault.Quote(name))
	if near, ok := Nearest(name, t.Headers()); ok {
		e.Hint = "did you mean " + fault.Quote(near) + "?"
	} else if heads := t.Headers(); len(heads) <= 12 {
		e.Hint = "it has " + quoteAll(heads)
	}
	return e
}

func quoteAll(names []string) string {
	q := make([]string, len(names))
	for i, n := range names {
		q[i] = fault.Quote(n)
	}
	return strings.Join(q, ", ")
}

// fillMissing treats the missing cells, which stand as NaN in the matrix.
func (f *Features) fillMissing(t *table.Table, o FeatureOptions) ([]Warning, error) {
	m := f.Matrix
	switch o.Missing {
	case MissingMedian:
		return f.putMedians(t)
	case MissingDrop:
		f.Out = make([]bool, m.N)
		rows := 0
		for i := range m.N {
			if slices.ContainsFunc(m.Row(i), math.IsNaN) {
				f.Out[i] = true
				clear(m.Row(i))
				rows++
			}
		}
		if rows == m.N {
			return nil, fault.Inputf("G08", "%s: every row misses a feature", fault.Name(t.Name()))
		}
		return []Warning{{"G08", fmt.Sprintf("%d rows miss a feature and stay blank", rows)}}, nil
	}
	var refused fault.List
	for i := range m.N {
		for j, v := range m.Row(i) {
			if math.IsNaN(v) {
				refused.Add(t.Fault(i, f.Columns[j], "G08", "missing feature", "choose --missing=median or --missing=drop, or leave the column out with --ignore="+f.Names[j]))
			}
		}
	}
	return nil, refused.Err()
}

// putMedians puts each column's median of the cells that are there.
func (f *Features) putMedians(t *table.Table) ([]Warning, error) {
	m := f.Matrix
	f.Median = make([]float64, m.D)
	var w []Warning
	for j := range m.D {
		var there []float64
		for i := range m.N {
			if v := m.Data[i*m.D+j]; !math.IsNaN(v) {
				there = append(there, v)
			}
		}
		if len(there) == 0 {
			return nil, fault.Inputf("G08", "%s: column %s has no value at all; leave it out with --ignore=%s", fault.Name(t.Name()), fault.Quote(f.Names[j]), f.Names[j])
		}
		slices.Sort(there)
		f.Median[j] = float64(there[len(there)/2]/2) + float64(there[(len(there)-1)/2]/2)
		if filled := m.N - len(there); filled > 0 {
			for i := range m.N {
				if math.IsNaN(m.Data[i*m.D+j]) {
					m.Data[i*m.D+j] = f.Median[j]
				}
			}
			w = append(w, Warning{"G08", fmt.Sprintf("column %s: %d missing cells took the median %v", fault.Quote(f.Names[j]), filled, f.Median[j])})
		}
	}
	return w, nil
}
