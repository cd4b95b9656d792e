package testproblems

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// solve answers a problem with the oracle that fits its p.
func solve(t *testing.T, pr Problem) []float64 {
	t.Helper()
	switch {
	case math.IsInf(pr.P, 1):
		return SteepestPaths(pr)
	case pr.P == 2:
		return Rational(pr)
	case pr.P < 2:
		f, moved := Reweight(pr)
		if moved > 1e-12 {
			t.Errorf("%s: reweighting still moves by %g", pr.Name, moved)
		}
		return f
	}
	lo, hi, width := Enclose(pr, 1e-12, 100000)
	if width > 1e-12 {
		t.Errorf("%s: enclosure %g wide", pr.Name, width)
	}
	for i := range lo {
		lo[i] = (lo[i] + hi[i]) / 2
	}
	return lo
}

func TestOraclesMeetClosedForms(t *testing.T) {
	for _, pr := range Closed() {
		tolerance := 1e-11
		if pr.Printed() {
			tolerance = PrintedTolerance
		}
		if e := pr.Error(solve(t, pr)); e > tolerance {
			t.Errorf("%s: error %g", pr.Name, e)
		}
	}
}

func TestResistances(t *testing.T) {
	for _, r := range Resistances() {
		f := Rational(*r.Graph)
		cols, logw := r.Graph.Graph.Row(int(r.U))
		var current float64
		for k, j := range cols {
			current += math.Exp(2*logw[k]) * f[j]
		}
		if math.Abs(1/current-r.R) > 1e-13*r.R {
			t.Errorf("%s: resistance %v, want %v", r.Name, 1/current, r.R)
		}
	}
}

// The oracles share no code but NodeMinimum; here they check one another where their ranges of p meet.
func TestOraclesAgree(t *testing.T) {
	for seed := range uint64(40) {
		pr := Random(seed, 2, Options{MinN: 6, MaxN: 14, Branches: seed%2 == 0, Components: int(seed % 2)})
		exact := Rational(pr)
		lo, hi, _ := Enclose(pr, 1e-12, 200000)
		for v := range exact {
			if exact[v] < lo[v]-1e-14 || exact[v] > hi[v]+1e-14 {
				t.Errorf("%s: vertex %d: %v outside [%v, %v]", pr.Name, v, exact[v], lo[v], hi[v])
			}
		}
		if f, _ := Reweight(pr); Distance(f, exact) > 1e-12 {
			t.Errorf("%s: reweighting is %g off", pr.Name, Distance(f, exact))
		}
		pr.P = math.Inf(1)
		f := SteepestPaths(pr)
		for v, held := range pr.Hold() {
			if math.IsNaN(held) && math.Abs(f[v]-NodeMinimum(pr, f, v)) > 1e-12 {
				t.Errorf("%s: vertex %d is not balanced: %v, %v", pr.Name, v, f[v], NodeMinimum(pr, f, v))
			}
		}
	}
}

func TestRandomIsConnectedAndRepeats(t *testing.T) {
	for seed := range uint64(200) {
		pr, again := Random(seed, 3, Options{}), Random(seed, 3, Options{})
		if Distance(pr.Graph.Val, again.Graph.Val) != 0 || Distance(pr.Values, again.Values) != 0 {
			t.Fatalf("seed %d does not repeat", seed)
		}
		seen := make([]bool, pr.Graph.N)
		stack, count := []int{0}, 0
		for len(stack) > 0 {
			v := stack[len(stack)-1]
			stack = stack[:len(stack)-1]
			if seen[v] {
				continue
			}
			seen[v] = true
			count++
			cols, _ := pr.Graph.Row(v)
			for _, u := range cols {
				stack = append(stack, int(u))
			}
		}
		if count != pr.Graph.N {
			t.Errorf("seed %d: %d of %d vertices reached", seed, count, pr.Graph.N)
		}
	}
}

func TestCellsFindTheNearest(t *testing.T) {
	for _, d := range []int{1, 2, 3} {
		const n, k = 300, 6
		rng := rand.New(rand.NewPCG(uint64(d), 77))
		x := make([]float64, n*d)
		for i := range x {
			x[i] = rng.Float64()
		}
		c := newCells(x, n, d, k)
		to, dist := make([]int32, k), make([]float64, k)
		for i := range n {
			c.nearest(i, to, dist)
			var all []float64
			for j := range n {
				var s float64
				for a := range d {
					step := c.x[i*d+a] - c.x[j*d+a]
					s += step * step
				}
				all = append(all, math.Sqrt(s))
			}
			slices.Sort(all)
			if e := Distance(dist, all[1:k+1]); e > 1e-14 {
				t.Fatalf("d=%d: point %d: distances off by %g", d, i, e)
			}
		}
	}
}
