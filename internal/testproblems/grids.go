package testproblems

import (
	"fmt"
	"math"
)

// grid builds the nx by ny lattice with an edge for each offset, unit weights; vertex (x, y) is y*nx + x. Vertices
// closer than margin to the border are held at f, the rest are free and wanted at f.
func grid(name string, p float64, nx, ny, margin int, offsets [][2]int, f func(x, y float64) float64) Problem {
	at := map[int]float64{}
	var edges []Edge
	want := make([]float64, nx*ny)
	for y := range ny {
		for x := range nx {
			v := y*nx + x
			want[v] = f(float64(x), float64(y))
			if x < margin || y < margin || x >= nx-margin || y >= ny-margin {
				at[v] = want[v]
			}
			for _, o := range offsets {
				if u, w := x+o[0], y+o[1]; u >= 0 && u < nx && w >= 0 && w < ny {
					edges = append(edges, Edge{v, w*nx + u, 0})
				}
			}
		}
	}
	fixed, values := hold(at)
	return Problem{name, Graph(nx*ny, edges), fixed, values, p, want}
}

var fivePoint = [][2]int{{1, 0}, {0, 1}}

// GridHarmonics holds the border of a lattice (5-point stencil, p = 2, unit weights) at functions that are discretely
// harmonic: x, y, xy, x^2-y^2, x^3-3xy^2, x^4-6x^2y^2+y^4-2x^2 (its continuous part has discrete Laplacian 4), and
// e^(ax) cos by with cosh a + cos b = 2.
func GridHarmonics(nx, ny int) []Problem {
	const b = .7
	a := math.Acosh(2 - math.Cos(b))
	functions := []struct {
		name string
		f    func(x, y float64) float64
	}{
		{"1", func(_, _ float64) float64 { return 1 }},
		{"x", func(x, _ float64) float64 { return x }},
		{"xy", func(x, y float64) float64 { return x * y }},
		{"x2-y2", func(x, y float64) float64 { return x*x - y*y }},
		{"x3-3xy2", func(x, y float64) float64 { return x*x*x - 3*x*y*y }},
		{"x4-6x2y2+y4-2x2", func(x, y float64) float64 { return x*x*x*x - 6*x*x*y*y + y*y*y*y - 2*x*x }},
		{"exp(ax) cos by", func(x, y float64) float64 { return math.Exp(a*x) * math.Cos(b*y) }},
	}
	var all []Problem
	for _, h := range functions {
		all = append(all, grid("grid "+h.name+", p=2", 2, nx, ny, 1, fivePoint, h.f))
	}
	return all
}

// LinearOnStencil holds the border of a lattice at a linear function. With offsets in opposite pairs of equal
// weight every vertex sees the same slopes up and down, so the linear function is the answer for every p, inf included.
// reach 1 is the 8-point stencil, 2 adds the knight's moves.
func LinearOnStencil(p float64, nx, ny, reach int) Problem {
	offsets := [][2]int{{1, 0}, {0, 1}, {1, 1}, {1, -1}}
	if reach == 2 {
		offsets = append(offsets, [2]int{2, 1}, [2]int{1, 2}, [2]int{2, -1}, [2]int{-1, 2})
	}
	name := fmt.Sprintf("linear on stencil %d, p=%g", reach, p)
	return grid(name, p, nx+2*reach, ny+2*reach, reach, offsets, func(x, y float64) float64 { return 2*x - .7*y + 3 })
}

// Ruin is the gambler's ruin: a path with conductances c_k = (u/v)^k at p = 2, ends held at 0 and 1;
// h(k) = ((v/u)^k - 1)/((v/u)^n - 1).
func Ruin(n int, u, v float64) Problem {
	var edges []Edge
	want := make([]float64, n+1)
	for k := range n + 1 {
		if k < n {
			edges = append(edges, Edge{k, k + 1, .5 * float64(k) * math.Log(u/v)}) // conductance is w^2
		}
		want[k] = (math.Pow(v/u, float64(k)) - 1) / (math.Pow(v/u, float64(n)) - 1)
	}
	fixed, values := hold(map[int]float64{0: 0, n: 1})
	return Problem{fmt.Sprintf("ruin %g:%g, p=2", u, v), Graph(n+1, edges), fixed, values, 2, want}
}

// CycleResistance holds vertices 0 and k of the cycle of n at 0 and 1: both arcs are linear (R = k(n-k)/n).
func CycleResistance(n, k int) Problem {
	var edges []Edge
	want := make([]float64, n)
	for i := range n {
		edges = append(edges, Edge{i, (i + 1) % n, 0})
		want[i] = float64(i) / float64(k)
		if i > k {
			want[i] = float64(n-i) / float64(n-k)
		}
	}
	fixed, values := hold(map[int]float64{0: 0, k: 1})
	return Problem{fmt.Sprintf("cycle of %d, p=2", n), Graph(n, edges), fixed, values, 2, want}
}

// CompleteResistance holds two vertices of the complete graph at 0 and 1: all others are at 1/2 (R = 2/n).
func CompleteResistance(n int) Problem {
	pr := Complete(2, 1, 1)
	var edges []Edge
	pr.Want = make([]float64, n)
	for i := range n {
		pr.Want[i] = .5
		for j := range i {
			edges = append(edges, Edge{j, i, 0})
		}
	}
	pr.Want[0], pr.Want[n-1] = 0, 1
	pr.Name, pr.Graph = fmt.Sprintf("complete graph of %d, p=2", n), Graph(n, edges)
	pr.Fixed, pr.Values = hold(map[int]float64{0: 0, n - 1: 1})
	return pr
}

// Resistance is a known effective resistance between two vertices at p = 2: with U held at 0 and V at 1 the current
// sum of c (f_j - f_U) out of U is 1/R.
type Resistance struct {
	Name  string
	Graph *Problem // U and V held at 0 and 1
	U, V  int32
	R     float64
}

// Resistances gives path, cycle and complete graph: R = n, k(n-k)/n, 2/n.
func Resistances() []Resistance {
	path, cycle, complete := Chain(2, []float64{1, 1, 1, 1, 1, 1}), CycleResistance(11, 3), CompleteResistance(8)
	return []Resistance{
		{"path", &path, 0, 6, 6},
		{"cycle", &cycle, 0, 3, 3. * 8 / 11},
		{"complete", &complete, 0, 7, 2. / 8},
	}
}
