package testproblems

import (
	"cmp"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"pinfill/internal/sparse"
)

// Options steer Random. The zero value gives connected graphs of 8 to 40 vertices with weights spread over e^3.
type Options struct {
	MinN, MaxN int     // vertices; 0 means 8 and 40
	Spread     float64 // ln w is uniform over [0, Spread]; 0 means 3 (1e-10..1 is 23.03)
	MaxLabels  int     // 0 means 6, at least 2 are drawn
	Levels     int     // > 0: labels are drawn from 0..Levels-1 (ties); 0: uniform in [0, 1)
	Unit       bool    // all weights 1, so that slopes tie
	Components int     // > 1: that many separate graphs side by side, each with labels
	Branches   bool    // hang unlabelled branches on some vertices
}

// Random gives the problem of that seed at that p: a tree, cycle, grid, k-nearest-neighbour, preferential-attachment
// or uniform random graph. The same seed gives the same graph and labels at every p.
func Random(seed uint64, p float64, o Options) Problem {
	rng := rand.New(rand.NewPCG(seed, 0x9a1f5b3c))
	lo, hi := cmp.Or(o.MinN, 8), cmp.Or(o.MaxN, 40)
	spread := cmp.Or(o.Spread, 3)
	var edges []Edge
	at := map[int]float64{}
	n := 0
	for range max(o.Components, 1) {
		m := lo + rng.IntN(hi-lo+1)
		part := shape(rng, m)
		if o.Branches {
			m, part = branch(rng, m, part)
		}
		for _, e := range part {
			edges = append(edges, Edge{e.I + n, e.J + n, spread * rng.Float64()})
		}
		labels := 2 + rng.IntN(min(cmp.Or(o.MaxLabels, 6), m-1)-1)
		for _, v := range rng.Perm(m)[:labels] {
			at[v+n] = rng.Float64()
			if o.Levels > 0 {
				at[v+n] = float64(rng.IntN(o.Levels))
			}
		}
		n += m
	}
	if o.Unit {
		for i := range edges {
			edges[i].LogW = 0
		}
	}
	fixed, values := hold(at)
	return Problem{fmt.Sprintf("random %d, p=%g", seed, p), Graph(n, edges), fixed, values, p, nil}
}

// shape draws the edges of a connected graph on n vertices, of a kind drawn too.
func shape(rng *rand.Rand, n int) []Edge {
	seen := map[[2]int]bool{}
	var edges []Edge
	join := func(i, j int) {
		if i > j {
			i, j = j, i
		}
		if i != j && !seen[[2]int{i, j}] {
			seen[[2]int{i, j}] = true
			edges = append(edges, Edge{I: i, J: j})
		}
	}
	switch rng.IntN(6) {
	case 0: // random tree
		for i := 1; i < n; i++ {
			join(i, rng.IntN(i))
		}
	case 1: // cycle with a few chords
		for i := range n {
			join(i, (i+1)%n)
		}
		for range rng.IntN(4) {
			join(rng.IntN(n), rng.IntN(n))
		}
	case 2: // grid, the last row unfinished
		side := int(math.Sqrt(float64(n)))
		for i := range n {
			if (i+1)%side != 0 && i+1 < n {
				join(i, i+1)
			}
			if i+side < n {
				join(i, i+side)
			}
		}
	case 3: // nearest neighbours in the plane, tied together by a chain through the points in order of abscissa
		x := make([][2]float64, n)
		for i := range x {
			x[i] = [2]float64{rng.Float64(), rng.Float64()}
		}
		slices.SortFunc(x, func(a, b [2]float64) int { return cmp.Compare(a[0], b[0]) })
		for _, e := range nearest(x, 2+rng.IntN(4)) {
			join(e[0], e[1])
		}
		for i := 1; i < n; i++ {
			if rng.IntN(3) == 0 || !touches(edges, i) {
				join(i-1, i)
			}
		}
		connect(n, edges, join)
	case 4: // preferential attachment: an end of a random edge is a vertex drawn by degree
		join(0, 1)
		for i := 2; i < n; i++ {
			for range 1 + rng.IntN(3) {
				e := edges[rng.IntN(len(edges))]
				join(i, e.I)
			}
			if !touches(edges, i) {
				join(i, rng.IntN(i))
			}
		}
	default: // uniform pairs over a tree
		for i := 1; i < n; i++ {
			join(i, rng.IntN(i))
		}
		for range n + rng.IntN(2*n) {
			join(rng.IntN(n), rng.IntN(n))
		}
	}
	return edges
}

