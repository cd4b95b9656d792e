package job

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"
	"text/tabwriter"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/table"
	"pinfill/internal/trust"
)

// AssessOptions are the options of assess.
type AssessOptions struct {
	*Options
	Truth  string // column of checked labels
	Strata string // column of strata, or ""
	JSON   bool
}

// Assessed is what checked rows say of a completed table.
type Assessed struct {
	Rows      int         `json:"rows"`
	Checked   int         `json:"checked_rows"`
	Given     int         `json:"checked_rows_left_out_as_given"`
	Empty     int         `json:"checked_rows_without_label"`
	Task      string      `json:"task"`
	Classes   []string    `json:"classes,omitempty"`
	Confusion [][]int     `json:"confusion,omitempty"` // [completed][truth]
	Share     [][]Number  `json:"estimated_shares,omitempty"`
	Overall   *Estimated  `json:"overall_accuracy,omitempty"`
	User      []Estimated `json:"users_accuracy,omitempty"`
	Producer  []Estimated `json:"producers_accuracy,omitempty"`
	Area      []Estimated `json:"estimated_class_shares,omitempty"`
	Kappa     *Number     `json:"kappa,omitempty"`
	Thin      []string    `json:"strata_with_fewer_than_two_checked,omitempty"`
	InSet     *Estimated  `json:"share_in_set,omitempty"`
	SetSize   *Number     `json:"mean_set_size,omitempty"`
	RMSE      *Number     `json:"rmse,omitempty"`
	MAE       *Number     `json:"mae,omitempty"`
	Bias      *Number     `json:"bias,omitempty"`
	R2        *Number     `json:"r2,omitempty"`
	Covered   *Estimated  `json:"interval_coverage,omitempty"`
	Width     *Number     `json:"mean_interval_width,omitempty"`
	Caution   string      `json:"caution"`
}

// Estimated is a value with its standard error.
type Estimated struct {
	Value Number `json:"value"`
	SE    Number `json:"standard_error"`
}

func estimated(e trust.Estimate) Estimated { return Estimated{Number(e.Value), Number(e.SE)} }

func estimates(es []trust.Estimate) []Estimated {
	out := make([]Estimated, len(es))
	for i, e := range es {
		out[i] = estimated(e)
	}
	return out
}

// checked is one checked row.
type checked struct {
	row         int
	done, truth string
	truthAt     func(code, message, hint string) *fault.Error
}

// Assess compares a completed table with checked rows and gives the text for standard output; with -o it is written
// there too.
func Assess(ctx context.Context, a *AssessOptions) (string, error) {
	r, ctx, cancel := start(ctx, a.Options)
	defer cancel()
	w, err := r.openOutputs()
	if err != nil {
		return "", err
	}
	defer w.abort()
	d := &data{label: -1, id: -1}
	if d.table, err = r.readTable(ctx, "table", r.Table, d); err != nil {
		return "", err
	}
	rows, out, err := r.checkedRows(ctx, d, a)
	if err != nil {
		return "", err
	}
	if r.isNumbers(d.table, rows) {
		err = r.assessNumbers(d.table, rows, out)
	} else {
		err = r.assessClasses(d.table, rows, a, out)
	}
	if err != nil {
		return "", err
	}
	text := out.text()
	if a.JSON {
		b, err := encodeJSON(out)
		if err != nil {
			return "", err
		}
		text = string(b)
	}
	if o := w.byRole["table"]; o != nil {
		if _, err := o.Write([]byte(text)); err != nil {
			return "", err
		}
	}
	return text, r.finish(w, &Record{})
}

// checkedRows pairs each checked row's completed label with its truth.
func (r *run) checkedRows(ctx context.Context, d *data, a *AssessOptions) ([]checked, *Assessed, error) {
	t := d.table
	done, err := column(t, "pinfill_label", "truth")
	if err != nil {
		return nil, nil, &fault.Error{Exit: fault.Input, Code: "L04", File: r.Table, Message: "has no column pinfill_label", Hint: "give a table that pinfill label has completed"}
	}
	truth, where, err := r.truthOf(ctx, d, a.Truth)
	if err != nil {
		return nil, nil, err
	}
	out := &Assessed{Rows: t.Rows(), Caution: Caution}
	origin, hasOrigin := t.ColumnIndex("pinfill_origin")
	var rows []checked
	for row := range t.Rows() {
		text := truth(row)
		if text == "" {
			continue
		}
		switch {
		case hasOrigin && t.Text(row, origin) == encode.Given.String():
			out.Given++
		case len(t.Cell(row, done)) == 0:
			out.Empty++
		default:
			rows = append(rows, checked{row, t.Text(row, done), text, func(code, message, hint string) *fault.Error { return where(row, code, message, hint) }})
		}
	}
	if len(rows) == 0 {
		return nil, nil, fault.Inputf("L01", "%s: no row has both a completed label and a checked one", fault.Name(r.Table))
	}
	out.Checked = len(rows)
	return rows, out, nil
}

