package neighbors

import (
	"context"
	"crypto/sha256"
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"pinfill/internal/points"
)

// TestReferenceLists holds every engine against the lists that SciPy's cKDTree gives on open tables (testdata/*.txt,
// written by testdata/reference.py, versions in their first line). SciPy settles ties in its own way, so that a
// neighbour may differ where its distance does not.
func TestReferenceLists(t *testing.T) {
	for _, name := range []string{"iris", "wine", "digits"} {
		t.Run(name, func(t *testing.T) {
			raw, sum := openTable(t, "../../testdata/open/"+name+".csv")
			text, err := os.ReadFile("testdata/" + name + ".txt")
			if err != nil {
				t.Fatal(err)
			}
			lines := strings.Split(strings.TrimSpace(string(text)), "\n")
			if !strings.Contains(lines[1], sum) {
				t.Fatalf("the lists are of another table than sha256 %s: %s", sum, lines[1])
			}
			s, err := points.Prepare(context.Background(), raw, points.Options{Scale: points.None})
			if err != nil {
				t.Fatal(err)
			}
			if s.Points.N != len(lines)-2 {
				t.Fatalf("%d distinct rows, the reference has %d", s.Points.N, len(lines)-2)
			}
			order := make([]int, s.Points.N) // vertices in lexicographic order
			for i := range order {
				order[i] = i
			}
			slices.SortFunc(order, func(a, b int) int { return slices.Compare(s.Points.Row(a), s.Points.Row(b)) })
			for engine, l := range engines(t, s.Points, 10, Options{Metric: points.Euclidean, Workers: 2}) {
				wrong := 0
				for rank, line := range lines[2:] {
					if err := compareReference(l, order, rank, line); err != nil {
						if wrong++; wrong < 4 {
							t.Errorf("%s: %v", engine, err)
						}
					}
				}
			}
			shifted := lines[3]
			if compareReference(&Lists{N: s.Points.N, K: 10, Index: make([]int32, 10*s.Points.N), Dist: make([]float64, 10*s.Points.N)}, order, 1, shifted) == nil {
				t.Error("empty lists passed")
			}
		})
	}
}

// compareReference holds the list of the row of a rank against a line of the reference. Sums of up to 61 squares in
// another order differ by less than 1e-14 of themselves.
func compareReference(l *Lists, order []int, rank int, line string) error {
	dists, indices, _ := strings.Cut(line, " | ")
	wantDist, wantIndex := strings.Fields(dists), strings.Fields(indices)
	index, dist := l.Row(order[rank])
	for r := range dist {
		want, err := strconv.ParseFloat(wantDist[r], 64)
		if err != nil {
			return err
		}
		if math.Abs(dist[r]-want) > 1e-14*want {
			return fmt.Errorf("row %d: neighbour %d at %v, SciPy has %v", rank, r, dist[r], want)
		}
		j, err := strconv.Atoi(wantIndex[r])
		if err != nil {
			return err
		}
		tied := r == len(dist)-1 || math.Abs(dist[r+1]-dist[r]) < 1e-13*want || r > 0 && math.Abs(dist[r]-dist[r-1]) < 1e-13*want
		if order[j] != int(index[r]) && !tied {
			return fmt.Errorf("row %d: neighbour %d is vertex %d, SciPy has %d", rank, r, index[r], order[j])
		}
	}
	return nil
}

// openTable reads the feature columns of an open table and the SHA-256 of the file.
func openTable(t *testing.T, path string) (*points.Matrix, string) {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(strings.NewReader(string(text))).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	m := points.NewMatrix(len(rows)-1, len(rows[0])-2) // id first, truth last
	for i, row := range rows[1:] {
		for j, cell := range row[1 : len(row)-1] {
			if m.Row(i)[j], err = strconv.ParseFloat(cell, 64); err != nil {
				t.Fatal(err)
			}
		}
	}
	return m, fmt.Sprintf("%x", sha256.Sum256(text))
}
