package testproblems

import (
	"math"
	"math/big"
)

// Rational solves p = 2 by Gaussian elimination in rational arithmetic, free of rounding but for the conductances
// c = w^2, taken as the float64 nearest to exp(2 ln w), and the last conversion. It is meant for at most a few dozen
// free vertices, each in a component with a label.
func Rational(pr Problem) []float64 {
	held := pr.Hold()
	index := make([]int, pr.Graph.N)
	var free []int
	for v, y := range held {
		if math.IsNaN(y) {
			index[v] = len(free)
			free = append(free, v)
		}
	}
	m := len(free)
	a := make([][]*big.Rat, m) // row i of [L_UU | -L_US y]
	for i, v := range free {
		a[i] = make([]*big.Rat, m+1)
		for j := range a[i] {
			a[i][j] = new(big.Rat)
		}
		cols, vals := pr.Graph.Row(v)
		for k, u := range cols {
			c := new(big.Rat).SetFloat64(math.Exp(2 * vals[k]))
			a[i][i].Add(a[i][i], c)
			if math.IsNaN(held[u]) {
				a[i][index[u]].Sub(a[i][index[u]], c)
			} else {
				a[i][m].Add(a[i][m], c.Mul(c, new(big.Rat).SetFloat64(held[u])))
			}
		}
	}
	t, f := new(big.Rat), new(big.Rat)
	for k := range m {
		for i := k + 1; i < m; i++ {
			if a[i][k].Sign() == 0 {
				continue
			}
			f.Quo(a[i][k], a[k][k])
			for j := k; j <= m; j++ {
				a[i][j].Sub(a[i][j], t.Mul(f, a[k][j]))
			}
		}
	}
	for k := m - 1; k >= 0; k-- {
		for j := k + 1; j < m; j++ {
			a[k][m].Sub(a[k][m], t.Mul(a[k][j], a[j][m]))
		}
		a[k][m].Quo(a[k][m], a[k][k])
		held[free[k]], _ = a[k][m].Float64()
	}
	return held
}
