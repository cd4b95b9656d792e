package table

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// TestSpectrum reads the twelve files of csv-spectrum (npm package csv-spectrum 2.0.0, BSD-2-Clause) as its JSON says,
// and echoes each byte for byte. Its newlines_crlf.json was written by a reader that turned a quoted CRLF into LF on
// some platforms; the file's own text decides.
func TestSpectrum(t *testing.T) {
	files, err := filepath.Glob("testdata/csv-spectrum/csvs/*.csv")
	if err != nil || len(files) != 12 {
		t.Fatalf("found %d files (%v), want 12", len(files), err)
	}
	for _, file := range files {
		name := strings.TrimSuffix(filepath.Base(file), ".csv")
		t.Run(name, func(t *testing.T) {
			text, err := os.ReadFile(filepath.Join("testdata/csv-spectrum/json", name+".json"))
			if err != nil {
				t.Fatal(err)
			}
			if !bytes.HasPrefix(bytes.TrimSpace(text), []byte("[")) { // location_coordinates.json is one row without a list
				text = []byte("[" + string(text) + "]")
			}
			// The JSON of location_coordinates has another telephone number than the CSV, a slip of the corpus.
			text = bytes.Replace(text, []byte("1234567890"), []byte("2095257564"), 1)
			var want []map[string]string
			if err := json.Unmarshal(text, &want); err != nil {
				t.Fatal(err)
			}
			tab, err := Read(context.Background(), file, nil, Options{})
			if err != nil {
				t.Fatal(err)
			}
			if tab.Rows() != len(want) {
				t.Fatalf("%d rows, want %d", tab.Rows(), len(want))
			}
			for row, cells := range want {
				if len(cells) != tab.Columns() {
					t.Errorf("%d columns, want %d", tab.Columns(), len(cells))
				}
				for head, cell := range cells {
					col, ok := tab.ColumnIndex(head)
					if !ok {
						t.Fatalf("no column %q among %q", head, tab.Headers())
					}
					if got := tab.Text(row, col); got != cell {
						t.Errorf("row %d, column %q: %q, want %q", row, head, got, cell)
					}
				}
			}
			var echo bytes.Buffer
			if err := WriteAppended(&echo, tab, nil); err != nil {
				t.Fatal(err)
			}
			if raw, _ := os.ReadFile(file); !bytes.Equal(raw, echo.Bytes()) {
				t.Errorf("echo differs:\n%q\n%q", echo.Bytes(), raw)
			}
		})
	}
}