// truthOf finds the checked label of each row, in the table or in a second one joined on the id, and where it stands.
func (r *run) truthOf(ctx context.Context, d *data, name string) (func(int) string, func(int, string, string, string) *fault.Error, error) {
	if r.LabelsFile == "" {
		c, err := column(d.table, name, "truth")
		if err != nil {
			return nil, nil, err
		}
		return func(row int) string {
				if d.table.Missing(row, c) {
					return ""
				}
				return d.table.Text(row, c)
			}, func(row int, code, message, hint string) *fault.Error {
				return d.table.Fault(row, c, code, message, hint)
			}, nil
	}
	var err error
	if d.id, err = column(d.table, r.ID, "id"); err != nil {
		return nil, nil, err
	}
	t, err := r.readTable(ctx, "labels", r.LabelsFile, d)
	if err != nil {
		return nil, nil, err
	}
	c, err := column(t, name, "truth")
	if err != nil {
		return nil, nil, err
	}
	id, err := column(t, r.ID, "id")
	if err != nil {
		return nil, nil, err
	}
	at, err := encode.RowsByID(t, id, "L12")
	if err != nil {
		return nil, nil, err
	}
	return func(row int) string {
			k, ok := at[d.table.Text(row, d.id)]
			if !ok || t.Missing(k, c) {
				return ""
			}
			return t.Text(k, c)
		}, func(row int, code, message, hint string) *fault.Error {
			return t.Fault(at[d.table.Text(row, d.id)], c, code, message, hint)
		}, nil
}

// isNumbers says whether the labels are numbers: as asked, or by the columns that label wrote.
func (r *run) isNumbers(t *table.Table, _ []checked) bool {
	if r.Task != encode.TaskAuto {
		return r.Task == encode.Numbers
	}
	_, set := t.ColumnIndex("pinfill_set")
	_, low := t.ColumnIndex("pinfill_low")
	return low && !set
}

func (r *run) assessNumbers(t *table.Table, rows []checked, out *Assessed) error {
	out.Task = string(encode.Numbers)
	answer, right := make([]float64, len(rows)), make([]float64, len(rows))
	low, high := make([]float64, len(rows)), make([]float64, len(rows))
	lowAt, hasLow := t.ColumnIndex("pinfill_low")
	highAt, hasHigh := t.ColumnIndex("pinfill_high")
	var refused fault.List
	for i, c := range rows {
		var err error
		if answer[i], err = table.ParseNumber([]byte(c.done), '.'); err != nil {
			refused.Add(&fault.Error{Exit: fault.Input, Code: "L08", File: r.Table, Value: c.done, Message: "a completed label is no number", Hint: "pass --task=classes if these are names"})
		}
		if right[i], err = table.ParseNumber([]byte(strings.TrimSpace(c.truth)), r.Decimal); err != nil {
			refused.Add(c.truthAt("L08", "not a number", "mend the cell, or pass --task=classes if these are names"))
		}
		low[i], high[i] = math.NaN(), math.NaN()
		if hasLow && hasHigh {
			low[i], high[i] = end(t.Cell(c.row, lowAt)), end(t.Cell(c.row, highAt))
		}
	}
	if err := refused.Err(); err != nil {
		return err
	}
	f := trust.MeasureNumbers(answer, right)
	out.RMSE, out.MAE, out.Bias, out.R2 = figure(f.RMSE), figure(f.MAE), figure(f.Bias), figure(f.R2)
	if c := trust.MeasureIntervals(low, high, right); c.Count > 0 {
		e := estimated(c.Covered)
		out.Covered, out.Width = &e, figure(c.Size)
	}
	return nil
}

// end reads an interval's end; an empty cell is none.
func end(cell []byte) float64 {
	switch string(cell) {
	case "inf":
		return math.Inf(1)
	case "-inf":
		return math.Inf(-1)
	}
	v, err := table.ParseNumber(cell, '.')
	if err != nil {
		return math.NaN()
	}
	return v
}

