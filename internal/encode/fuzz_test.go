package encode

import (
	"context"
	"encoding/csv"
	"errors"
	"slices"
	"strings"
	"testing"

	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// FuzzJoin joins labels to rows by id, both drawn from any text, and compares with a map.
func FuzzJoin(f *testing.F) {
	f.Add("a\nb\nc", "a=1\nb=2")
	f.Add("a\nb\na", "a=x\nb=y")
	f.Add("a\nb", "a=x\nc=y")
	f.Add("a\nb\n\xc3\xa9", "b=x\na= \n\xc3\xa9=y")
	f.Add("1\n01\n1.0\n +1", "1=x\n01=y\n1.0=x")
	f.Add("a,\"b\n\"\"\nNA", "NA=x\na,\"b=y\n\"\"=")
	f.Fuzz(func(t *testing.T, ids, labels string) {
		if len(ids)+len(labels) > 400 {
			return
		}
		rows := strings.Split(ids, "\n")
		first := [][]string{{"id", "x"}}
		for _, id := range rows {
			first = append(first, []string{id, "1"})
		}
		second := [][]string{{"id", "kind"}}
		for line := range strings.SplitSeq(labels, "\n") {
			id, label, _ := strings.Cut(line, "=")
			second = append(second, []string{id, label})
		}
		a, okA := asTable(t, first)
		b, okB := asTable(t, second)
		if !okA || !okB {
			return
		}
		got, _, err := JoinLabels(a, b, JoinOptions{LabelOptions: LabelOptions{Column: 1, Task: Classes, AllowConstant: true}, LabelName: "kind"})

		want := map[int]string{}
		refused := repeats(a) || repeats(b)
		for r := range b.Rows() {
			label := b.Text(r, 1)
			if strings.TrimSpace(label) == "" {
				continue
			}
			row := slices.IndexFunc(rowIDs(a), func(id string) bool { return id == b.Text(r, 0) })
			refused = refused || row < 0
			want[row] = label
		}
		var e *fault.Error
		switch {
		case refused:
			if got != nil || code(err) != "L12" {
				t.Fatalf("%q joined to %q: %v, not refused with L12", labels, ids, err)
			}
		case len(want) == 0:
			if got != nil || code(err) != "L01" {
				t.Fatalf("%q joined to %q: %v, not refused with L01", labels, ids, err)
			}
		case err != nil:
			if code(err) == "" && !errors.As(err, &e) {
				t.Fatalf("%q joined to %q: %v is no refusal", labels, ids, err)
			}
		default:
			if len(got.Rows) != len(want) || !slices.IsSorted(got.Rows) {
				t.Fatalf("%q joined to %q labels rows %v, not %v", labels, ids, got.Rows, want)
			}
			for k, row := range got.Rows {
				if string(got.Text[k]) != want[row] || got.Names[got.Class[k]] != want[row] {
					t.Fatalf("%q joined to %q: row %d has %q, class %q", labels, ids, row, got.Text[k], got.Names[got.Class[k]])
				}
			}
		}
	})
}

func asTable(t *testing.T, rows [][]string) (*table.Table, bool) {
	var b strings.Builder
	w := csv.NewWriter(&b)
	if err := w.WriteAll(rows); err != nil {
		t.Fatal(err)
	}
	tab, err := table.Read(context.Background(), "-", strings.NewReader(b.String()), table.Options{Delimiter: ',', Workers: 1})
	return tab, err == nil
}

func rowIDs(t *table.Table) []string {
	ids := make([]string, t.Rows())
	for r := range ids {
		ids[r] = t.Text(r, 0)
	}
	return ids
}

func repeats(t *table.Table) bool {
	ids := rowIDs(t)
	slices.Sort(ids)
	return len(slices.Compact(ids)) < t.Rows()
}

// code is the catalogue code of the first refusal in err.
func code(err error) string {
	var l *fault.List
	var e *fault.Error
	switch {
	case errors.As(err, &l) && len(l.First) > 0:
		return l.First[0].Code
	case errors.As(err, &e):
		return e.Code
	}
	return ""
}
