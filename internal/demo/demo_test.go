package demo

import (
	"bytes"
	"crypto/sha256"
	"encoding/csv"
	"encoding/hex"
	"strconv"
	"strings"
	"testing"
)

// The bytes that every machine must make of Seed.
var wantSHA256 = map[string]string{
	"seabed.csv":       "8e426f6800d59a1e5642765839a5063eaa4d6d8bde66f615e0f7188abaf34f9f",
	"seabed_truth.csv": "bff73e35d362cf5f05400993ae7c4cb956624dd9b4300373e86293cccc05fa88",
	"grain.csv":        "9b95c79f0d8af95113d370abcbb5b14326c96623dff377541c32235c1153b81e",
	"grain_truth.csv":  "4c4faf5b773b86e2df3c8d437d30ee470b25cb8d9cef48464082c98bc3e0d58a",
	"clips.csv":        "b146f20876249e34a9e2ee43d5b6574d0f27cf6f1b534f1369040697da92f610",
	"clips_truth.csv":  "200150419aa4ef586d6cf9768526558ff87014fba8dedeab2d4995f7bec429d9",
	"README.txt":       "d328477342ebe43f29707794bc19262cade1e1c2edcca13d0e20762e3796dd47",
}

func TestSameBytesEverywhere(t *testing.T) {
	for _, f := range Files(Seed) {
		sum := sha256.Sum256(f.Data)
		if got := hex.EncodeToString(sum[:]); got != wantSHA256[f.Name] {
			t.Errorf("%q: %q", f.Name, got)
		}
	}
}

func TestSeedMatters(t *testing.T) {
	a, b := Files(Seed), Files(Seed+1)
	for i := range a {
		if same := bytes.Equal(a[i].Data, b[i].Data); same != (a[i].Name == ReadmeFile) {
			t.Errorf("%s: same bytes for another seed: %v", a[i].Name, same)
		}
	}
}

func read(t *testing.T, name string) [][]string {
	t.Helper()
	for _, f := range Files(Seed) {
		if f.Name == name {
			rows, err := csv.NewReader(bytes.NewReader(f.Data)).ReadAll()
			if err != nil {
				t.Fatal(err)
			}
			return rows
		}
	}
	t.Fatalf("no file %s", name)
	return nil
}

// The tables are as the documentation says: sizes, labels, classes, and the truth beside each.
func TestTables(t *testing.T) {
	for _, c := range []struct {
		table, truth            string
		rows, columns, labelled int
		classes                 string // "" for numbers
	}{
		{SeabedFile, SeabedTruthFile, 6017, 8, 48, "eelgrass gravel mud sand shell"},
		{GrainFile, GrainTruthFile, 6017, 8, 60, ""},
		{ClipsFile, ClipsTruthFile, 3000, 26, 40, "cavitating loose_mount normal worn_bearing"},
	} {
		rows, truth := read(t, c.table), read(t, c.truth)
		if len(rows) != c.rows+1 || len(truth) != c.rows+1 || len(rows[0]) != c.columns {
			t.Errorf("%s: %d rows of %d columns, %d truths", c.table, len(rows)-1, len(rows[0]), len(truth)-1)
			continue
		}
		if want := rows[0][c.columns-1] + "_truth"; truth[0][1] != want {
			t.Errorf("%s: truth column %q, want %q", c.truth, truth[0][1], want)
		}
		labelled, given := 0, map[string]int{}
		for i, row := range rows[1:] {
			for _, cell := range row[1 : c.columns-1] {
				if _, err := strconv.ParseFloat(cell, 64); err != nil {
					t.Fatalf("%s row %d: %v", c.table, i+1, err)
				}
			}
			if row[0] != truth[i+1][0] {
				t.Fatalf("%s row %d: id %s beside truth of %s", c.table, i+1, row[0], truth[i+1][0])
			}
			if cell := row[c.columns-1]; cell != "" {
				labelled++
				given[cell]++
				if cell != truth[i+1][1] {
					t.Errorf("%s row %d: label %s, truth %s", c.table, i+1, cell, truth[i+1][1])
				}
			}
		}
		if labelled != c.labelled {
			t.Errorf("%s: %d labelled, want %d", c.table, labelled, c.labelled)
		}
		for _, class := range strings.Fields(c.classes) {
			if given[class] < 4 {
				t.Errorf("%s: %d labels of %s, too few to learn from", c.table, given[class], class)
			}
		}
	}
}

// A straight-line rule must not do: the nearest class mean, told the truth of every row, gets a good share wrong in
// the plane of the map.
func TestRegionsAreCurved(t *testing.T) {
	rows, truth := read(t, SeabedFile), read(t, SeabedTruthFile)
	type sum struct{ n, x, y float64 }
	means := map[string]*sum{}
	at := func(i int) (x, y float64) {
		x, _ = strconv.ParseFloat(rows[i][1], 64)
		y, _ = strconv.ParseFloat(rows[i][2], 64)
		return x, y
	}
	for i := 1; i < len(rows); i++ {
		m := means[truth[i][1]]
		if m == nil {
			m = &sum{}
			means[truth[i][1]] = m
		}
		x, y := at(i)
		m.n, m.x, m.y = m.n+1, m.x+x, m.y+y
	}
	wrong := 0
	for i := 1; i < len(rows); i++ {
		x, y := at(i)
		own := means[truth[i][1]]
		d := func(m *sum) float64 { return (x-m.x/m.n)*(x-m.x/m.n) + (y-m.y/m.n)*(y-m.y/m.n) }
		for _, m := range means {
			if d(m) < d(own) {
				wrong++
				break
			}
		}
	}
	if share := float64(wrong) / float64(len(rows)-1); share < 0.3 {
		t.Errorf("the nearest class mean on the map is wrong for %.3f of the cells only", share)
	}
}
