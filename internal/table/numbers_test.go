package table

import (
	"context"
	"crypto/sha256"
	"errors"
	"math"
	"strings"
	"testing"

	"pinfill/internal/fault"
)

func sum256(text string) [32]byte { return sha256.Sum256([]byte(text)) }

func TestNumberFaults(t *testing.T) {
	for _, c := range []struct {
		cell, code, says string
		decimal          byte
	}{
		{`"1,5"`, "C23", "--decimal=,", '.'},
		{`"-0,25e3"`, "C23", "--decimal=,", '.'},
		{"1.5", "C23", "--decimal=.", ','},
		{`"1,234"`, "C24", "thousands", '.'},
		{"1.234", "C24", "thousands", ','},
		{`"1,234,567.8"`, "C24", "thousands", '.'},
		{"1 234", "C24", "thousands", '.'},
		{"1\u00a0234", "C24", "thousands", '.'},
		{"1_000", "C24", "thousands", '.'},
		{"2024-05-01", "C25", "date", '.'},
		{"12:30", "C25", "date or time", '.'},
		{"12%", "C25", "percentage", '.'},
		{"12kg", "C25", "unit (kg)", '.'},
		{"12 kg", "C25", "unit (kg)", '.'},
		{"sandbank", "C25", "--ignore=x1", '.'},
		{"1.2.3", "C25", "not a number", '.'},
		{"0x1F", "C26", "decimal digits", '.'},
		{"0x1p-2", "C26", "decimal digits", '.'},
		{"inf", "C26", "--na=inf", '.'},
		{"-Infinity", "C26", "not a finite number", '.'},
		{"NaN", "C26", "--na=NaN", '.'},
		{"NA", "C26", "--na=NA", '.'},
		{"?", "C26", "--na='?'", '.'},
		{"1e400", "C27", "1.8e308", '.'},
		{"-1e400", "C27", "1.8e308", '.'},
		{"1e-400", "C28", "not zero", '.'},
		{"\u00a01", "C30", "U+00A0", '.'},
		{"1\u2009", "C30", "U+2009", '.'},
		{"\u22125", "C31", "U+2212", '.'},
		{"\u0661\u0662", "C31", "U+0661", '.'},
		{"\u00bd", "C25", "", '.'},
	} {
		tab, err := readText("id,x1\na,1\nb,"+c.cell+"\n", Options{Decimal: c.decimal})
		if err != nil {
			t.Fatal(err)
		}
		_, err = tab.Numbers(context.Background(), []int{1}, NumberOptions{})
		e := firstFault(err)
		if e == nil {
			t.Errorf("%s: taken, want %s", c.cell, c.code)
			continue
		}
		if e.Code != c.code || e.Exit != 3 || e.Line != 3 || e.Column != 3 || e.Name != "x1" || e.Value != tab.Text(1, 1) || !strings.Contains(e.Error(), c.says) {
			t.Errorf("%s: %v, want %s at 3:3 saying %q", c.cell, e, c.code, c.says)
		}
		if row := tab.FirstNonNumber(1); row != 1 || tab.IsNumeric(1) {
			t.Errorf("%s: first that is no number in row %d, want 1", c.cell, row)
		}
		if other := tab.NumberFault(1, 1, 0); other == nil || other.Error() != e.Error() {
			t.Errorf("%s: NumberFault says %v", c.cell, other)
		}
	}
}

