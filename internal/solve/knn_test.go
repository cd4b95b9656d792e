package solve

import (
	"math"
	"math/rand/v2"
	"sort"

	"pinfill/internal/sparse"
)

// knnGraph is the graph of the k nearest neighbours, symmetrised by "or", of n uniform points in the unit cube of d
// dimensions (d = 2 or 3), in the order of a fine grid's Morton code, with ln w = -(dist/h)^2/2 and h the local
// scale sqrt(s_i s_j) of the k-th neighbours.
func knnGraph(seed uint64, n, d, k int) (*sparse.CSR, [][]float64) {
	rng := rand.New(rand.NewPCG(seed, 77))
	side := max(1, int(math.Pow(float64(n)/float64(k), 1/float64(d))))
	pts := make([][]float64, n)
	for i := range pts {
		pts[i] = make([]float64, d)
		for j := range pts[i] {
			pts[i][j] = rng.Float64()
		}
	}
	code := func(x []float64) (c uint64) {
		for b := 9; b >= 0; b-- {
			for j := range x {
				c = c<<1 | uint64(x[j]*1024)>>b&1
			}
		}
		return c
	}
	sort.Slice(pts, func(i, j int) bool { return code(pts[i]) < code(pts[j]) })
	cell := func(x []float64) []int {
		c := make([]int, d)
		for j := range c {
			c[j] = min(int(x[j]*float64(side)), side-1)
		}
		return c
	}
	index := func(c []int) int {
		t := 0
		for _, v := range c {
			t = t*side + v
		}
		return t
	}
	cells := map[int][]int32{}
	for i := range pts {
		t := index(cell(pts[i]))
		cells[t] = append(cells[t], int32(i))
	}
	type near struct {
		j    int32
		dist float64
	}
	nb := make([][]near, n)
	for i := range pts {
		c := cell(pts[i])
		for r := 1; ; r++ {
			var got []near
			var walk func(j int, at []int)
			walk = func(j int, at []int) {
				if j == d {
					for _, q := range cells[index(at)] {
						if int(q) == i {
							continue
						}
						var s float64
						for m := range d {
							s += (pts[i][m] - pts[q][m]) * (pts[i][m] - pts[q][m])
						}
						got = append(got, near{q, math.Sqrt(s)})
					}
					return
				}
				for o := max(0, c[j]-r); o <= min(side-1, c[j]+r); o++ {
					walk(j+1, append(at, o))
				}
			}
			walk(0, nil)
			sort.Slice(got, func(a, b int) bool { return got[a].dist < got[b].dist })
			if len(got) >= k && (got[k-1].dist <= float64(r)/float64(side) || r >= side) {
				nb[i] = got[:k]
				break
			}
		}
	}
	seen := map[[2]int32]bool{}
	var edges []link
	for i := range nb {
		for _, q := range nb[i] {
			u, v := int32(i), q.j
			if u > v {
				u, v = v, u
			}
			if seen[[2]int32{u, v}] {
				continue
			}
			seen[[2]int32{u, v}] = true
			h2 := nb[i][k-1].dist * nb[q.j][k-1].dist
			edges = append(edges, link{int(u), int(v), -q.dist * q.dist / h2 / 2})
		}
	}
	return fromEdges(n, edges), pts
}

// knnProblem puts l labels on a kNN graph: two classes if classes, else a smooth sheet.
func knnProblem(seed uint64, n, d, l int, classes bool) Problem {
	g, pts := knnGraph(seed, n, d, 10)
	rng := rand.New(rand.NewPCG(seed, 78))
	perm := rng.Perm(n)[:l]
	sort.Ints(perm)
	p := Problem{Graph: g, P: 2}
	for _, v := range perm {
		p.Fixed = append(p.Fixed, int32(v))
		y := math.Sin(5*pts[v][0]) + pts[v][1]
		if classes {
			y = 0
			if pts[v][0] > 0.5 {
				y = 1
			}
		}
		p.Values = append(p.Values, y)
	}
	return p
}
