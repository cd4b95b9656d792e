package encode

import (
	"fmt"
	"strings"

	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// JoinOptions say how a second table of labels meets the first.
type JoinOptions struct {
	LabelOptions        // Column is the label column of the second table
	TableID      int    // id column of the first table
	LabelsID     int    // id column of the second table
	LabelName    string // for messages
}

// RowsByID maps each id of a column to its row and refuses an id that stands twice.
func RowsByID(t *table.Table, col int, code string) (map[string]int, error) {
	rows := make(map[string]int, t.Rows())
	var refused fault.List
	for row := range t.Rows() {
		id := t.Text(row, col)
		if first, ok := rows[id]; ok {
			line, _ := t.At(first, col)
			refused.Add(t.Fault(row, col, code, fmt.Sprintf("id stands on line %d already", line), "make ids unique, or choose another column with --id"))
			continue
		}
		rows[id] = row
	}
	return rows, refused.Err()
}

// JoinLabels reads labels from a second table, joined on the id. An id that the first table does not have, or that
// either table has twice, is refused with the lines of both.
func JoinLabels(t, labels *table.Table, o JoinOptions) (*Labels, []Warning, error) {
	rows, err := RowsByID(t, o.TableID, "L12")
	if err != nil {
		return nil, nil, err
	}
	if _, err := RowsByID(labels, o.LabelsID, "L12"); err != nil {
		return nil, nil, err
	}
	source := map[int]int{} // row of t -> row of labels
	var refused fault.List
	for r := range labels.Rows() {
		if labels.Missing(r, o.Column) || strings.TrimSpace(labels.Text(r, o.Column)) == "" {
			continue
		}
		row, ok := rows[labels.Text(r, o.LabelsID)]
		if !ok {
			refused.Add(labels.Fault(r, o.LabelsID, "L12", "no row of "+fault.Name(t.Name())+" has this id", "check the ids of both tables"))
			continue
		}
		source[row] = r
	}
	if err := refused.Err(); err != nil {
		return nil, nil, err
	}
	l := &Labels{}
	for row := range t.Rows() {
		if _, ok := source[row]; ok {
			l.Rows = append(l.Rows, row)
		}
	}
	if len(l.Rows) == 0 {
		return nil, nil, &fault.Error{
			Exit: fault.Input, Code: "L01", File: labels.Name(), Name: o.LabelName,
			Message: fmt.Sprintf("0 of %d rows carry a label", labels.Rows()), Hint: "name the label column with --label",
		}
	}
	w, err := l.read(func(k int) (*table.Table, int, int) { return labels, source[l.Rows[k]], o.Column }, o.LabelOptions)
	return l, w, err
}
