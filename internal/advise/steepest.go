package advise

import (
	"container/heap"
	"fmt"
	"math"

	"pinfill/internal/sparse"
)

// Pair is two labels and the slope between them.
type Pair struct {
	Low, High int     // indices of the labels with the smaller and the larger value
	Slope     float64 // (y_high - y_low) / length of the shortest path between them
	Length    float64 // that length, an edge of weight w being 1/w long
}

// SteepestPair finds the two labels between which the shortest path is steepest: whatever lies between, the largest
// weighted slope w |f_i - f_j| of any answer is at least theirs, and at p = inf exactly theirs. graph holds ln w;
// fixed are the labelled vertices and values theirs. ok is false if no path joins labels of different value.
//
// The slope is raised step by step: at slope s, one search from all labels, label t starting at height y_t and an edge
// of length len adding s len, finds a label that is reached below its own height if and only if a steeper pair exists
// (McShane 1934; the step is Dinkelbach's for a ratio, 1967). A handful of searches is enough, whatever the number of
// labels.
func SteepestPair(graph *sparse.CSR, fixed []int32, values []float64) (pair Pair, ok bool, err error) {
	if len(values) != len(fixed) {
		return Pair{}, false, fmt.Errorf("%d values for %d labels", len(values), len(fixed))
	}
	top := math.Inf(-1)
	for _, v := range graph.Val {
		top = max(top, v)
	}
	s := &search{graph: graph, fixed: fixed, values: values, top: top, label: make([]int32, graph.N)}
	for v := range s.label {
		s.label[v] = -1
	}
	for k, v := range fixed {
		if v < 0 || int(v) >= graph.N {
			return Pair{}, false, fmt.Errorf("label %d: vertex %d of %d", k, v, graph.N)
		}
		s.label[v] = int32(k)
	}
	slope := 0.0
	for {
		next, found := s.steeper(slope)
		if !found {
			break
		}
		pair, ok, slope = next, true, next.Slope
	}
	// Lengths were in units of the shortest edge, exp(-top).
	pair.Length *= math.Exp(-top)
	pair.Slope *= math.Exp(top)
	return pair, ok, nil
}

type search struct {
	graph  *sparse.CSR
	fixed  []int32
	values []float64
	top    float64
	label  []int32 // label of each vertex, or -1
}

// steeper searches at a slope and gives the steepest of the pairs that it finds to be steeper.
func (s *search) steeper(slope float64) (best Pair, found bool) {
	n := s.graph.N
	height, length := make([]float64, n), make([]float64, n)
	origin, done := make([]int32, n), make([]bool, n)
	for v := range height {
		height[v] = math.Inf(1)
	}
	q := &queue{}
	for k, v := range s.fixed {
		height[v], origin[v] = s.values[k], int32(k)
		q.items = append(q.items, item{s.values[k], v})
	}
	heap.Init(q)
	for q.Len() > 0 {
		it := heap.Pop(q).(item)
		if done[it.vertex] || it.height > height[it.vertex] {
			continue
		}
		v := it.vertex
		done[v] = true
		cols, vals := s.graph.Row(int(v))
		for e, w := range cols {
			step := math.Exp(s.top - vals[e])
			if math.IsInf(step, 1) {
				continue // no path that a double can measure
			}
			to := length[v] + step
			h := s.values[origin[v]] + float64(slope*to)
			if k := s.label[w]; k >= 0 && k != origin[v] && s.values[k] > s.values[origin[v]] {
				if r := (s.values[k] - s.values[origin[v]]) / to; r > slope*(1+1e-12) && (!found || r > best.Slope) {
					best, found = Pair{Low: int(origin[v]), High: int(k), Slope: r, Length: to}, true
				}
			}
			if !done[w] && h < height[w] {
				height[w], length[w], origin[w] = h, to, origin[v]
				heap.Push(q, item{h, w})
			}
		}
	}
	return best, found
}

type item struct {
	height float64
	vertex int32
}

type queue struct{ items []item }

func (q *queue) Len() int { return len(q.items) }

func (q *queue) Less(i, j int) bool {
	a, b := q.items[i], q.items[j]
	return a.height < b.height || a.height == b.height && a.vertex < b.vertex
}
func (q *queue) Swap(i, j int) { q.items[i], q.items[j] = q.items[j], q.items[i] }
func (q *queue) Push(x any)    { q.items = append(q.items, x.(item)) }
func (q *queue) Pop() any {
	it := q.items[len(q.items)-1]
	q.items = q.items[:len(q.items)-1]
	return it
}
