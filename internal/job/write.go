package job

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// outputs are the files of one run: all of them appear, or none.
type outputs struct {
	set    table.Outputs
	byRole map[string]*table.Output
}

// openOutputs checks every file the run will write before any work is done, so that a folder that is missing or an
// output that is an input is refused at once, and opens them.
func (r *run) openOutputs() (*outputs, error) {
	w := &outputs{byRole: map[string]*table.Output{}}
	w.set.Stdout, w.set.Inputs, w.set.InPlace = r.Stdout, r.inputNames(), r.InPlace
	files := []struct{ role, name string }{
		{"timings", r.Timings}, {"deps", r.Deps}, {"model", r.Model}, {"report", r.Report}, {"record", r.Record}, {"table", r.Output},
	}
	var names []string
	for _, f := range files {
		names = append(names, f.name)
	}
	if err := w.set.Check(names...); err != nil {
		return nil, err
	}
	for _, f := range files {
		if f.name == "" {
			continue
		}
		o, err := w.set.Create(f.name)
		if err != nil {
			w.abort()
			return nil, err
		}
		w.byRole[f.role] = o
	}
	return w, nil
}

func (r *run) inputNames() []string {
	var names []string
	for _, name := range []string{r.Table, r.LabelsFile, r.Edges} {
		if name != "" && name != "-" {
			names = append(names, name)
		}
	}
	return names
}

func (w *outputs) abort() { w.set.Abort() }

// put writes the whole content of one role, if that output was asked for.
func (w *outputs) put(role string, content func() ([]byte, error)) error {
	o := w.byRole[role]
	if o == nil {
		return nil
	}
	b, err := content()
	if err != nil {
		return err
	}
	_, err = o.Write(b)
	return err
}

// sums are the checksums of the outputs that hold results, in a fixed order. Each is finished first.
func (w *outputs) sums(roles ...string) ([]FileSum, error) {
	sums := []FileSum{}
	for _, role := range roles {
		o := w.byRole[role]
		if o == nil {
			continue
		}
		if err := o.Finish(); err != nil {
			return nil, err
		}
		sums = append(sums, FileSum{Role: role, Name: o.Name(), Bytes: o.Bytes(), SHA256: fmt.Sprintf("%x", o.SHA256())})
	}
	return sums, nil
}

// finish writes the record, the dependency file and the timings, and puts everything in place, the table last.
func (r *run) finish(w *outputs, rec *Record) error {
	var err error
	if rec.Outputs, err = w.sums("table", "report", "model"); err != nil {
		return err
	}
	if err := w.put("record", func() ([]byte, error) { return encodeRecord(rec) }); err != nil {
		return err
	}
	if err := w.put("deps", r.dependencies); err != nil {
		return err
	}
	if err := w.put("timings", func() ([]byte, error) { return r.timingsCSV(), nil }); err != nil {
		return err
	}
	if o := w.byRole["table"]; o != nil {
		return w.set.Commit(o)
	}
	return w.set.Commit()
}

// writeLabel writes the completed table and what goes with it.
func (r *run) writeLabel(ctx context.Context, w *outputs, l *labelled) error {
	if o := w.byRole["table"]; o != nil {
		if err := r.checkNames(l); err != nil {
			return err
		}
		if err := table.WriteAppended(o, l.data.table, r.columns(l)); err != nil {
			return err
		}
	}
	if err := r.writeModel(w, l); err != nil {
		return err
	}
	if err := r.writeReport(ctx, w, l); err != nil {
		return err
	}
	return r.finish(w, l.record)
}

// columns are the columns that label adds.
func (r *run) columns(l *labelled) []table.Column {
	cols := l.result.Columns(r.Scores)
	if r.SpreadsheetSafe {
		for i := range cols {
			cols[i].Cell = spreadsheetSafe(cols[i].Cell)
		}
	}
	return cols
}

// checkNames refuses a table that already has a column that label would add.
func (r *run) checkNames(l *labelled) error {
	for _, c := range l.result.Columns(r.Scores) {
		if slices.Contains(l.data.table.Headers(), c.Name) {
			return &fault.Error{
				Exit: fault.Input, Code: "C14", File: r.Table, Name: c.Name,
				Message: "the table already has this column", Hint: "remove the columns of an earlier run first",
			}
		}
	}
	return nil
}

// spreadsheetSafe puts ' before a cell that a spreadsheet would run as a formula. Numbers stay as they are.
func spreadsheetSafe(cell func(int, []byte) []byte) func(int, []byte) []byte {
	return func(row int, dst []byte) []byte {
		start := len(dst)
		dst = cell(row, dst)
		if !encode.LooksLikeFormula(dst[start:]) {
			return dst
		}
		dst = append(dst, 0)
		copy(dst[start+1:], dst[start:])
		dst[start] = '\''
		return dst
	}
}

// dependencies is a make rule: the outputs depend on the inputs. Spaces, # and $ are escaped as make reads them.
func (r *run) dependencies() ([]byte, error) {
	escape := strings.NewReplacer(" ", `\ `, "#", `\#`, "$", "$$", "\n", "\\\n")
	var targets []string
	for _, name := range []string{r.Output, r.Record, r.Report, r.Model} {
		if name != "" && name != "-" {
			targets = append(targets, escape.Replace(name))
		}
	}
	if len(targets) == 0 {
		return nil, fault.Usagef("P09", "--deps needs an output file that the rule can be about")
	}
	line := strings.Join(targets, " ") + ":"
	for _, name := range r.inputNames() {
		line += " " + escape.Replace(name)
	}
	for _, name := range r.inputNames() { // an empty rule for each input, so that one that is gone does not stop make
		line += "\n\n" + escape.Replace(name) + ":"
	}
	return []byte(line + "\n"), nil
}