func (r *run) assessClasses(t *table.Table, rows []checked, a *AssessOptions, out *Assessed) error {
	out.Task = string(encode.Classes)
	names := map[string]bool{}
	for _, c := range rows {
		names[c.done], names[c.truth] = true, true
	}
	for name := range names {
		out.Classes = append(out.Classes, name)
	}
	slices.Sort(out.Classes)
	class := func(name string) int { i, _ := slices.BinarySearch(out.Classes, name); return i }
	s := trust.Sample{Classes: len(out.Classes)}
	var sets [][]int32
	setAt, hasSet := t.ColumnIndex("pinfill_set")
	for _, c := range rows {
		s.Predicted = append(s.Predicted, class(c.done))
		s.Truth = append(s.Truth, class(c.truth))
		if hasSet {
			var set []int32
			for _, name := range encode.SplitSet(t.Text(c.row, setAt)) {
				if names[name] {
					set = append(set, int32(class(name)))
				} else {
					set = append(set, -1) // a class that no checked row has
				}
			}
			sets = append(sets, set)
		}
	}
	var strata []string
	if a.Strata != "" {
		var err error
		if strata, err = r.addStrata(t, rows, a.Strata, &s); err != nil {
			return err
		}
	}
	acc, err := trust.EstimateAccuracy(s)
	if err != nil {
		return err
	}
	out.Confusion = acc.Counts
	for _, row := range acc.Share {
		out.Share = append(out.Share, numbers(row))
	}
	e := estimated(acc.Overall)
	out.Overall, out.Kappa = &e, figure(acc.Kappa)
	out.User, out.Producer, out.Area = estimates(acc.User), estimates(acc.Producer), estimates(acc.Area)
	for _, st := range acc.Thin {
		if strata != nil {
			out.Thin = append(out.Thin, strata[st])
		}
	}
	if hasSet {
		c := trust.MeasureSets(sets, s.Truth)
		e := estimated(c.Covered)
		out.InSet, out.SetSize = &e, figure(c.Size)
	}
	return nil
}

// addStrata reads the strata of the checked rows and counts the rows of the whole table in each. Given rows were not
// up for checking and are in no stratum.
func (r *run) addStrata(t *table.Table, rows []checked, name string, s *trust.Sample) ([]string, error) {
	c, err := column(t, name, "strata")
	if err != nil {
		return nil, err
	}
	origin, hasOrigin := t.ColumnIndex("pinfill_origin")
	size := map[string]float64{}
	for row := range t.Rows() {
		if !hasOrigin || t.Text(row, origin) != encode.Given.String() {
			size[t.Text(row, c)]++
		}
	}
	var strata []string
	for st := range size {
		strata = append(strata, st)
	}
	slices.Sort(strata)
	for _, st := range strata {
		s.StratumSize = append(s.StratumSize, size[st])
	}
	for _, row := range rows {
		st, _ := slices.BinarySearch(strata, t.Text(row.row, c))
		s.Stratum = append(s.Stratum, st)
	}
	return strata, nil
}

// text writes the assessment for a person.
func (a *Assessed) text() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%d rows, %d checked (left out: %d given, %d without a completed label)\n", a.Rows, a.Checked, a.Given, a.Empty)
	if a.Task == string(encode.Numbers) {
		fmt.Fprintf(&b, "RMSE %s  MAE %s  bias %s  R2 %s\n", figureText(float64(*a.RMSE)), figureText(float64(*a.MAE)), figureText(float64(*a.Bias)), figureText(float64(*a.R2)))
		if a.Covered != nil {
			fmt.Fprintf(&b, "intervals hold the truth in %.1f%% of rows (standard error %.1f), mean width %s\n", 100*float64(a.Covered.Value), 100*float64(a.Covered.SE), figureText(float64(*a.Width)))
		}
		return b.String()
	}
	fmt.Fprintf(&b, "overall accuracy %s  kappa %.3f\n", percent(*a.Overall), float64(*a.Kappa))
	if a.InSet != nil {
		fmt.Fprintf(&b, "sets hold the truth in %.1f%% of rows (standard error %.1f), mean size %.2f\n", 100*float64(a.InSet.Value), 100*float64(a.InSet.SE), float64(*a.SetSize))
	}
	b.WriteString("\nconfusion (rows: completed label, columns: truth)\n")
	tw := tabwriter.NewWriter(&b, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintf(tw, "\t%s\tuser's\t\n", strings.Join(a.Classes, "\t"))
	for i, name := range a.Classes {
		fmt.Fprintf(tw, "%s\t", name)
		for _, n := range a.Confusion[i] {
			fmt.Fprintf(tw, "%d\t", n)
		}
		fmt.Fprintf(tw, "%s\t\n", percent(a.User[i]))
	}
	fmt.Fprint(tw, "producer's\t")
	for _, p := range a.Producer {
		fmt.Fprintf(tw, "%s\t", percent(p))
	}
	fmt.Fprint(tw, "\t\nclass share\t")
	for _, p := range a.Area {
		fmt.Fprintf(tw, "%s\t", percent(p))
	}
	fmt.Fprint(tw, "\t\n")
	tw.Flush()
	if len(a.Thin) > 0 {
		fmt.Fprintf(&b, "strata with fewer than two checked rows, whose errors are missing here: %s\n", strings.Join(a.Thin, ", "))
	}
	return b.String()
}

// percent writes a share with its standard error.
func percent(e Estimated) string {
	if math.IsNaN(float64(e.Value)) {
		return "-"
	}
	return fmt.Sprintf("%.1f%%±%.1f", 100*float64(e.Value), 100*float64(e.SE))
}
