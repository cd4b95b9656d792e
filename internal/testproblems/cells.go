package testproblems

import (
	"math"
	"slices"
)

// cells is a uniform grid over the unit cube that finds nearest neighbours of points drawn uniformly, for graphs of
// tests and benchmarks. Points are renumbered cell by cell along a Z-order curve.
type cells struct {
	x     []float64 // n*d coordinates, in the new order
	n, d  int
	side  int
	start []int // first point of each cell, in row-major cell number
}

func newCells(x []float64, n, d, k int) *cells {
	side := 1
	for math.Pow(float64(2*side), float64(d))*float64(k)/2 < float64(n) {
		side *= 2
	}
	c := &cells{n: n, d: d, side: side}
	total := int(math.Pow(float64(side), float64(d)) + .5)
	rank := make([]int, n)
	c.start = make([]int, total+1)
	for i := range n {
		rank[i] = c.rank(x[i*d : (i+1)*d])
		c.start[rank[i]+1]++
	}
	for i := range total {
		c.start[i+1] += c.start[i]
	}
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return rank[a] - rank[b] })
	c.x = make([]float64, 0, n*d)
	for _, i := range order {
		c.x = append(c.x, x[i*d:(i+1)*d]...)
	}
	return c
}

// rank is the Z-order number of the cell a point lies in.
func (c *cells) rank(x []float64) int {
	cell := make([]int, c.d)
	for a := range cell {
		cell[a] = min(int(x[a]*float64(c.side)), c.side-1)
	}
	return c.interleave(cell)
}

func (c *cells) interleave(cell []int) int {
	r := 0
	for bit := c.side / 2; bit > 0; bit /= 2 {
		for _, v := range cell {
			r *= 2
			if v&bit != 0 {
				r++
			}
		}
	}
	return r
}

// nearest writes the len(to) nearest points of point i and their distances, nearest first, ties by number.
func (c *cells) nearest(i int, to []int32, dist []float64) {
	x := c.x[i*c.d : (i+1)*c.d]
	k := len(to)
	centre := make([]int, c.d)
	for a := range centre {
		centre[a] = min(int(x[a]*float64(c.side)), c.side-1)
	}
	found := 0
	for ring := 0; ring <= c.side; ring++ {
		c.shell(centre, ring, func(rank int) {
			for j := c.start[rank]; j < c.start[rank+1]; j++ {
				if j == i {
					continue
				}
				var s float64
				for a, xa := range x {
					t := xa - c.x[j*c.d+a]
					s += float64(t * t)
				}
				if found == k && s >= dist[k-1] {
					continue
				}
				at := min(found, k-1)
				for at > 0 && dist[at-1] > s {
					dist[at], to[at] = dist[at-1], to[at-1]
					at--
				}
				dist[at], to[at] = s, int32(j)
				found = min(found+1, k)
			}
		})
		reach := float64(ring) / float64(c.side)
		if found == k && dist[k-1] <= reach*reach {
			break
		}
	}
	for s := range dist {
		dist[s] = math.Sqrt(dist[s])
	}
}

// shell calls visit for each cell at Chebyshev distance ring from the centre.
func (c *cells) shell(centre []int, ring int, visit func(rank int)) {
	cell := make([]int, c.d)
	var walk func(axis int, touched bool)
	walk = func(axis int, touched bool) {
		if axis == c.d {
			if touched {
				visit(c.interleave(cell))
			}
			return
		}
		for o := -ring; o <= ring; o++ {
			if axis == c.d-1 && !touched && o != -ring && o != ring {
				continue
			}
			if v := centre[axis] + o; v >= 0 && v < c.side {
				cell[axis] = v
				walk(axis+1, touched || o == -ring || o == ring)
			}
		}
	}
	walk(0, ring == 0)
}
