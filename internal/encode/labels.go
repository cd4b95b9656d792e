package encode

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"

	"pinfill/internal/fault"
	"pinfill/internal/table"
)

// maxClasses is the most class names a label column may hold before it is taken for an id column.
const maxClasses = 1000

// LabelOptions say where the labels are and how they are read.
type LabelOptions struct {
	Column        int // label column of the table
	Task          Task
	Decimal       byte
	AllowConstant bool
	Strict        bool
	NAHint        bool // no --na was given, so that a class "NA" deserves a word
}

// Labels are the given labels of a table, by table row.
type Labels struct {
	Task  Task
	Rows  []int     // labelled table rows, increasing
	Class []int32   // class of each labelled row, index into Names; classes only
	Names []string  // class names, sorted by bytes; classes only
	Value []float64 // value of each labelled row; numbers only
	Text  [][]byte  // each label's own bytes, as they come back
}

// cellAt finds the label text of a labelled row: in the table itself, or in the second table it was joined from.
type cellAt func(k int) (t *table.Table, row, col int)

// ReadLabels reads the label column of the table itself.
func ReadLabels(t *table.Table, o LabelOptions) (*Labels, []Warning, error) {
	l := &Labels{}
	var w []Warning
	blank := 0
	for row := range t.Rows() {
		if t.Missing(row, o.Column) {
			if len(t.Cell(row, o.Column)) > 0 && strings.TrimSpace(t.Text(row, o.Column)) == "" {
				blank++
			}
			continue
		}
		if strings.TrimSpace(t.Text(row, o.Column)) == "" {
			blank++
			continue
		}
		l.Rows = append(l.Rows, row)
	}
	if blank > 0 {
		w = append(w, Warning{"L15", fmt.Sprintf("%d labels hold only spaces and count as missing", blank)})
	}
	if len(l.Rows) == 0 {
		return nil, nil, &fault.Error{
			Exit: fault.Input, Code: "L01", File: t.Name(), Name: t.Header(o.Column),
			Message: fmt.Sprintf("0 of %d rows carry a label", t.Rows()), Hint: "label some rows, or name another column with --label",
		}
	}
	more, err := l.read(func(k int) (*table.Table, int, int) { return t, l.Rows[k], o.Column }, o)
	return l, append(w, more...), err
}

// read decides the task and reads classes or numbers.
func (l *Labels) read(at cellAt, o LabelOptions) ([]Warning, error) {
	task, err := decideTask(len(l.Rows), at, o)
	if err != nil {
		return nil, err
	}
	l.Task = task
	l.Text = make([][]byte, len(l.Rows))
	for k := range l.Rows {
		t, row, col := at(k)
		l.Text[k] = t.Cell(row, col)
	}
	if task == Numbers {
		return nil, l.readNumbers(at, o)
	}
	return l.readClasses(at, o)
}

// decideTask looks at the labels when the task was not given. All whole numbers could be either and need the flag; a
// column that is mostly decimal numbers with a slip among them is a column of numbers with a slip.
func decideTask(n int, at cellAt, o LabelOptions) (Task, error) {
	if o.Task != TaskAuto {
		return o.Task, nil
	}
	numbers, whole := 0, 0
	for k := range n {
		t, row, col := at(k)
		v, err := table.ParseNumber(trimCell(t.Cell(row, col)), o.Decimal)
		if err != nil {
			continue
		}
		numbers++
		if v == math.Trunc(v) {
			whole++
		}
	}
	switch {
	case numbers == n && whole == n:
		t, row, col := at(0)
		e := t.Fault(row, col, "L07", "labels that are all whole numbers may be classes or measurements", "say which with --task=classes or --task=numbers")
		e.Exit = fault.Usage
		return "", e
	case 2*(numbers-whole) > n:
		return Numbers, nil
	default:
		return Classes, nil
	}
}

func trimCell(cell []byte) []byte {
	return []byte(strings.Trim(string(cell), " \t"))
}

func (l *Labels) readNumbers(at cellAt, o LabelOptions) error {
	var refused fault.List
	l.Value = make([]float64, len(l.Rows))
	lo, hi := 0, 0
	for k := range l.Rows {
		t, row, col := at(k)
		v, err := table.ParseNumber(trimCell(t.Cell(row, col)), o.Decimal)
		if err != nil {
			e := t.NumberFault(row, col, o.Decimal)
			e.Code, e.Hint = "L08", "mend the cell, or pass --task=classes if these are names"
			refused.Add(e)
			continue
		}
		l.Value[k] = v
		if v < l.Value[lo] {
			lo = k
		}
		if v > l.Value[hi] {
			hi = k
		}
	}
	if err := refused.Err(); err != nil {
		return err
	}
	if d := l.Value[hi] - l.Value[lo]; math.IsInf(d, 0) {
		t, row, col := at(hi)
		return t.Fault(row, col, "L13", fmt.Sprintf("the label range from %v to %v overflows", l.Value[lo], l.Value[hi]), "rescale the labels")
	}
	if l.Value[lo] == l.Value[hi] && !o.AllowConstant {
		t, row, col := at(0)
		what := fmt.Sprintf("all %d labels are equal", len(l.Rows))
		if len(l.Rows) == 1 {
			what = "one label alone gives every row the same value"
		}
		return t.Fault(row, col, "L02", what, "pass --allow-constant if that is meant")
	}
	return nil
}

