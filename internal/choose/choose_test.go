package choose

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/sparse"
)

// edge is an undirected edge with its weight.
type edge struct {
	u, v int
	w    float64
}

// network makes a graph with ln w from edges.
func network(n int, edges []edge) *sparse.CSR {
	rows := make([]map[int32]float64, n)
	for v := range rows {
		rows[v] = map[int32]float64{}
	}
	for _, e := range edges {
		rows[e.u][int32(e.v)] = math.Log(e.w)
		rows[e.v][int32(e.u)] = math.Log(e.w)
	}
	g := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for v, row := range rows {
		var cols []int32
		for j := range row {
			cols = append(cols, j)
		}
		slices.Sort(cols)
		for _, j := range cols {
			g.Col = append(g.Col, j)
			g.Val = append(g.Val, row[j])
		}
		g.RowPtr[v+1] = len(g.Col)
	}
	return g
}

// randomGraph is a connected graph: a random tree with more edges.
func randomGraph(r *rand.Rand, n, extra int) *sparse.CSR {
	var edges []edge
	weight := func() float64 { return math.Exp(1.5 * r.NormFloat64()) }
	for v := 1; v < n; v++ {
		edges = append(edges, edge{v, r.IntN(v), weight()})
	}
	for range extra {
		u, v := r.IntN(n), r.IntN(n)
		if u != v {
			edges = append(edges, edge{u, v, weight()})
		}
	}
	return network(n, edges)
}

// randomLabels labels l vertices of n with classes, every class at least once, or with numbers if classes is 0.
func randomLabels(r *rand.Rand, n, l, classes int) Labels {
	vs := r.Perm(n)[:l]
	slices.Sort(vs)
	lab := Labels{}
	for _, v := range vs {
		lab.Vertex = append(lab.Vertex, int32(v))
	}
	if classes == 0 {
		lab.Task = Numbers
		lab.Target = [][]float64{make([]float64, l)}
		for k := range l {
			lab.Target[0][k] = 3*r.NormFloat64() + 10
		}
		return lab
	}
	lab.Target = make([][]float64, classes)
	for c := range classes {
		lab.Target[c] = make([]float64, l)
	}
	for k, j := range r.Perm(l) {
		c := r.IntN(classes)
		if j < classes {
			c = j
		}
		lab.Target[c][k] = 1
	}
	return lab
}

// near reports whether two values agree within tol, NaN with NaN.
func near(a, b, tol float64) bool {
	return math.IsNaN(a) && math.IsNaN(b) || math.Abs(a-b) <= tol
}

func TestValidateRefuses(t *testing.T) {
	good := Labels{Vertex: []int32{1, 3}, Target: [][]float64{{1, 0}, {0, 1}}}
	if err := good.Validate(4); err != nil {
		t.Fatal(err)
	}
	for name, bad := range map[string]Labels{
		"order":   {Vertex: []int32{3, 1}, Target: good.Target},
		"range":   {Vertex: []int32{1, 4}, Target: good.Target},
		"none":    {Vertex: []int32{1, 3}},
		"lengths": {Vertex: []int32{1, 3}, Target: [][]float64{{1}, {0}}},
		"nan":     {Vertex: []int32{1, 3}, Target: [][]float64{{1, math.NaN()}, {0, 1}}},
		"numbers": {Task: Numbers, Vertex: []int32{1, 3}, Target: good.Target},
		"groups":  {Vertex: []int32{1, 3}, Target: good.Target, Group: []int32{0}},
		"task":    {Task: 7, Vertex: []int32{1, 3}, Target: good.Target},
	} {
		if bad.Validate(4) == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}
