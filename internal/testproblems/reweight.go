package testproblems

import "math"

// Reweight minimises for 1 < p <= 2 by iterated reweighting, a majorise-minimise method that converges from anywhere:
// each step solves the p = 2 problem with conductances w^p |d|^(p-2), smoothed by an eps that shrinks to nothing, by
// dense elimination that adds only terms of one sign and so keeps every digit whatever the spread of conductances. The
// error falls by 2-p a step; the last steps must not move the values, and moved says by how much they did, as a share of
// the label range.
func Reweight(pr Problem) (f []float64, moved float64) {
	f = pr.Hold()
	free := []int{}
	var mean float64
	for _, y := range pr.Values {
		mean += y / float64(len(pr.Values))
	}
	for v := range f {
		if math.IsNaN(f[v]) {
			free = append(free, v)
			f[v] = mean
		}
	}
	top := math.Inf(-1)
	for _, v := range pr.Graph.Val {
		top = max(top, v)
	}
	c := make([]float64, len(pr.Graph.Val))
	eps := pr.Range()
	for range 1200 {
		for v := range pr.Graph.N {
			for k := pr.Graph.RowPtr[v]; k < pr.Graph.RowPtr[v+1]; k++ {
				d := math.Hypot(f[v]-f[pr.Graph.Col[k]], eps)
				c[k] = math.Exp(pr.P*(pr.Graph.Val[k]-top) + (pr.P-2)*math.Log(d))
			}
		}
		next := eliminate(pr, c, free, f)
		moved = Distance(next, f) / pr.Range()
		f = next
		if pr.P == 2 {
			return f, 0 // the weights do not depend on f
		}
		if eps == 1e-18*pr.Range() && moved < 1e-15 {
			break
		}
		eps = max(.7*eps, 1e-18*pr.Range())
	}
	return f, moved
}

// eliminate solves sum_j c_ij (f_i - f_j) = 0 at the free vertices without subtractions: each vertex eliminated
// hands its conductances on to pairs of its neighbours (the star-mesh rule).
func eliminate(pr Problem, c []float64, free []int, f []float64) []float64 {
	n := pr.Graph.N
	a := make([][]float64, n)
	for v := range a {
		a[v] = make([]float64, n)
		for k := pr.Graph.RowPtr[v]; k < pr.Graph.RowPtr[v+1]; k++ {
			a[v][pr.Graph.Col[k]] = c[k]
		}
	}
	gone := make([]bool, n)
	total := make([]float64, n)
	for _, v := range free {
		gone[v] = true
		for u := range n {
			if !gone[u] {
				total[v] += a[v][u]
			}
		}
		for i := range n {
			if gone[i] || a[v][i] == 0 {
				continue
			}
			for j := range n {
				if !gone[j] && j != i {
					a[i][j] += a[v][i] / total[v] * a[v][j]
				}
			}
		}
	}
	out := append([]float64(nil), f...)
	for k := len(free) - 1; k >= 0; k-- {
		v := free[k]
		gone[v] = false
		var s float64
		for u := range n {
			if !gone[u] && u != v {
				s += a[v][u] / total[v] * out[u]
			}
		}
		out[v] = s
	}
	return out
}