// branch hangs one to three paths of one to three vertices on drawn vertices.
func branch(rng *rand.Rand, n int, edges []Edge) (int, []Edge) {
	for range 1 + rng.IntN(3) {
		from := rng.IntN(n)
		for range 1 + rng.IntN(3) {
			edges = append(edges, Edge{I: from, J: n})
			from = n
			n++
		}
	}
	return n, edges
}

func touches(edges []Edge, v int) bool {
	return slices.ContainsFunc(edges, func(e Edge) bool { return e.I == v || e.J == v })
}

// connect joins the parts of a graph, each to vertex 0's, by an edge to the vertex before its first.
func connect(n int, edges []Edge, join func(i, j int)) {
	parent := make([]int, n)
	for i := range parent {
		parent[i] = i
	}
	root := func(i int) int {
		for parent[i] != i {
			i = parent[i]
		}
		return i
	}
	for _, e := range edges {
		parent[root(e.I)] = root(e.J)
	}
	for i := 1; i < n; i++ {
		if root(i) != root(0) {
			join(i-1, i)
			parent[root(i)] = root(i - 1)
		}
	}
}

// nearest gives the pairs (i, j), j among the k nearest of i, by comparing all pairs.
func nearest(x [][2]float64, k int) [][2]int {
	var pairs [][2]int
	for i := range x {
		order := make([]int, len(x))
		for j := range order {
			order[j] = j
		}
		slices.SortStableFunc(order, func(a, b int) int {
			return cmp.Compare(math.Hypot(x[i][0]-x[a][0], x[i][1]-x[a][1]), math.Hypot(x[i][0]-x[b][0], x[i][1]-x[b][1]))
		})
		for _, j := range order[1:min(k+1, len(x))] {
			pairs = append(pairs, [2]int{i, j})
		}
	}
	return pairs
}

// Cloud gives the k-nearest-neighbour graph of n points drawn in the unit cube of dimension d, Gaussian weights
// exp(-t^2/2) of the distance over the distance to the k-th neighbour of both ends (geometric mean), with labels
// drawn vertices held at uniform values. Rows stand in the order of a grid of cells, so that neighbours in space are
// near in memory, as they are in use. It serves benchmarks and larger checks; p is left to the caller.
func Cloud(seed uint64, n, d, k, labels int) Problem {
	rng := rand.New(rand.NewPCG(seed, 0x51ed2701))
	x := make([]float64, n*d)
	for i := range x {
		x[i] = rng.Float64()
	}
	c := newCells(x, n, d, k)
	neighbours := make([]int32, n*k)
	dist := make([]float64, n*k)
	for i := range n {
		c.nearest(i, neighbours[i*k:(i+1)*k], dist[i*k:(i+1)*k])
	}
	g := symmetric(n, k, neighbours, func(i, slot int) float64 {
		j := int(neighbours[i*k+slot])
		t := dist[i*k+slot]
		return -.5 * t * t / (dist[i*k+k-1] * dist[j*k+k-1])
	})
	at := map[int]float64{}
	for len(at) < labels {
		at[rng.IntN(n)] = rng.Float64()
	}
	fixed, values := hold(at)
	return Problem{fmt.Sprintf("cloud of %d, d=%d", n, d), g, fixed, values, 0, nil}
}

// symmetric turns directed neighbour lists into the symmetric matrix that holds a pair when either end lists it.
func symmetric(n, k int, neighbours []int32, value func(i, slot int) float64) *sparse.CSR {
	type half struct {
		j int32
		v float64
	}
	rows := make([][]half, n)
	for i := range n {
		for s := range k {
			j, v := neighbours[i*k+s], value(i, s)
			rows[i] = append(rows[i], half{j, v})
			rows[j] = append(rows[j], half{int32(i), v})
		}
	}
	g := &sparse.CSR{N: n, RowPtr: make([]int, n+1)}
	for i, row := range rows {
		slices.SortFunc(row, func(a, b half) int { return cmp.Or(cmp.Compare(a.j, b.j), cmp.Compare(a.v, b.v)) })
		row = slices.CompactFunc(row, func(a, b half) bool { return a.j == b.j })
		for _, h := range row {
			g.Col = append(g.Col, h.j)
			g.Val = append(g.Val, h.v)
		}
		g.RowPtr[i+1] = len(g.Col)
	}
	return g
}
