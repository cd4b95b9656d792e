// Package demo makes the demo tables: Files gives them as bytes, ready to be written.
//
// Everything in them is invented: a survey of a tidal flat that does not exist and sound clips of pumps that were
// never built. The values are believable in kind and unit and nothing more. Each table comes with its truth, the
// column that an expert would have filled in had anyone paid for it, so that a completed table can be assessed.
//
// The same seed gives the same bytes on every machine: a pinned generator (PCG), arithmetic that is correctly rounded
// everywhere (+, -, *, /, square root, never fused), no elementary function, and fixed decimals.
package demo

import (
	"bytes"
	"math/rand/v2"
	"strconv"
)

// Seed is the seed of the tables that the documentation shows.
const Seed = 20260

// Files of a demo, in the order in which Files gives them.
const (
	SeabedFile      = "seabed.csv"
	SeabedTruthFile = "seabed_truth.csv"
	GrainFile       = "grain.csv"
	GrainTruthFile  = "grain_truth.csv"
	ClipsFile       = "clips.csv"
	ClipsTruthFile  = "clips_truth.csv"
	ReadmeFile      = "README.txt"
)

// File is one file of the demo.
type File struct {
	Name string
	Data []byte
}

// Files makes the demo tables:
//
//   - seabed.csv: sounding cells of a tidal flat (cell, easting_m, northing_m, depth_m, backscatter_db, roughness_cm,
//     slope_deg) with the class of the bottom where a grab sample was taken (48 cells);
//   - grain.csv: the same cells with the median grain size in phi units (60 cells);
//   - clips.csv: sound clips of pumps, 24 columns, with the state of the pump where a mechanic listened (40 clips);
//   - *_truth.csv: the id and the truth of every row, in the same order;
//   - README.txt: what the columns mean, and that all of it is invented.
//
// Labelled rows are drawn at random, each row as likely as any other.
func Files(seed uint64) []File {
	bottom, grain := survey(seed)
	clips := pumps(seed)
	return []File{
		{SeabedFile, bottom.csv()},
		{SeabedTruthFile, bottom.truthCSV()},
		{GrainFile, grain.csv()},
		{GrainTruthFile, grain.truthCSV()},
		{ClipsFile, clips.csv()},
		{ClipsTruthFile, clips.truthCSV()},
		{ReadmeFile, []byte(readme)},
	}
}

// column is a numeric column, printed with a fixed number of decimals.
type column struct {
	name     string
	decimals int
	values   []float64
}

// dataset is a table with the truth of every row and the rows of which it is told.
type dataset struct {
	id       string
	ids      []string
	columns  []column
	label    string
	truth    []string // text of each row's label
	labelled []bool
}

func (d *dataset) csv() []byte {
	var b bytes.Buffer
	b.WriteString(d.id)
	for _, c := range d.columns {
		b.WriteByte(',')
		b.WriteString(c.name)
	}
	b.WriteByte(',')
	b.WriteString(d.label)
	b.WriteByte('\n')
	for i, id := range d.ids {
		b.WriteString(id)
		for _, c := range d.columns {
			b.WriteByte(',')
			b.WriteString(decimal(c.values[i], c.decimals))
		}
		b.WriteByte(',')
		if d.labelled[i] {
			b.WriteString(d.truth[i])
		}
		b.WriteByte('\n')
	}
	return b.Bytes()
}

func (d *dataset) truthCSV() []byte {
	var b bytes.Buffer
	b.WriteString(d.id + "," + d.label + "_truth\n")
	for i, id := range d.ids {
		b.WriteString(id + "," + d.truth[i] + "\n")
	}
	return b.Bytes()
}

// decimal writes v with fixed decimals, zero without a sign.
func decimal(v float64, decimals int) string {
	s := strconv.FormatFloat(v, 'f', decimals, 64)
	if s[0] == '-' {
		if z, err := strconv.ParseFloat(s, 64); err == nil && z == 0 {
			return s[1:]
		}
	}
	return s
}

// draw marks count of n rows, drawn without replacement, each row as likely as any other.
func draw(r *rand.Rand, n, count int) []bool {
	marked := make([]bool, n)
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	for i := range count {
		j := i + int(r.Uint64()%uint64(n-i))
		order[i], order[j] = order[j], order[i]
		marked[order[i]] = true
	}
	return marked
}
