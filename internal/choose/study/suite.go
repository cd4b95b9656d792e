package main

import (
	"fmt"
	"math"
)

// Rows of the generated tables.
const (
	classRows  = 300
	numberRows = 400
)

// classTables are the tables with classes: open ones from dir, then generated ones. A held-back suite is another seed
// and other sizes of the same makers, never looked at while the rule was made.
func classTables(dir string, held uint64) ([]*table, error) {
	var all []*table
	if held == 0 {
		for _, name := range []string{"iris", "wine", "digits"} {
			t, err := open(dir, name)
			if err != nil {
				return nil, err
			}
			all = append(all, t)
		}
	}
	number := held * 1000
	add := func(name string, make func(number uint64) ([][]float64, []int)) {
		number++
		rows, class := make(number)
		all = append(all, &table{name: name, raw: matrix(rows), class: class})
	}
	cluster := func(n, d, columns int, gap float64, share, spread []float64) func(uint64) ([][]float64, []int) {
		return func(k uint64) ([][]float64, []int) {
			r := seedOf(1, k)
			rows, class := blobs(r, n, d, gap, share, spread)
			if columns > d {
				rows = embed(r, rows, columns)
			}
			return rows, class
		}
	}
	add("2 clusters apart, d 3", cluster(classRows, 3, 3, 6, equal(2), nil))
	add("3 clusters, d 2", cluster(classRows, 2, 2, 4, equal(3), nil))
	add("4 clusters, d 5", cluster(classRows, 5, 5, 4, equal(4), nil))
	add("5 clusters, d 10 in 30", cluster(classRows, 10, 30, 4.5, equal(5), nil))
	add("2 clusters 8:2, d 3", cluster(classRows, 3, 3, 3, []float64{.8, .2}, nil))
	add("3 clusters 6:3:1, d 4", cluster(classRows, 4, 4, 4, []float64{.6, .3, .1}, nil))
	add("3 clusters of unlike spread, d 2", cluster(classRows, 2, 2, 5, equal(3), []float64{.4, 1, 1.8}))
	add("moons, little noise", func(k uint64) ([][]float64, []int) { return moons(seedOf(1, k), classRows, .12) })
	add("moons, much noise", func(k uint64) ([][]float64, []int) { return moons(seedOf(1, k), classRows, .25) })
	add("3 rings", func(k uint64) ([][]float64, []int) { return rings(seedOf(1, k), classRows, 3, .2) })
	add("square, halves", func(k uint64) ([][]float64, []int) {
		rows := uniforms(seedOf(1, k), classRows, 2)
		class := make([]int, len(rows))
		for i, x := range rows {
			if x[0] > .5 {
				class[i] = 1
			}
		}
		return rows, class
	})
	add("square, checked", func(k uint64) ([][]float64, []int) {
		rows := uniforms(seedOf(1, k), classRows, 2)
		class := make([]int, len(rows))
		for i, x := range rows {
			if (x[0] > .5) != (x[1] > .5) {
				class[i] = 1
			}
		}
		return rows, class
	})
	add("roll, 3 bands", func(k uint64) ([][]float64, []int) {
		rows, t, _ := roll(seedOf(1, k), classRows)
		return rows, bands(t, 1./3, 1./3, 1./3)
	})
	add("sphere d 2 in 8, 3 bands", func(k uint64) ([][]float64, []int) {
		r := seedOf(1, k)
		rows := sphere(r, classRows, 2)
		v := make([]float64, len(rows))
		for i, x := range rows {
			v[i] = x[0]
		}
		return embed(r, rows, 8), bands(v, .3, .4, .3)
	})
	for _, c := range []struct {
		d, columns int
		shares     []float64
	}{{1, 3, []float64{.5, .5}}, {3, 10, []float64{.5, .5}}, {4, 12, []float64{.75, .25}}, {5, 20, []float64{.4, .6}}, {10, 50, []float64{.5, .5}}} {
		add(fmt.Sprintf("cube d %d in %d, %g:%g", c.d, c.columns, c.shares[0], c.shares[1]), func(k uint64) ([][]float64, []int) {
			r := seedOf(1, k)
			rows := uniforms(r, classRows, c.d)
			return embed(r, rows, c.columns), bands(along(r, rows), c.shares...)
		})
	}
	return all, nil
}

