package table

import (
	"bytes"
	"encoding/csv"
	"strings"
	"testing"
)

// FuzzRead reads any bytes whole and in small blocks. What is taken is echoed byte for byte, comes back from an output
// with a column appended, and agrees with encoding/csv where that package does not alter cells.
func FuzzRead(f *testing.F) {
	for _, c := range refusals {
		if len(c.text) < 1000 {
			f.Add([]byte(c.text), byte(7))
		}
	}
	for _, c := range acceptances {
		f.Add([]byte(c.text), byte(1))
	}
	f.Fuzz(func(t *testing.T, text []byte, block byte) {
		if len(text) > 2000 { // the comparison is quadratic in the length of a row
			return
		}
		o := Options{Delimiter: ',', Workers: 2, Memory: 1 << 28}
		whole, err := readText(string(text), o)
		if packing(text) == "" {
			o.block = 1 + int(block)
			small, err2 := readStream(string(text), o)
			want := ""
			if err == nil {
				want = dump(whole)
			}
			compareRuns(t, string(text), o.block, "Stream", small, err2, want, err)
		}
		if err != nil {
			if e := firstFault(err); e == nil || e.Code == "" || e.Exit == 0 || strings.ContainsAny(strings.ReplaceAll(e.Error(), "\n", "x"), "\x00\x1b\r") {
				t.Fatalf("%v is no refusal of one clean line", err)
			}
			return
		}
		if packing(text) != "" {
			return
		}
		var echo bytes.Buffer
		if err := WriteAppended(&echo, whole, nil); err != nil || !bytes.Equal(echo.Bytes(), text) {
			t.Fatalf("the echo of %q is %q (%v)", text, echo.Bytes(), err)
		}
		againstLibrary(t, text, whole)
		appended(t, whole)
	})
}

// againstLibrary compares with encoding/csv, unless the text has what that package alters or drops: carriage returns,
// blank lines, a byte-order mark. What it refuses (bare quotes) proves nothing.
func againstLibrary(t *testing.T, text []byte, tab *Table) {
	if bytes.IndexByte(text, '\r') >= 0 || bytes.HasPrefix(text, utf8Mark) || tab.Columns() == 1 {
		return
	}
	r := csv.NewReader(bytes.NewReader(text))
	r.FieldsPerRecord = -1
	rows, err := r.ReadAll()
	if err != nil {
		return
	}
	if len(rows) != tab.Rows()+1 {
		t.Fatalf("%q: %d rows, encoding/csv finds %d", text, tab.Rows(), len(rows)-1)
	}
	for i, row := range rows {
		for c, cell := range row {
			got := tab.Header(c)
			if i > 0 {
				got = tab.Text(i-1, c)
			}
			if got != cell || len(row) != tab.Columns() {
				t.Fatalf("%q: row %d, column %d is %q, encoding/csv finds %q of %d", text, i, c, got, cell, len(row))
			}
		}
	}
}

// appended writes the table with its own first column appended and reads it back.
func appended(t *testing.T, tab *Table) {
	name := "appended,\"column\"\n"
	for _, h := range tab.Headers() {
		if h == name {
			return
		}
	}
	var b bytes.Buffer
	err := WriteAppended(&b, tab, []Column{{Name: name, Cell: func(row int, dst []byte) []byte { return append(dst, tab.Cell(row, 0)...) }}})
	if err != nil {
		t.Fatal(err)
	}
	again, err := readText(b.String(), Options{Delimiter: ',', RepeatedNames: true})
	if err != nil {
		t.Fatalf("%q is refused: %v", b.String(), err)
	}
	if again.Rows() != tab.Rows() || again.Columns() != tab.Columns()+1 || again.Header(tab.Columns()) != name {
		t.Fatalf("%q has %d rows and %d columns", b.String(), again.Rows(), again.Columns())
	}
	for row := range tab.Rows() {
		for c := range tab.Columns() {
			if again.Text(row, c) != tab.Text(row, c) {
				t.Fatalf("row %d, column %d of %q is not as before", row, c, b.String())
			}
		}
		if again.Text(row, tab.Columns()) != tab.Text(row, 0) {
			t.Fatalf("row %d of %q: the appended cell is not the first", row, b.String())
		}
	}
}
