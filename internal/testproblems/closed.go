package testproblems

import (
	"fmt"
	"math"
)

// Exponents are those that every closed form holding for all p is stated at.
var Exponents = []float64{1.5, 2, 2.5, 3, 4, 8, 32, math.Inf(1)}

// Closed gives every problem of this package with a closed-form answer, over Exponents where it holds for all p.
func Closed() []Problem {
	var all []Problem
	for _, p := range Exponents {
		all = append(all,
			Chain(p, []float64{1, 2, .5, 3}),
			Chain(p, []float64{1, 1, 1, 1, 1, 1, 1}),
			Chain(p, []float64{.9, .4, 1.1, 1.6, .8, 1.3, 2.1, .7}),
			HangingBranch(p),
			TwoArms(p),
			Star(p, 1, 5), Star(p, 3, 4), Complete(p, 1, 5), Complete(p, 4, 2),
			LinearOnStencil(p, 5, 4, 1), LinearOnStencil(p, 6, 5, 2),
		)
	}
	all = append(all, PrintedChains()...)
	all = append(all, PrintedArms()...)
	all = append(all, StarInf([]float64{0, 1, 4}, []float64{1, 2, 1}, 2))
	all = append(all, GridHarmonics(7, 6)...)
	all = append(all, Ruin(9, .6, .4), Ruin(9, .3, .7), CycleResistance(9, 4), CompleteResistance(7))
	return all
}

// Chain holds the ends of a path at 0 and 1. In series the length l = 1/w of p-resistors adds as l^q, q = p/(p-1):
// the drop over edge e is l_e^q / sum l^q; for p = inf, q = 1.
func Chain(p float64, w []float64) Problem {
	n := len(w) + 1
	q := conjugate(p)
	want := make([]float64, n)
	var edges []Edge
	for i, wi := range w {
		edges = append(edges, Edge{i, i + 1, math.Log(wi)})
		want[i+1] = want[i] + math.Pow(wi, -q)
	}
	total := want[n-1]
	for i := range want {
		want[i] /= total
	}
	fixed, values := hold(map[int]float64{0: 0, n - 1: 1})
	return Problem{fmt.Sprintf("chain of %d, p=%g", len(w), p), Graph(n, edges), fixed, values, p, want}
}

// PrintedChains is the chain w = (1, 2, .5, 3) with the five-digit answers found by minimising the energy with a
// general-purpose optimiser (derived; the answers agree with Chain to 5e-9 before rounding to the digits here).
func PrintedChains() []Problem {
	printed := []struct {
		p float64
		f [3]float64
	}{
		{2, [3]float64{.18653, .23316, .97927}},
		{4, [3]float64{.24109, .33677, .94428}},
		{8, [3]float64{.25342, .36819, .92780}},
		{20, [3]float64{.25833, .38287, .91873}},
		{math.Inf(1), [3]float64{.26087, .39130, .91304}},
	}
	var all []Problem
	for _, c := range printed {
		pr := Chain(c.p, []float64{1, 2, .5, 3})
		pr.Name = "printed " + pr.Name
		pr.Want = []float64{0, c.f[0], c.f[1], c.f[2], 1}
		all = append(all, pr)
	}
	return all
}

// PrintedTolerance is what a five- or six-digit printed answer can be compared to.
const PrintedTolerance = 6e-6

// Printed says whether the problem's answer is rounded to printed digits.
func (p Problem) Printed() bool { return len(p.Name) > 8 && p.Name[:8] == "printed " }

// TwoArms is 0 = (1, 2) in parallel with (.7, 1.5), then 1.2 to 1: two two-edge arms from vertex 0 (held at 0) to
// vertex 3, then an edge to vertex 4 (held at 1). In series l^q adds; in parallel w^p.
func TwoArms(p float64) Problem {
	q := conjugate(p)
	edges := []Edge{{0, 1, 0}, {1, 3, math.Log(2)}, {0, 2, math.Log(.7)}, {2, 3, math.Log(1.5)}, {3, 4, math.Log(1.2)}}
	lq := func(w float64) float64 { return math.Pow(w, -q) }
	armA, armB := lq(1)+lq(2), lq(.7)+lq(1.5) // l^q of each arm
	wA, wB := math.Pow(armA, -1/q), math.Pow(armB, -1/q)
	w := max(wA, wB)
	if !math.IsInf(p, 1) {
		w *= math.Pow(math.Pow(wA/w, p)+math.Pow(wB/w, p), 1/p)
	}
	join := lq(w) / (lq(w) + lq(1.2))
	want := []float64{0, join * lq(1) / armA, join * lq(.7) / armB, join, 1}
	fixed, values := hold(map[int]float64{0: 0, 4: 1})
	return Problem{fmt.Sprintf("two arms, p=%g", p), Graph(5, edges), fixed, values, p, want}
}

