package report

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// principalWork bounds the multiplications behind Directions; larger tables are thinned to it.
const principalWork = 2e9

// principalDims is the number of columns from which the Gram matrix of that many rows stands for the covariance.
const principalDims = 400

// Directions gives the first two principal directions of the rows of x (row major, n rows of d columns, finite), their
// centre, and the share of the variance along each. On large tables it looks at evenly spaced rows: at most about
// 2e9/d^2 of them, or 400 where columns are more. Each direction's largest component is positive, the first of equals, so
// that the sign is not the solver's. It is false where no direction can be told.
func Directions(x []float64, d int) (centre []float64, axes [2][]float64, share [2]float64, ok bool) {
	if d < 1 || len(x) < 2*d {
		return nil, axes, share, false
	}
	n := len(x) / d
	most := max(principalDims, int(principalWork/float64(d*d)))
	if d > principalDims {
		most = principalDims
	}
	m := min(n, most)
	row := func(i int) []float64 {
		at := int(uint64(i) * uint64(n) / uint64(m))
		return x[at*d : (at+1)*d]
	}
	centre = make([]float64, d)
	for i := range m {
		for j, v := range row(i) {
			centre[j] += v / float64(m)
		}
	}
	var all float64
	if d <= principalDims {
		axes, share, all = byCovariance(row, m, d, centre)
	} else {
		axes, share, all = byGram(row, m, d, centre)
	}
	if !(all > 0) || axes[0] == nil || math.IsInf(all, 0) {
		return nil, axes, share, false
	}
	for a := range axes {
		share[a] = max(share[a]/all, 0)
		orient(axes[a])
	}
	return centre, axes, share, true
}

// orient turns a direction so that its largest component is positive.
func orient(v []float64) {
	best := 0
	for j := range v {
		if math.Abs(v[j]) > math.Abs(v[best])*(1+1e-9) {
			best = j
		}
	}
	if len(v) > 0 && v[best] < 0 {
		for j := range v {
			v[j] = -v[j]
		}
	}
}

func byCovariance(row func(int) []float64, m, d int, centre []float64) (axes [2][]float64, share [2]float64, all float64) {
	cov := make([]float64, d*d)
	c := make([]float64, d)
	for i := range m {
		for j, v := range row(i) {
			c[j] = v - centre[j]
		}
		for j, v := range c {
			out := cov[j*d : j*d+j+1]
			for k := range out {
				out[k] += float64(v * c[k])
			}
		}
	}
	sym := mat.NewSymDense(d, nil)
	for j := range d {
		for k := range j + 1 {
			sym.SetSym(j, k, cov[j*d+k])
		}
		all += cov[j*d+j]
	}
	var e mat.EigenSym
	if math.IsInf(all, 0) || math.IsNaN(all) || !e.Factorize(sym, true) {
		return axes, share, all
	}
	values := e.Values(nil) // ascending
	var vectors mat.Dense
	e.VectorsTo(&vectors)
	for a := range axes {
		axes[a] = make([]float64, d)
		if j := d - 1 - a; j >= 0 {
			mat.Col(axes[a], j, &vectors)
			share[a] = values[j]
		}
	}
	return axes, share, all
}

// byGram finds the directions from the inner products of a few rows: with C the centred rows, C C^T u = s u gives the
// direction C^T u.
func byGram(row func(int) []float64, m, d int, centre []float64) (axes [2][]float64, share [2]float64, all float64) {
	c := mat.NewDense(m, d, nil)
	for i := range m {
		to := c.RawRowView(i)
		for j, v := range row(i) {
			to[j] = v - centre[j]
		}
	}
	gram := mat.NewSymDense(m, nil)
	gram.SymOuterK(1, c)
	for i := range m {
		all += gram.At(i, i)
	}
	var e mat.EigenSym
	if math.IsInf(all, 0) || math.IsNaN(all) || !e.Factorize(gram, true) {
		return axes, share, all
	}
	values := e.Values(nil)
	var vectors mat.Dense
	e.VectorsTo(&vectors)
	for a := range axes {
		axes[a] = make([]float64, d)
		j := m - 1 - a
		if j < 0 || !(values[j] > 0) {
			continue
		}
		share[a] = values[j]
		v := mat.NewVecDense(d, axes[a])
		v.MulVec(c.T(), vectors.ColView(j))
		v.ScaleVec(1/mat.Norm(v, 2), v)
	}
	return axes, share, all
}

// Project gives a point's place along the two directions.
func Project(x, centre []float64, axes [2][]float64) (u, v float64) {
	for j, c := range centre {
		u += float64((x[j] - c) * axes[0][j])
		v += float64((x[j] - c) * axes[1][j])
	}
	return u, v
}
