package main

import (
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
)

var scored = []string{"label", "t.csv", "--label", "kind", "--id", "id", "--p", "3", "--scores", "--quiet", "-o", "out.csv", "--record", "r.json"}

// TestSameBytes runs one job with several numbers of workers and processors, over again, and on rows in 20 orders: one
// table and one record whatever the workers, the same row bytes whatever the order.
func TestSameBytes(t *testing.T) {
	orders := 20
	if testing.Short() {
		orders = 4
	}
	want := map[string]string{}
	for order := range orders {
		dir := t.TempDir()
		sheet(t, dir, 240, uint64(order))
		for i, how := range [][]string{{"--workers", "1"}, {"--workers", "2"}, {"--workers", "7"}, nil} {
			if order > 1 && i > 0 {
				break
			}
			code, msg := runBinary(t, dir, []string{fmt.Sprintf("GOMAXPROCS=%d", 1+3*i)}, append(slices.Clone(scored), how...)...)
			if code != 0 {
				t.Fatalf("exit %d: %s", code, msg)
			}
			table, record := read(t, dir, "out.csv"), read(t, dir, "r.json")
			lines := strings.SplitAfter(table, "\n")
			slices.Sort(lines)
			for name, got := range map[string]string{"sorted rows": strings.Join(lines, ""), fmt.Sprint("table in order ", order): table, fmt.Sprint("record in order ", order): record} {
				if w, ok := want[name]; !ok {
					want[name] = got
				} else if w != got {
					t.Fatalf("order %d, %v: the %s differ from an earlier run", order, how, name)
				}
			}
		}
	}
}

func read(t *testing.T, dir, name string) string {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(dir, name))
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// scores gives a score column by id.
func scores(t *testing.T, text string) map[string]float64 {
	t.Helper()
	rows, err := csv.NewReader(strings.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	c := slices.Index(rows[0], "pinfill_score_mud")
	out := map[string]float64{}
	for _, r := range rows[1:] {
		if out[r[0]], err = strconv.ParseFloat(r[c], 64); err != nil {
			t.Fatal(err)
		}
	}
	return out
}

// TestColumnsPermuted: distances are sums over columns, so their order moves the last digits and no more: 1e-9 of the
// label range, which is 1 here.
func TestColumnsPermuted(t *testing.T) {
	dir := t.TempDir()
	sheet(t, dir, 240, 0)
	if code, msg := runBinary(t, dir, nil, scored...); code != 0 {
		t.Fatal(msg)
	}
	want := scores(t, read(t, dir, "out.csv"))
	rows, err := csv.NewReader(strings.NewReader(read(t, dir, "t.csv"))).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	for _, r := range rows {
		b.WriteString(strings.Join([]string{r[0], r[3], r[1], r[2], r[4]}, ",") + "\n")
	}
	if err := os.WriteFile(filepath.Join(dir, "t.csv"), []byte(b.String()), 0o666); err != nil {
		t.Fatal(err)
	}
	if code, msg := runBinary(t, dir, nil, scored...); code != 0 {
		t.Fatal(msg)
	}
	for id, got := range scores(t, read(t, dir, "out.csv")) {
		if d := math.Abs(got - want[id]); d > 1e-9 {
			t.Errorf("row %s moved by %v", id, d)
		}
	}
}

// TestMemoryEstimate holds the peak to 1.3 times the estimate that the record announces.
func TestMemoryEstimate(t *testing.T) {
	if testing.Short() {
		t.Skip("a few seconds")
	}
	dir := t.TempDir()
	sheet(t, dir, 40000, 0)
	cmd := exec.Command(binary(t), "label", "t.csv", "--label", "kind", "--id", "id", "--p", "2", "--quiet", "-o", "out.csv", "--record", "r.json")
	cmd.Dir = dir
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	var rec struct {
		Table struct {
			Memory int64 `json:"memory_estimate_bytes"`
		}
	}
	if err := json.Unmarshal([]byte(read(t, dir, "r.json")), &rec); err != nil {
		t.Fatal(err)
	}
	usage, ok := cmd.ProcessState.SysUsage().(*syscall.Rusage)
	if !ok {
		t.Skip("no resource usage here")
	}
	peak := usage.Maxrss * 1024 // kB on Linux
	t.Logf("peak %d, estimate %d", peak, rec.Table.Memory)
	if rec.Table.Memory == 0 || float64(peak) > 1.3*float64(rec.Table.Memory) {
		t.Errorf("peak of %d bytes, estimate %d", peak, rec.Table.Memory)
	}
}
