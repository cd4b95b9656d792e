package laplace

import (
	"context"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"pinfill/internal/sparse"
)

// exact solves the Dirichlet problem in rational arithmetic by Gauss-Jordan elimination.
func exact(c *sparse.CSR, fixed []int32, y []float64) []float64 {
	n := c.N
	held := make(map[int]*big.Rat)
	for k, v := range fixed {
		held[int(v)] = new(big.Rat).SetFloat64(y[k])
	}
	rows := make([][]*big.Rat, n)
	for i := range rows {
		rows[i] = make([]*big.Rat, n+1)
		for j := range rows[i] {
			rows[i][j] = new(big.Rat)
		}
		if v, ok := held[i]; ok {
			rows[i][i].SetInt64(1)
			rows[i][n].Set(v)
			continue
		}
		cols, vals := c.Row(i)
		for k, j := range cols {
			w := new(big.Rat).SetFloat64(vals[k])
			rows[i][i].Add(rows[i][i], w)
			rows[i][j].Sub(rows[i][j], w)
		}
	}
	t := new(big.Rat)
	for k := range n {
		p := k
		for rows[p][k].Sign() == 0 {
			p++
		}
		rows[k], rows[p] = rows[p], rows[k]
		for i := range n {
			if i == k || rows[i][k].Sign() == 0 {
				continue
			}
			m := new(big.Rat).Quo(rows[i][k], rows[k][k])
			for j := k; j <= n; j++ {
				if rows[k][j].Sign() != 0 {
					rows[i][j].Sub(rows[i][j], t.Mul(m, rows[k][j]))
				}
			}
		}
	}
	x := make([]float64, n)
	for i := range x {
		x[i], _ = t.Quo(rows[i][n], rows[i][i]).Float64()
	}
	return x
}

// TestContrastAgainstRationals: conductances from 1e-300 to 1, where no other method keeps a digit.
func TestContrastAgainstRationals(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(17, 4))
	for trial := range 60 {
		n := 4 + r.IntN(9)
		depth := []float64{0, 3, 20, 100, 300}[trial%5]
		c := randomNetwork(r, n, r.IntN(2*n), func() float64 { return math.Pow(10, -depth*r.Float64()) })
		fixed := pickFixed(r, n, 3)
		y := make([]float64, len(fixed))
		for k := range y {
			y[k] = r.Float64()
		}
		want := exact(c, fixed, y)
		for _, m := range []Method{Auto, Direct} {
			s, err := New(ctx, c, fixed, Options{Method: m})
			if err != nil {
				t.Fatal(err)
			}
			x := make([]float64, n)
			st, err := s.SolveDirichlet(ctx, [][]float64{y}, [][]float64{x}, 1e-13)
			if err != nil || !st.Converged {
				t.Fatalf("trial %d: %v %+v", trial, err, st)
			}
			for i := range x {
				if math.Abs(x[i]-want[i]) > 1e-13 {
					t.Fatalf("trial %d, contrast 1e%v, %v: vertex %d is %v, exactly %v", trial, depth, m, i, x[i], want[i])
				}
			}
		}
	}
}

// hardNetworks are shapes on which an iteration may fail: each with its fixed vertices.
func hardNetworks(n int) map[string]func() (*sparse.CSR, []int32) {
	r := rand.New(rand.NewPCG(uint64(n), 8))
	one := func(int) float64 { return 1 }
	ten := func() float64 { return math.Pow(10, -10*r.Float64()) }
	edges := func(make func(i int) int) [][2]int {
		var e [][2]int
		for i := 1; i < n; i++ {
			e = append(e, [2]int{i, make(i)})
		}
		return e
	}
	grid := func(c func() float64) *sparse.CSR {
		side := int(math.Sqrt(float64(n)))
		var e [][2]int
		for i := range side * side {
			if i%side > 0 {
				e = append(e, [2]int{i, i - 1})
			}
			if i >= side {
				e = append(e, [2]int{i, i - side})
			}
		}
		return network(side*side, e, func(int) float64 { return c() })
	}
	half := func(n int) []int32 {
		var f []int32
		for i := 0; i < n; i += 2 {
			f = append(f, int32(i))
		}
		return f
	}
	return map[string]func() (*sparse.CSR, []int32){
		"chain": func() (*sparse.CSR, []int32) {
			return network(n, edges(func(i int) int { return i - 1 }), one), []int32{0, int32(n - 1)}
		},
		"star": func() (*sparse.CSR, []int32) {
			return network(n, edges(func(int) int { return 0 }), one), []int32{1, 2, 3}
		},
		"tree": func() (*sparse.CSR, []int32) {
			return network(n, edges(func(i int) int { return r.IntN(i) }), one), []int32{1, 2, 3}
		},
		"contrast": func() (*sparse.CSR, []int32) { return grid(ten), []int32{0, int32(n / 2)} },
		"grid":     func() (*sparse.CSR, []int32) { return grid(func() float64 { return 1 }), []int32{0, int32(n / 3)} },
		"half":     func() (*sparse.CSR, []int32) { return grid(ten), half(n * 9 / 10) },
		"caterpillar": func() (*sparse.CSR, []int32) {
			return network(n, edges(func(i int) int {
				if i%50 == 0 {
					return i - 50 // along the spine
				}
				return i / 50 * 50
			}), one), []int32{0, int32(n - 1)}
		},
	}
}

