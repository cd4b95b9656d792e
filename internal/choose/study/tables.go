package main

import (
	"encoding/csv"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strconv"

	"pinfill/internal/points"
)

// table is a table whose every label is known: classes from 0, or numbers.
type table struct {
	name  string
	raw   *points.Matrix
	class []int
	value []float64
}

// classes counts the classes.
func (t *table) classes() int { return slices.Max(t.class) + 1 }

// seedOf gives each generated table a draw of its own.
func seedOf(kind, number uint64) *rand.Rand { return rand.New(rand.NewPCG(20260101, kind<<32|number)) }

// matrix makes a raw matrix from rows.
func matrix(rows [][]float64) *points.Matrix {
	m := points.NewMatrix(len(rows), len(rows[0]))
	for i, r := range rows {
		copy(m.Row(i), r)
	}
	return m
}

func normals(r *rand.Rand, d int) []float64 {
	x := make([]float64, d)
	for j := range x {
		x[j] = r.NormFloat64()
	}
	return x
}

func uniforms(r *rand.Rand, n, d int) [][]float64 {
	rows := make([][]float64, n)
	for i := range rows {
		rows[i] = make([]float64, d)
		for j := range rows[i] {
			rows[i][j] = r.Float64()
		}
	}
	return rows
}

// embed bends a sheet of few dimensions into columns many: x = z A + sin(z B)/2 with Gaussian A and B, z standardised,
// plus noise of a fiftieth of the spread.
func embed(r *rand.Rand, rows [][]float64, columns int) [][]float64 {
	n, d := len(rows), len(rows[0])
	mean, sd := make([]float64, d), make([]float64, d)
	for _, z := range rows {
		for j, v := range z {
			mean[j] += v / float64(n)
		}
	}
	for _, z := range rows {
		for j, v := range z {
			sd[j] += (v - mean[j]) * (v - mean[j]) / float64(n)
		}
	}
	a, b := make([][]float64, d), make([][]float64, d)
	for j := range d {
		sd[j] = math.Sqrt(sd[j])
		a[j], b[j] = normals(r, columns), normals(r, columns)
	}
	out := make([][]float64, n)
	var square float64
	for i, z := range rows {
		out[i] = make([]float64, columns)
		for c := range columns {
			var lin, bend float64
			for j, v := range z {
				s := (v - mean[j]) / sd[j]
				lin += s * a[j][c]
				bend += s * b[j][c]
			}
			out[i][c] = lin + math.Sin(bend)/2
			square += out[i][c] * out[i][c]
		}
	}
	noise := .02 * math.Sqrt(square/float64(n*columns))
	for i := range out {
		for c := range out[i] {
			out[i][c] += noise * r.NormFloat64()
		}
	}
	return out
}

// blobs draws Gaussian clusters: centres at mean distance gap, shares of the rows, own spreads.
func blobs(r *rand.Rand, n, d int, gap float64, share, spread []float64) ([][]float64, []int) {
	classes := len(share)
	centre := make([][]float64, classes)
	for c := range centre {
		centre[c] = normals(r, d)
	}
	var mean float64
	pairs := 0
	for a := range centre {
		for b := range a {
			var s float64
			for j := range d {
				s += (centre[a][j] - centre[b][j]) * (centre[a][j] - centre[b][j])
			}
			mean += math.Sqrt(s)
			pairs++
		}
	}
	scale := gap * float64(pairs) / mean
	var rows [][]float64
	var class []int
	for c := range classes {
		for range int(math.Round(share[c] * float64(n))) {
			x := normals(r, d)
			for j := range x {
				if spread != nil {
					x[j] *= spread[c]
				}
				x[j] += scale * centre[c][j]
			}
			rows, class = append(rows, x), append(class, c)
		}
	}
	return rows, class
}

func equal(classes int) []float64 {
	s := make([]float64, classes)
	for c := range s {
		s[c] = 1 / float64(classes)
	}
	return s
}

func moons(r *rand.Rand, n int, noise float64) ([][]float64, []int) {
	rows, class := make([][]float64, n), make([]int, n)
	for i := range rows {
		t := math.Pi * r.Float64()
		x, y := math.Cos(t), math.Sin(t)
		if class[i] = r.IntN(2); class[i] == 1 {
			x, y = 1-x, .5-y
		}
		rows[i] = []float64{x + noise*r.NormFloat64(), y + noise*r.NormFloat64()}
	}
	return rows, class
}

func rings(r *rand.Rand, n, classes int, noise float64) ([][]float64, []int) {
	rows, class := make([][]float64, n), make([]int, n)
	for i := range rows {
		class[i] = r.IntN(classes)
		t, rad := 2*math.Pi*r.Float64(), 1+float64(class[i])+noise*r.NormFloat64()
		rows[i] = []float64{rad * math.Cos(t), rad * math.Sin(t)}
	}
	return rows, class
}

// roll is the swiss roll: angle t and height h of each row beside it.
func roll(r *rand.Rand, n int) (rows [][]float64, t, h []float64) {
	for range n {
		a, b := 1.5*math.Pi*(1+2*r.Float64()), 21*r.Float64()
		rows = append(rows, []float64{a * math.Cos(a), b, a * math.Sin(a)})
		t, h = append(t, a), append(h, b)
	}
	return rows, t, h
}

// sphere draws rows on the unit sphere of dimension d in d+1 columns.
func sphere(r *rand.Rand, n, d int) [][]float64 {
	rows := make([][]float64, n)
	for i := range rows {
		x := normals(r, d+1)
		var s float64
		for _, v := range x {
			s += v * v
		}
		for j := range x {
			x[j] /= math.Sqrt(s)
		}
		rows[i] = x
	}
	return rows
}

// bands cuts values into classes of the shares given, lowest first.
func bands(v []float64, shares ...float64) []int {
	sorted := slices.Clone(v)
	slices.Sort(sorted)
	class := make([]int, len(v))
	var at float64
	for _, s := range shares[:len(shares)-1] {
		at += s
		cut := sorted[int(at*float64(len(v)))]
		for i, x := range v {
			if x >= cut {
				class[i]++
			}
		}
	}
	return class
}

// along projects rows on a random direction.
func along(r *rand.Rand, rows [][]float64) []float64 {
	w := normals(r, len(rows[0]))
	v := make([]float64, len(rows))
	for i, x := range rows {
		for j, t := range x {
			v[i] += t * w[j]
		}
	}
	return v
}

// open reads an open table: id, features, truth.
func open(dir, name string) (*table, error) {
	f, err := os.Open(filepath.Join(dir, name+".csv"))
	if err != nil {
		return nil, err
	}
	defer f.Close()
	all, err := csv.NewReader(f).ReadAll()
	if err != nil {
		return nil, err
	}
	last := len(all[0]) - 1
	if all[0][last] != "truth" {
		return nil, fmt.Errorf("%s: last column is %q, not truth", name, all[0][last])
	}
	var names []string
	for _, r := range all[1:] {
		if !slices.Contains(names, r[last]) {
			names = append(names, r[last])
		}
	}
	slices.Sort(names)
	t := &table{name: name}
	var rows [][]float64
	for _, r := range all[1:] {
		x := make([]float64, last-1)
		for j := range x {
			if x[j], err = strconv.ParseFloat(r[j+1], 64); err != nil {
				return nil, err
			}
		}
		rows = append(rows, x)
		t.class = append(t.class, slices.Index(names, r[last]))
	}
	t.raw = matrix(rows)
	return t, nil
}