func TestNumbersValues(t *testing.T) {
	text := "id,x,y\n" +
		"a,1,2.5\n" +
		"b, 3 ,\"4\"\n" +
		"c,,-999\n" +
		"d,NA,\" 5e0\t\"\n" +
		"e,9007199254740993,9007199254740992\n" +
		"f,1e300,-0\r\n" +
		"g,-12345678901234567890,5e-324"
	tab, err := readText(text, Options{NA: []string{"NA", "-999"}})
	if err != nil {
		t.Fatal(err)
	}
	nan := math.NaN()
	want := []float64{1, 2.5, 3, 4, nan, nan, nan, 5, 9007199254740992, 9007199254740992, 1e300, math.Copysign(0, -1), -12345678901234567890, 5e-324}
	for _, cols := range [][]int{{1, 2}, {2, 1}, {2}, {1}, {}} {
		n, err := tab.Numbers(context.Background(), cols, NumberOptions{Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		for r := range n.Rows {
			for k, c := range cols {
				got, w := n.Data[r*n.Cols+k], want[r*2+c-1]
				if math.Float64bits(got) != math.Float64bits(w) && !(math.IsNaN(got) && math.IsNaN(w)) {
					t.Errorf("columns %v, row %d: %v, want %v", cols, r, got, w)
				}
			}
		}
		if len(cols) == 2 && (n.Missing != 3 || n.Trimmed != 2 || n.BigIntegers != 2) {
			t.Errorf("missing %d, trimmed %d, big %d; want 3, 2, 2", n.Missing, n.Trimmed, n.BigIntegers)
		}
	}
	if _, err := tab.Numbers(context.Background(), []int{1, 1}, NumberOptions{}); err == nil {
		t.Error("a column asked for twice goes unnoticed")
	}
	if tab.IsNumeric(0) || !tab.IsNumeric(1) || !tab.IsNumeric(2) {
		t.Error("columns x and y are numeric, id is not")
	}
	if !tab.Missing(2, 2) || !tab.Missing(2, 1) || !tab.Missing(3, 1) || tab.Missing(0, 1) {
		t.Error("missing cells are those empty or named by NA")
	}
}

func TestNumbersStop(t *testing.T) {
	tab, err := readText("x,y\n1,2\n", Options{Memory: 1 << 12, block: 64})
	if err != nil {
		t.Fatal(err)
	}
	tab.head.memory = 15 // two numbers need 16 bytes
	_, err = tab.Numbers(context.Background(), []int{0, 1}, NumberOptions{})
	if e := firstFault(err); e == nil || e.Code != "S15" || e.Exit != 6 {
		t.Errorf("%v, want S15 with exit 6", err)
	}
	ctx, cancel := context.WithCancelCause(context.Background())
	cause := errors.New("enough")
	cancel(cause)
	if _, err := tab.Numbers(ctx, []int{0}, NumberOptions{}); err != cause {
		t.Errorf("%v, want the context's cause", err)
	}
	if e := tab.NumberFault(0, 0, 0); e != nil {
		t.Errorf("a number is refused: %v", e)
	}
}

// TestDecimalIsDelimiter: a comma ends an unquoted cell even where it is the decimal sign.
func TestDecimalIsDelimiter(t *testing.T) {
	tab, err := readText("x,y\n1,5\n\"2,5\",6\n", Options{Decimal: ','})
	if err != nil {
		t.Fatal(err)
	}
	n, err := tab.Numbers(context.Background(), []int{0, 1}, NumberOptions{})
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{1, 5, 2.5, 6} {
		if n.Data[i] != want {
			t.Errorf("cell %d: %v, want %v", i, n.Data[i], want)
		}
	}
}

// TestManyFaults: a column of text does not hide another's slip, and everything is counted, on any workers.
func TestManyFaults(t *testing.T) {
	var b strings.Builder
	b.WriteString("x,y,z\n")
	const rows = 3*rowGrain + 5
	for i := range rows {
		b.WriteString("reef,1,")
		if i == rows-1 {
			b.WriteString("1e999")
		}
		b.WriteString("\n")
	}
	var first string
	for workers := 1; workers <= 3; workers++ {
		tab, err := readText(b.String(), Options{Workers: workers, block: 1 << 10})
		if err != nil {
			t.Fatal(err)
		}
		_, err = tab.Numbers(context.Background(), []int{0, 1, 2}, NumberOptions{})
		l, ok := err.(*fault.List)
		if !ok || l.Total != rows+1 || len(l.First) != shownEach+1 || l.First[shownEach].Code != "C27" || l.First[shownEach].Line != rows+1 {
			t.Fatalf("%v, want %d refusals, %d shown, C27 last", err, rows+1, shownEach+1)
		}
		if first == "" {
			first = err.Error()
		} else if err.Error() != first {
			t.Errorf("%d workers say something else", workers)
		}
	}
}

// TestLeanMemory holds a table to its promise: above the file's bytes, no more than 1.3 times the table's size as float64,
// numbers included, and a block to spare at the end.
func TestLeanMemory(t *testing.T) {
	const rows, cols = 100_000, 10
	text := numberText(rows, cols)
	tab, err := readText(text, Options{})
	if err != nil {
		t.Fatal(err)
	}
	held := int64(0)
	for _, b := range tab.blocks {
		held += int64(cap(b.data)) + 4*int64(cap(b.starts))
	}
	all := make([]int, cols)
	for c := range all {
		all[c] = c
	}
	n, err := tab.Numbers(context.Background(), all, NumberOptions{})
	if err != nil {
		t.Fatal(err)
	}
	above := held + 8*int64(cap(n.Data)) - int64(len(text)) - blockSize
	if ratio := float64(above) / (8 * rows * cols); ratio > 1.3 {
		t.Errorf("%.3f times the table's own size above the file's bytes, want 1.3 or less", ratio)
	}
	if estimate := EstimateRead(int64(len(text)), float64(len(text))/rows); held > estimate {
		t.Errorf("%d bytes held, %d announced", held, estimate)
	}
}
