package laplace

import (
	"context"
	"math"
	"math/rand/v2"
	"sort"
	"testing"

	"pinfill/internal/sparse"
)

// network builds a CSR from edges.
func network(n int, edges [][2]int, c func(k int) float64) *sparse.CSR {
	type half struct {
		to int
		c  float64
	}
	rows := make([][]half, n)
	for k, e := range edges {
		v := c(k)
		rows[e[0]] = append(rows[e[0]], half{e[1], v})
		rows[e[1]] = append(rows[e[1]], half{e[0], v})
	}
	out := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for i, r := range rows {
		sort.Slice(r, func(a, b int) bool { return r[a].to < r[b].to })
		for _, h := range r {
			out.Col = append(out.Col, int32(h.to))
			out.Val = append(out.Val, h.c)
		}
		out.RowPtr[i+1] = len(out.Col)
	}
	return out
}

// randomNetwork is a random tree plus extra edges, connected, with conductances from sample.
func randomNetwork(r *rand.Rand, n, extra int, sample func() float64) *sparse.CSR {
	seen := map[[2]int]bool{}
	var edges [][2]int
	add := func(i, j int) {
		e := [2]int{min(i, j), max(i, j)}
		if i != j && !seen[e] {
			seen[e] = true
			edges = append(edges, e)
		}
	}
	for i := 1; i < n; i++ {
		add(i, r.IntN(i))
	}
	for range extra {
		add(r.IntN(n), r.IntN(n))
	}
	return network(n, edges, func(int) float64 { return sample() })
}

// TestGamblersRuin: on a path with conductances (u/v)^k the potential is ((v/u)^k - 1) / ((v/u)^N - 1) (Doyle and
// Snell, Random Walks and Electric Networks, 1984, 1.2.6).
func TestGamblersRuin(t *testing.T) {
	for _, m := range []Method{Auto, Jacobi, Direct} {
		for _, ratio := range []float64{1, 1.1, 0.8} {
			const n = 30
			edges := make([][2]int, n)
			for k := range edges {
				edges[k] = [2]int{k, k + 1}
			}
			c := network(n+1, edges, func(k int) float64 { return math.Pow(1/ratio, float64(k)) })
			s, err := New(context.Background(), c, []int32{0, n}, Options{Method: m})
			if err != nil {
				t.Fatal(err)
			}
			x := make([]float64, n+1)
			st, err := s.SolveDirichlet(context.Background(), [][]float64{{0, 1}}, [][]float64{x}, 1e-11)
			if err != nil || !st.Converged {
				t.Fatal(err, st)
			}
			for k := range x {
				want := float64(k) / n
				if ratio != 1 {
					want = (math.Pow(ratio, float64(k)) - 1) / (math.Pow(ratio, n) - 1)
				}
				if math.Abs(x[k]-want) > 1e-10 {
					t.Fatalf("%v ratio %v: vertex %d is %v, want %v", m, ratio, k, x[k], want)
				}
			}
		}
	}
}