// PrintedArms is TwoArms with the value at the join as found by a general-purpose optimiser, six digits.
func PrintedArms() []Problem {
	var all []Problem
	for _, c := range [][2]float64{{1.5, .434126}, {2, .544965}, {3, .603959}, {6, .635338}} {
		pr := TwoArms(c[0])
		pr.Name = "printed " + pr.Name
		pr.Want[3] = c[1]
		all = append(all, pr)
	}
	return all
}

// HangingBranch hangs a branch without a label on a vertex of an equal chain: it takes the vertex's value.
func HangingBranch(p float64) Problem {
	edges := []Edge{
		{0, 1, 0},
		{1, 2, 0},
		{2, 3, 0},
		{3, 4, 0},
		{2, 5, -1},
		{5, 6, 2},
		{5, 7, -3},
		{6, 7, 0},
		{3, 8, 1},
	}
	want := []float64{0, .25, .5, .75, 1, .5, .5, .5, .75}
	fixed, values := hold(map[int]float64{0: 0, 4: 1})
	return Problem{fmt.Sprintf("hanging branch, p=%g", p), Graph(9, edges), fixed, values, p, want}
}

// Star has a free hub and leaves held at 1 (ones) and 0 (zeros), unit weights: the hub is t/(1+t),
// t = (ones/zeros)^(1/(p-1)).
func Star(p float64, ones, zeros int) Problem {
	at := map[int]float64{}
	var edges []Edge
	for i := range ones + zeros {
		edges = append(edges, Edge{0, i + 1, 0})
		at[i+1] = 0
		if i < ones {
			at[i+1] = 1
		}
	}
	fixed, values := hold(at)
	g := Graph(1+ones+zeros, edges)
	want := append([]float64{balance(p, ones, zeros)}, values...)
	return Problem{fmt.Sprintf("star %d:%d, p=%g", ones, zeros, p), g, fixed, values, p, want}
}

// Complete is the complete graph with ones vertices held at 1, zeros at 0 and three free: by symmetry the free ones
// agree, and each then sees a star.
func Complete(p float64, ones, zeros int) Problem {
	n := ones + zeros + 3
	at := map[int]float64{}
	var edges []Edge
	want := make([]float64, n)
	for i := range n {
		for j := range i {
			edges = append(edges, Edge{j, i, 0})
		}
		switch {
		case i < ones:
			at[i], want[i] = 1, 1
		case i < ones+zeros:
			at[i] = 0
		default:
			want[i] = balance(p, ones, zeros)
		}
	}
	fixed, values := hold(at)
	return Problem{fmt.Sprintf("complete %d:%d, p=%g", ones, zeros, p), Graph(n, edges), fixed, values, p, want}
}

// StarInf is a star at p = inf with leaf values y at lengths l: the pair of steepest slope (y_j-y_i)/(l_i+l_j) decides.
func StarInf(y, l []float64, hub float64) Problem {
	at := map[int]float64{}
	var edges []Edge
	for i := range y {
		edges = append(edges, Edge{0, i + 1, -math.Log(l[i])})
		at[i+1] = y[i]
	}
	fixed, values := hold(at)
	want := append([]float64{hub}, y...)
	return Problem{"star, p=inf", Graph(len(y)+1, edges), fixed, values, math.Inf(1), want}
}

func balance(p float64, ones, zeros int) float64 {
	t := 1.0
	if !math.IsInf(p, 1) {
		t = math.Pow(float64(ones)/float64(zeros), 1/(p-1))
	}
	return t / (1 + t)
}

// conjugate is q = p/(p-1), with 1 for p = inf.
func conjugate(p float64) float64 {
	if math.IsInf(p, 1) {
		return 1
	}
	return p / (p - 1)
}