func (l *Labels) readClasses(at cellAt, o LabelOptions) ([]Warning, error) {
	count := map[string]int{}
	for k := range l.Rows {
		t, row, col := at(k)
		count[t.Text(row, col)]++
		if len(count) > maxClasses {
			e := t.Fault(row, col, "L14", fmt.Sprintf("more than %d classes", maxClasses), "is this an id column? name the label column with --label")
			e.Exit = fault.Limit
			return nil, e
		}
	}
	for name := range count {
		l.Names = append(l.Names, name)
	}
	sort.Strings(l.Names)
	l.Class = make([]int32, len(l.Rows))
	for k := range l.Rows {
		t, row, col := at(k)
		c, _ := slices.BinarySearch(l.Names, t.Text(row, col))
		l.Class[k] = int32(c)
	}
	if len(l.Names) == 1 && !o.AllowConstant {
		t, row, col := at(0)
		what := fmt.Sprintf("all %d labels are of one class", len(l.Rows))
		if len(l.Rows) == 1 {
			what = "one label alone gives every row the same class"
		}
		return nil, t.Fault(row, col, "L02", what, "pass --allow-constant if that is meant")
	}
	alike, typos := alikeNames(l.Names, count)
	if o.Strict && len(alike) > 0 {
		return nil, fault.Inputf(alike[0].Code, "%s", alike[0].Text)
	}
	w := append(alike, typos...)
	w = append(w, formulaNames(l.Names)...)
	if o.NAHint {
		w = append(w, missingNames(l.Names, count)...)
	}
	return w, nil
}

// alikeNames finds class names that differ only in case, spaces or composition of accents (L05), and classes of one
// row whose name is one edit from a class ten times as large (L06).
func alikeNames(names []string, count map[string]int) (alike, typos []Warning) {
	first := map[string]string{}
	for _, name := range names {
		key := foldName(name)
		if other, ok := first[key]; ok {
			alike = append(alike, Warning{"L05", fmt.Sprintf("classes %s (%d rows) and %s (%d rows) differ only in case, spaces or accents; --strict refuses this",
				fault.Quote(other), count[other], fault.Quote(name), count[name])})
			continue
		}
		first[key] = name
	}
	const much = 10 // a class this many times larger than a singleton makes the singleton look like a slip
	for _, name := range names {
		if count[name] != 1 || len(name) < 3 {
			continue
		}
		for _, big := range names {
			if count[big] >= much && foldName(big) != foldName(name) && editDistance(name, big, 2) == 1 {
				typos = append(typos, Warning{"L06", fmt.Sprintf("class %s stands in one row and is one letter from %s (%d rows): a slip?", fault.Quote(name), fault.Quote(big), count[big])})
			}
		}
	}
	return alike, typos
}

// formulaNames finds class names that a spreadsheet would run (X01, CWE-1236).
func formulaNames(names []string) []Warning {
	for _, name := range names {
		if LooksLikeFormula([]byte(name)) {
			return []Warning{{"X01", fmt.Sprintf("class %s would run as a formula in a spreadsheet; --spreadsheet-safe puts ' before it in the added columns", fault.Quote(name))}}
		}
	}
	return nil
}

// LooksLikeFormula reports whether a spreadsheet would run a cell rather than show it.
func LooksLikeFormula(cell []byte) bool {
	if len(cell) == 0 || !strings.ContainsRune("=+-@\t\r", rune(cell[0])) {
		return false
	}
	_, err := table.ParseNumber(cell, '.')
	return err != nil
}

// missingNames finds class names that usually mean "no value" (L10).
func missingNames(names []string, count map[string]int) []Warning {
	var w []Warning
	for _, name := range names {
		switch strings.ToLower(strings.TrimSpace(name)) {
		case "na", "n/a", "nan", "null", "none", "?", "-", "unknown", "missing":
			w = append(w, Warning{"L10", fmt.Sprintf("class %s (%d rows) looks like a missing value; pass --na=%s if it is one", fault.Quote(name), count[name], name)})
		}
	}
	return w
}