// numberTables are the tables with numbers.
func numberTables(held uint64) []*table {
	var all []*table
	number := held * 1000
	add := func(name string, make func(number uint64) ([][]float64, []float64)) {
		number++
		rows, value := make(number)
		all = append(all, &table{name: name, raw: matrix(rows), value: value})
	}
	of := func(rows [][]float64, f func(x []float64) float64) []float64 {
		v := make([]float64, len(rows))
		for i, x := range rows {
			v[i] = f(x)
		}
		return v
	}
	add("square, waves", func(k uint64) ([][]float64, []float64) {
		rows := uniforms(seedOf(2, k), numberRows, 2)
		return rows, of(rows, func(x []float64) float64 { return math.Sin(2*math.Pi*x[0]) * math.Cos(math.Pi*x[1]) })
	})
	add("square, plane", func(k uint64) ([][]float64, []float64) {
		rows := uniforms(seedOf(2, k), numberRows, 2)
		return rows, of(rows, func(x []float64) float64 { return x[0] + x[1]/2 })
	})
	add("square, wave and noise", func(k uint64) ([][]float64, []float64) {
		r := seedOf(2, k)
		rows := uniforms(r, numberRows, 2)
		return rows, of(rows, func(x []float64) float64 { return math.Sin(2*math.Pi*x[0]) + .4*r.NormFloat64() })
	})
	add("roll, angle", func(k uint64) ([][]float64, []float64) {
		rows, t, _ := roll(seedOf(2, k), numberRows)
		return rows, t
	})
	add("roll, wave and height", func(k uint64) ([][]float64, []float64) {
		rows, t, h := roll(seedOf(2, k), numberRows)
		v := make([]float64, len(t))
		for i := range v {
			v[i] = math.Sin(t[i]/2) + h[i]/21
		}
		return rows, v
	})
	for _, d := range []int{2, 4} {
		add(fmt.Sprintf("sphere d %d in %d", d, 3*d+3), func(k uint64) ([][]float64, []float64) {
			r := seedOf(2, k)
			rows := sphere(r, numberRows, d)
			return embed(r, rows, 3*d+3), of(rows, func(x []float64) float64 { return x[0] + x[1]*x[2] })
		})
	}
	for _, c := range [][2]int{{1, 3}, {2, 10}, {3, 6}, {4, 23}, {5, 50}, {7, 20}, {10, 50}} {
		add(fmt.Sprintf("cube d %d in %d, plane", c[0], c[1]), func(k uint64) ([][]float64, []float64) {
			r := seedOf(2, k)
			rows := uniforms(r, numberRows, c[0])
			return embed(r, rows, c[1]), along(r, rows)
		})
		add(fmt.Sprintf("cube d %d in %d, curve", c[0], c[1]), func(k uint64) ([][]float64, []float64) {
			r := seedOf(2, k)
			rows := uniforms(r, numberRows, c[0])
			return embed(r, rows, c[1]), of(rows, func(x []float64) float64 {
				v := math.Sin(3 * x[0])
				if len(x) > 1 {
					v += x[1] * x[1]
				}
				return v
			})
		})
	}
	add("steps on 4 clusters", func(k uint64) ([][]float64, []float64) {
		r := seedOf(2, k)
		rows, class := blobs(r, numberRows, 3, 5, equal(4), nil)
		v := make([]float64, len(rows))
		for i, c := range class {
			v[i] = []float64{0, 3, 1, 5}[c] + .1*r.NormFloat64()
		}
		return rows, v
	})
	return all
}
