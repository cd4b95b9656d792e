package job

import (
	"bytes"
	"encoding/csv"
	"math"
	"path/filepath"
	"strconv"
	"testing"
	"time"
)

func timed(f func()) float64 {
	began := time.Now()
	f()
	return time.Since(began).Seconds()
}

// planeError is the root mean square error of a completed plane.
func planeError(t *testing.T, done []byte) float64 {
	t.Helper()
	rows, err := csv.NewReader(bytes.NewReader(done)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var square float64
	for _, r := range rows[1:] {
		var v [3]float64
		for i, cell := range []string{r[1], r[2], r[4]} {
			if v[i], err = strconv.ParseFloat(cell, 64); err != nil {
				t.Fatal(err)
			}
		}
		d := v[2] - math.Sin(5*v[0]) - v[1]
		square += d * d
	}
	return math.Sqrt(square / float64(len(rows)-1))
}

// Solving on a fifth of the rows and extending costs little beside the error that few labels leave anyway: within 1%
// of the range of the labels, which is about 3.
func TestSolveOnFewerBesideFullSolve(t *testing.T) {
	table := filepath.Join(t.TempDir(), "t.csv")
	plane(t, table, 5000, 50, 4)
	var errs []float64
	for _, fewer := range []int{0, 1000} {
		var out bytes.Buffer
		o := planeOptions(table, 2)
		o.SolveOn, o.Stdout = fewer, &out
		if err := Label(t.Context(), o); err != nil {
			t.Fatal(err)
		}
		errs = append(errs, planeError(t, out.Bytes()))
	}
	if math.Abs(errs[1]-errs[0]) > 0.03 {
		t.Errorf("error %v solved on a fifth of the rows, %v on all", errs[1], errs[0])
	}
}

func TestRankOf(t *testing.T) {
	a, whole := rankOf(3, []float64{0, 1})
	b, _ := rankOf(3, []float64{math.Copysign(0, -1), 1})
	c, _ := rankOf(4, []float64{0, 1})
	d, _ := rankOf(3, []float64{1, 0})
	if !whole || a != b || a == c || a == d {
		t.Errorf("ranks %x %x %x %x", a, b, c, d)
	}
	if _, whole := rankOf(3, []float64{1, math.NaN()}); whole {
		t.Error("a row without a feature is drawn")
	}
}