// TestHardNetworks compares Auto with elimination, which is right to a few roundings.
func TestHardNetworks(t *testing.T) {
	ctx := context.Background()
	for name, build := range hardNetworks(10_000) {
		c, fixed := build()
		r := rand.New(rand.NewPCG(2, 3))
		y := make([]float64, len(fixed))
		for k := range y {
			y[k] = r.Float64()
		}
		y[0] = 1
		var x [4][]float64
		for k, m := range []Method{Direct, Auto, Multigrid, Elimination} {
			s, err := New(ctx, c, fixed, Options{Method: m})
			if err != nil {
				t.Fatal(err)
			}
			x[k] = make([]float64, c.N)
			st, err := s.SolveDirichlet(ctx, [][]float64{y}, [][]float64{x[k]}, 1e-10)
			t.Logf("%s %v: %+v", name, m, st)
			if err != nil || !st.Converged {
				t.Errorf("%s %v: %v %+v", name, m, err, st)
			}
		}
		for k := 1; k < len(x); k++ {
			worst := 0.0
			for i := range x[0] {
				worst = max(worst, math.Abs(x[0][i]-x[k][i]))
			}
			// The correction test asks for 1e-10 of half the range with a margin of 4; allow 10 times that.
			if worst > 1e-9 {
				t.Errorf("%s: answer %d differs from elimination by %v", name, k, worst)
			}
		}
	}
}

// TestSameBytesForAnyWorkersAndCompany solves a network with a hierarchy for one and for several right-hand sides.
func TestSameBytesForAnyWorkersAndCompany(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(12, 1))
	c := cloud(t, 6_000, 2, 1, 0)
	fixed := pickFixed(r, c.N, 30)
	values := make([][]float64, 5)
	for k := range values {
		values[k] = make([]float64, len(fixed))
		for i := range values[k] {
			values[k][i] = r.Float64()
		}
	}
	for _, m := range []Method{Jacobi, Multigrid, Elimination, Direct} {
		var want [][]float64
		for _, workers := range []int{1, 2, 5} {
			s, err := New(ctx, c, fixed, Options{Method: m, Workers: workers})
			if err != nil {
				t.Fatal(err)
			}
			x := make([][]float64, len(values))
			for k := range x {
				x[k] = make([]float64, c.N)
			}
			if workers == 1 { // each alone
				for k := range x {
					st, err := s.SolveDirichlet(ctx, values[k:k+1], x[k:k+1], 1e-8)
					if err != nil || !st.Converged {
						t.Fatal(m, err, st)
					}
				}
				want = x
				continue
			}
			if st, err := s.SolveDirichlet(ctx, values, x, 1e-8); err != nil || !st.Converged {
				t.Fatal(m, err, st)
			}
			for k := range x {
				for i := range x[k] {
					if x[k][i] != want[k][i] {
						t.Fatalf("%v, %d workers: right-hand side %d, vertex %d is %v, alone %v", m, workers, k, i, x[k][i], want[k][i])
					}
				}
			}
		}
	}
}

// TestReweight: the same system object with new conductances gives what a new system gives.
func TestReweight(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(31, 1))
	c := cloud(t, 5_000, 2, 1, 0)
	fixed := pickFixed(r, c.N, 20)
	y := make([]float64, len(fixed))
	for i := range y {
		y[i] = r.Float64()
	}
	for _, m := range []Method{Auto, Multigrid, Direct} {
		s, err := New(ctx, c, fixed, Options{Method: m})
		if err != nil {
			t.Fatal(err)
		}
		x := make([]float64, c.N)
		for round := range 4 {
			val := make([]float64, c.NNZ())
			for i := range c.N {
				for k := c.RowPtr[i]; k < c.RowPtr[i+1]; k++ {
					j := int(c.Col[k])
					val[k] = c.Val[k] * math.Exp(-float64(3*round)*math.Abs(math.Sin(float64(min(i, j)+7*max(i, j)))))
				}
			}
			if err := s.Reweight(ctx, val); err != nil {
				t.Fatal(err)
			}
			st, err := s.SolveDirichlet(ctx, [][]float64{y}, [][]float64{x}, 1e-11)
			if err != nil || !st.Converged {
				t.Fatalf("%v round %d: %v %+v", m, round, err, st)
			}
			out := make([]float64, c.N)
			s.Currents(x, out)
			fresh, err := New(ctx, c.WithValues(val), fixed, Options{Method: Direct})
			if err != nil {
				t.Fatal(err)
			}
			want := make([]float64, c.N)
			if st, err := fresh.SolveDirichlet(ctx, [][]float64{y}, [][]float64{want}, 1e-11); err != nil || !st.Converged {
				t.Fatal(err, st)
			}
			for i := range x {
				if math.Abs(x[i]-want[i]) > 1e-10 {
					t.Fatalf("%v round %d: vertex %d is %v, a new system gives %v", m, round, i, x[i], want[i])
				}
				if math.Abs(out[i]) > 1e-10 {
					t.Fatalf("%v round %d: current %v at free vertex %d", m, round, out[i], i)
				}
			}
		}
	}
}
