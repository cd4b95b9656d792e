package neighbors

import (
	"math"
	"slices"

	"github.com/kyroy/kdtree"

	"pinfill/internal/points"
)

// Growing is a set of points that grows, for few queries in between: the points already chosen or joined, and how far
// the next is from them. It stands on kyroy/kdtree. A point costs O(log n) where they come in no particular order; the
// tree is rebalanced each time it doubles, which keeps that so for sorted ones.
type Growing struct {
	metric   points.Metric
	tree     *kdtree.KDTree
	n, built int
}

// member is a point with its number, in the form that kdtree takes.
type member struct {
	x  []float64
	id int32
}

func (m member) Dimensions() int         { return len(m.x) }
func (m member) Dimension(i int) float64 { return m.x[i] }

// NewGrowing gives an empty set. Metric as in Options.
func NewGrowing(m points.Metric) *Growing {
	return &Growing{metric: m, tree: kdtree.New(nil)}
}

// Len is the number of points.
func (g *Growing) Len() int { return g.n }

// Add inserts point x, finite, under a number. The set keeps x, which must not change; all points have one length.
func (g *Growing) Add(x []float64, id int32) {
	g.tree.Insert(member{x, id})
	g.n++
	if g.n >= 2*g.built+32 {
		g.tree.Balance()
		g.built = g.n
	}
}

// Nearest gives the nearest point of the set to x and its distance; (-1, +Inf) for an empty set. Of several at the same
// distance it is the lexicographically smallest, then the smallest number.
func (g *Growing) Nearest(x []float64) (id int32, dist float64) {
	if g.n == 0 {
		return -1, math.Inf(1)
	}
	return g.nearest(x)
}

// nearest asks the tree for one point at about the distance, then for all in the box that this distance spans, because
// which of several equally near points the tree gives depends on the order they came in.
func (g *Growing) nearest(x []float64) (id int32, dist float64) {
	near := closeness(g.metric)
	first := g.tree.KNN(member{x: x}, 1)[0].(member)
	c := near(x, first.x)
	reach := c
	if g.metric != points.Manhattan {
		reach = math.Sqrt(c)
	}
	box := make([][2]float64, len(x))
	for j, v := range x {
		reach := math.Nextafter(reach*(1+1e-12), math.Inf(1))
		box[j] = [2]float64{v - reach, v + reach}
	}
	won := first
	for _, p := range g.tree.RangeSearch(box) {
		m := p.(member)
		if d := near(x, m.x); d < c || d == c && earlier(m, won) {
			won, c = m, d
		}
	}
	out := []float64{c}
	distances(g.metric, out)
	return won.id, out[0]
}

// earlier says whether a comes before b lexicographically, or by number where they are equal.
func earlier(a, b member) bool {
	if c := slices.Compare(a.x, b.x); c != 0 {
		return c < 0
	}
	return a.id < b.id
}
