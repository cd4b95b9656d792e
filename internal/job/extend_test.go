package job

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"

	"pinfill/internal/encode"
	"pinfill/internal/graph"
	"pinfill/internal/points"
)

// plane writes a table of n rows on the unit square, every so many of them with a smooth number as its label.
func plane(tb testing.TB, path string, n, every int, seed uint64) {
	tb.Helper()
	rng := rand.New(rand.NewPCG(seed, 9))
	var b bytes.Buffer
	b.WriteString("cell,x,y,level\n")
	for i := range n {
		x, y := rng.Float64(), rng.Float64()
		label := ""
		if every > 0 && i%every == 0 {
			label = fmt.Sprintf("%.4f", math.Sin(5*x)+y)
		}
		fmt.Fprintf(&b, "c%07d,%.6f,%.6f,%s\n", i, x, y, label)
	}
	if err := os.WriteFile(path, b.Bytes(), 0o666); err != nil {
		tb.Fatal(err)
	}
}

func planeOptions(table string, p float64) *Options {
	return &Options{
		Table: table, Label: "level", ID: "cell", Decimal: '.', Missing: encode.MissingStop, Conflicts: encode.ConflictsStop, Scale: points.Standard,
		Metric: points.Euclidean, Neighbors: []int{10}, Bandwidths: []graph.Bandwidth{{Local: true, H: 1}}, Kernels: []graph.Kernel{graph.Gaussian},
		Unreachable: Bridge, Search: "auto", P: []float64{p}, Balance: encode.Balance{Mode: "auto"}, Coverage: 0.9, Drawn: DrawnRandom, Seed: 20,
		Stdout: io.Discard, Output: "-", Workers: 2,
	}
}

func extendOptions(model, table string) *ExtendOptions {
	o := &Options{Table: table, Output: "-", Stdout: io.Discard, Decimal: '.', Workers: 2, Coverage: 0.9}
	return &ExtendOptions{Options: o, ModelFile: model, Given: func(string) bool { return false }}
}

// savedPlane is a model of a solved plane.
func savedPlane(tb testing.TB, dir string, n int, p float64) string {
	tb.Helper()
	train, model := filepath.Join(dir, "train.csv"), filepath.Join(dir, "model")
	plane(tb, train, n, n/100, 1)
	o := planeOptions(train, p)
	o.Model = model
	if err := Label(tb.Context(), o); err != nil {
		tb.Fatal(err)
	}
	return model
}

// BenchmarkExtend labels 200,000 new rows file to file and gives rows a second beside a plain copy of the file by
// encoding/csv in the same run.
func BenchmarkExtend(b *testing.B) {
	dir := b.TempDir()
	const rows = 200_000
	fresh := filepath.Join(dir, "new.csv")
	plane(b, fresh, rows, 0, 2)
	for _, p := range []float64{2, 6, math.Inf(1)} {
		b.Run("p="+PText(p), func(b *testing.B) {
			model := savedPlane(b, b.TempDir(), 20_000, p)
			var copied float64
			for b.Loop() {
				b.StopTimer()
				copied += copyCSV(b, fresh, filepath.Join(dir, "copy.csv"))
				b.StartTimer()
				e := extendOptions(model, fresh)
				e.Output = filepath.Join(dir, "out.csv")
				if err := Extend(b.Context(), e); err != nil {
					b.Fatal(err)
				}
			}
			seconds := b.Elapsed().Seconds()
			b.ReportMetric(rows*float64(b.N)/seconds, "rows/s")
			b.ReportMetric(seconds/copied, "times-csv-copy")
		})
	}
}

// copyCSV copies a file record by record and gives the seconds taken.
func copyCSV(b *testing.B, from, to string) float64 {
	b.Helper()
	in, err := os.Open(from)
	if err != nil {
		b.Fatal(err)
	}
	defer in.Close()
	out, err := os.Create(to)
	if err != nil {
		b.Fatal(err)
	}
	defer out.Close()
	return timed(func() {
		r, w := csv.NewReader(in), csv.NewWriter(out)
		r.ReuseRecord = true
		for {
			rec, err := r.Read()
			if err == io.EOF {
				break
			}
			if err != nil {
				b.Fatal(err)
			}
			if err := w.Write(rec); err != nil {
				b.Fatal(err)
			}
		}
		w.Flush()
	})
}
