// Package testproblems holds interpolation problems whose answers are known without any of the engines: closed
// forms (Closed), random connected graphs (Random), and slow oracles that can be trusted: rational elimination for
// p = 2 (Rational), monotone nodal sweeps for finite p >= 2 (Enclose), dense reweighting for 1 < p < 2 (Reweight) and
// repeated removal of steepest paths for p = inf (SteepestPaths). It serves tests only.
package testproblems

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/sparse"
)

// Problem asks for the minimiser of sum over edges of (w |f_i - f_j|)^p with f = Values at Fixed, or, for P = +Inf,
// for the lexicographic minimiser of the sorted slopes w |f_i - f_j|. To state it in the convention
// sum of c |f_i - f_j|^p, take ln c = p ln w.
type Problem struct {
	Name   string
	Graph  *sparse.CSR // Val holds ln w
	Fixed  []int32     // strictly increasing
	Values []float64   // one a fixed vertex
	P      float64
	Want   []float64 // one a vertex; nil where no closed form is known
}

// Range is the spread of the given values, 1 where they all agree, so that errors can be divided by it.
func (p Problem) Range() float64 {
	r := slices.Max(p.Values) - slices.Min(p.Values)
	if r == 0 {
		return 1
	}
	return r
}

// Hold gives the value each fixed vertex is held at and NaN at the free ones.
func (p Problem) Hold() []float64 {
	held := make([]float64, p.Graph.N)
	for i := range held {
		held[i] = math.NaN()
	}
	for i, v := range p.Fixed {
		held[v] = p.Values[i]
	}
	return held
}

// Error is the largest |f - Want| over the vertices, as a share of the label range.
func (p Problem) Error(f []float64) float64 { return Distance(f, p.Want) / p.Range() }

// Distance is the largest |a - b| over the entries; NaN counts as +Inf, so that it never passes for agreement.
func Distance(a, b []float64) float64 {
	if len(a) != len(b) {
		return math.Inf(1)
	}
	var worst float64
	for i := range a {
		d := math.Abs(a[i] - b[i])
		if math.IsNaN(d) {
			return math.Inf(1)
		}
		worst = max(worst, d)
	}
	return worst
}

// Edge joins two different vertices with slope weight w, given by its logarithm.
type Edge struct {
	I, J int
	LogW float64
}

// Graph builds the symmetric matrix of ln w on n vertices. A pair given twice or joined to itself is a mistake in a
// test, and panics.
func Graph(n int, edges []Edge) *sparse.CSR {
	type entry struct {
		i, j int
		v    float64
	}
	entries := make([]entry, 0, 2*len(edges))
	for _, e := range edges {
		entries = append(entries, entry{e.I, e.J, e.LogW}, entry{e.J, e.I, e.LogW})
	}
	slices.SortFunc(entries, func(a, b entry) int { return cmp.Or(a.i-b.i, a.j-b.j) })
	g := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for k, e := range entries {
		if e.i == e.j || (k > 0 && entries[k-1].i == e.i && entries[k-1].j == e.j) {
			panic(fmt.Sprintf("testproblems: edge (%d, %d) is a loop or stands twice", e.i, e.j))
		}
		g.RowPtr[e.i+1]++
		g.Col = append(g.Col, int32(e.j))
		g.Val = append(g.Val, e.v)
	}
	for i := range n {
		g.RowPtr[i+1] += g.RowPtr[i]
	}
	return g
}

// hold sorts the fixed vertices and gives them with their values.
func hold(at map[int]float64) (fixed []int32, values []float64) {
	for v := range at {
		fixed = append(fixed, int32(v))
	}
	slices.Sort(fixed)
	for _, v := range fixed {
		values = append(values, at[int(v)])
	}
	return fixed, values
}
