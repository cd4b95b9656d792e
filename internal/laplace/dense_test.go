package laplace

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"pinfill/internal/sparse"
)

// laplacian is L of the whole network as a dense matrix.
func laplacian(c *sparse.CSR) *mat.SymDense {
	l := mat.NewSymDense(c.N, nil)
	for i := range c.N {
		cols, vals := c.Row(i)
		for k, j := range cols {
			l.SetSym(i, i, l.At(i, i)+vals[k])
			if int(j) > i {
				l.SetSym(i, int(j), -vals[k])
			}
		}
	}
	return l
}

// oracle solves L_UU x_U = b_U - L_US y by gonum's dense Cholesky.
func oracle(t *testing.T, c *sparse.CSR, fixed []int32, y, b []float64) []float64 {
	t.Helper()
	l := laplacian(c)
	held := map[int]float64{}
	for k, v := range fixed {
		held[int(v)] = y[k]
	}
	var free []int
	for i := range c.N {
		if _, ok := held[i]; !ok {
			free = append(free, i)
		}
	}
	a := mat.NewSymDense(len(free), nil)
	rhs := mat.NewVecDense(len(free), nil)
	for k, i := range free {
		v := b[i]
		for f, yf := range held {
			v -= l.At(i, f) * yf
		}
		rhs.SetVec(k, v)
		for m := k; m < len(free); m++ {
			a.SetSym(k, m, l.At(i, free[m]))
		}
	}
	var ch mat.Cholesky
	if !ch.Factorize(a) {
		t.Fatal("oracle: not positive definite")
	}
	var x mat.VecDense
	if err := ch.SolveVecTo(&x, rhs); err != nil {
		t.Fatal(err)
	}
	out := make([]float64, c.N)
	for k, i := range free {
		out[i] = x.AtVec(k)
	}
	for f, yf := range held {
		out[f] = yf
	}
	return out
}

func pickFixed(r *rand.Rand, n, l int) []int32 {
	picked := make([]bool, n)
	for range l {
		picked[r.IntN(n)] = true
	}
	var out []int32
	for i, ok := range picked {
		if ok {
			out = append(out, int32(i))
		}
	}
	return out
}

func testMethods() []Method { return []Method{Auto, Jacobi, Multigrid, Elimination, Direct} }

func TestRandomNetworksAgainstDenseCholesky(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(7, 11))
	for trial := range 100 {
		n := 3 + r.IntN(200)
		c := randomNetwork(r, n, r.IntN(4*n), func() float64 { return math.Exp(-4 * r.Float64()) })
		fixed := pickFixed(r, n, 1+r.IntN(5))
		y := make([]float64, len(fixed))
		for k := range y {
			y[k] = r.NormFloat64()
		}
		b := make([]float64, n)
		for k := range b {
			b[k] = r.NormFloat64()
		}
		want := oracle(t, c, fixed, y, make([]float64, n))
		wantB := oracle(t, c, fixed, make([]float64, len(fixed)), b)
		for _, m := range testMethods() {
			s, err := New(ctx, c, fixed, Options{Method: m, Workers: 1 + trial%3})
			if err != nil {
				t.Fatal(err)
			}
			x, xb := make([]float64, n), make([]float64, n)
			st, err := s.SolveDirichlet(ctx, [][]float64{y}, [][]float64{x}, 1e-11)
			if err != nil || !st.Converged {
				t.Fatalf("trial %d %v: %v %+v", trial, m, err, st)
			}
			st, err = s.SolvePoisson(ctx, [][]float64{b}, [][]float64{xb}, 1e-11)
			if err != nil || !st.Converged {
				t.Fatalf("trial %d %v: %v %+v", trial, m, err, st)
			}
			// 1e-9 of the scale: the correction test asks for 1e-11 and may be off by a small factor.
			for i := range x {
				if math.Abs(x[i]-want[i]) > 1e-9 {
					t.Fatalf("trial %d %v: vertex %d is %v, oracle %v", trial, m, i, x[i], want[i])
				}
				if math.Abs(xb[i]-wantB[i]) > 1e-9*floats.Norm(wantB, math.Inf(1)) {
					t.Fatalf("trial %d %v: Poisson vertex %d is %v, oracle %v", trial, m, i, xb[i], wantB[i])
				}
			}
		}
	}
}

func TestUngroundedComponentIsRefused(t *testing.T) {
	c := network(5, [][2]int{{0, 1}, {2, 3}, {3, 4}}, func(k int) float64 { return []float64{1, 1, 0}[k] })
	_, err := New(context.Background(), c, []int32{0, 2}, Options{})
	var u *UngroundedError
	if !errors.As(err, &u) || u.Vertex != 4 {
		t.Fatalf("got %v, want vertex 4 ungrounded", err)
	}
}

func TestHarmonicAndSchur(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(3, 5))
	for range 20 {
		n := 10 + r.IntN(60)
		c := randomNetwork(r, n, 2*n, func() float64 { return r.Float64() + .01 })
		fixed := pickFixed(r, n, 2+r.IntN(8))
		l := len(fixed)
		s, err := New(ctx, c, fixed, Options{})
		if err != nil {
			t.Fatal(err)
		}
		sum := make([]float64, n)
		y := make([]float64, l)
		for k := range y {
			y[k] = r.NormFloat64()
		}
		f := make([]float64, n)
		schur, st, err := s.Harmonic(ctx, 1e-12, func(first int, h [][]float64) error {
			for k := range h {
				for i, v := range h[k] {
					sum[i] += v
					f[i] += y[first+k] * v
				}
			}
			return nil
		})
		if err != nil || !st.Converged {
			t.Fatal(err, st)
		}
		want := oracle(t, c, fixed, y, make([]float64, n))
		for i := range sum {
			if math.Abs(sum[i]-1) > 1e-10 || math.Abs(f[i]-want[i]) > 1e-10 {
				t.Fatalf("vertex %d: sum of measures %v, field %v, oracle %v", i, sum[i], f[i], want[i])
			}
		}
		// S y is the current out of the fixed vertices: L f there.
		var lf, sy mat.VecDense
		lf.MulVec(laplacian(c), mat.NewVecDense(n, want))
		sy.MulVec(schur, mat.NewVecDense(l, y))
		for k, v := range fixed {
			if math.Abs(lf.AtVec(int(v))-sy.AtVec(k)) > 1e-9 {
				t.Fatalf("fixed vertex %d: S y %v, L f %v", v, sy.AtVec(k), lf.AtVec(int(v)))
			}
		}
	}
}
