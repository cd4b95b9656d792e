package table

import (
	"bufio"
	"context"
	"encoding/csv"
	"io"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"
)

// numberText is a table of normal numbers with six decimals.
func numberText(rows, cols int) string { return numberTable(rows, cols, 'f', 6) }

func numberTable(rows, cols int, format byte, digits int) string {
	r := rand.New(rand.NewPCG(8, 15))
	var b []byte
	for c := range cols {
		if c > 0 {
			b = append(b, ',')
		}
		b = append(append(b, 'x'), strconv.Itoa(c)...)
	}
	b = append(b, '\n')
	for range rows {
		for c := range cols {
			if c > 0 {
				b = append(b, ',')
			}
			b = strconv.AppendFloat(b, r.NormFloat64()*100, format, digits, 64)
		}
		b = append(b, '\n')
	}
	return string(b)
}

// BenchmarkRead reads 1,000,000 x 10 numbers from a file, against encoding/csv with ParseFloat on the same file in
// the same run; "ratio" is how many times faster Read and Numbers are together.
func BenchmarkRead(b *testing.B) {
	const rows, cols = 1_000_000, 10
	all := make([]int, cols)
	for c := range all {
		all[c] = c
	}
	for _, kind := range []struct {
		name   string
		format byte
		digits int
	}{{"decimals6", 'f', 6}, {"shortest", 'g', -1}} {
		b.Run(kind.name, func(b *testing.B) {
			path := filepath.Join(b.TempDir(), "t.csv")
			if err := os.WriteFile(path, []byte(numberTable(rows, cols, kind.format, kind.digits)), 0o666); err != nil {
				b.Fatal(err)
			}
			// Each round times both; the best rounds are compared, since other work on the machine only ever adds.
			library, read, parse := time.Hour, time.Hour, time.Hour
			for b.Loop() {
				began := time.Now()
				want := readWithLibrary(b, path, rows, cols)
				library = min(library, time.Since(began))
				began = time.Now()
				tab, err := Read(context.Background(), path, nil, Options{})
				if err != nil {
					b.Fatal(err)
				}
				read = min(read, time.Since(began))
				began = time.Now()
				n, err := tab.Numbers(context.Background(), all, NumberOptions{})
				if err != nil {
					b.Fatal(err)
				}
				parse = min(parse, time.Since(began))
				for i, v := range want {
					if n.Data[i] != v {
						b.Fatalf("cell %d: %v, want %v", i, n.Data[i], v)
					}
				}
			}
			b.ReportMetric(library.Seconds()/(read+parse).Seconds(), "ratio")
			b.ReportMetric(library.Seconds(), "library-s")
			b.ReportMetric(read.Seconds(), "read-s")
			b.ReportMetric(parse.Seconds(), "parse-s")
		})
	}
}

func readWithLibrary(b *testing.B, path string, rows, cols int) []float64 {
	f, err := os.Open(path)
	if err != nil {
		b.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(bufio.NewReaderSize(f, 1<<16))
	r.ReuseRecord = true
	if _, err := r.Read(); err != nil {
		b.Fatal(err)
	}
	data := make([]float64, 0, rows*cols)
	for {
		record, err := r.Read()
		if err == io.EOF {
			return data
		}
		if err != nil {
			b.Fatal(err)
		}
		for _, cell := range record {
			v, err := strconv.ParseFloat(cell, 64)
			if err != nil {
				b.Fatal(err)
			}
			data = append(data, v)
		}
	}
}

// BenchmarkStream reads 10 numbers a row in batches, appends three cells and writes a file: rows a second.
func BenchmarkStream(b *testing.B) {
	const rows, cols = 500_000, 10
	text := numberText(rows, cols)
	dir := b.TempDir()
	all := make([]int, cols)
	for c := range all {
		all[c] = c
	}
	for b.Loop() {
		s, err := OpenStream(context.Background(), "-", strings.NewReader(text), Options{})
		if err != nil {
			b.Fatal(err)
		}
		var set Outputs
		out, err := set.Create(filepath.Join(dir, "out.csv"))
		if err != nil {
			b.Fatal(err)
		}
		for {
			batch, err := s.Next()
			if err == io.EOF {
				break
			}
			if err != nil {
				b.Fatal(err)
			}
			n, err := batch.Numbers(context.Background(), all, NumberOptions{})
			if err != nil {
				b.Fatal(err)
			}
			err = WriteAppended(out, batch, []Column{
				{Name: "label", Cell: func(row int, dst []byte) []byte { return strconv.AppendFloat(dst, n.Data[row*cols], 'g', -1, 64) }},
				{Name: "origin", Cell: func(_ int, dst []byte) []byte { return append(dst, "inferred"...) }},
				{Name: "set", Cell: func(_ int, dst []byte) []byte { return append(dst, "mud|sand"...) }},
			})
			if err != nil {
				b.Fatal(err)
			}
		}
		s.Close()
		if err := set.Commit(); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(rows*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
}
