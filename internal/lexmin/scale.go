package lexmin

import (
	"fmt"
	"math"
	"slices"
)

// reach is how far the logarithm of a length may lie from 0 on either side: e^500 is 1e217, which leaves room to add
// 1e10 lengths and to divide the least difference of values that counts (see level) by their sum.
const reach = 500

// run settles every free vertex, component by component, each with lengths in a scale of its own.
func (s *solver) run() error {
	s.tokens <- struct{}{}
	defer func() { <-s.tokens }()
	w := s.spare.Get().(*worker)
	all := make([]int32, 0, s.free)
	for v := range s.set {
		if s.set[v] != held {
			all = append(all, int32(v))
		}
	}
	parts := w.split(all, 1)
	for _, p := range parts {
		if !slices.ContainsFunc(p.vertices, w.meetsHeld) {
			return fmt.Errorf("vertex %d lies in a component without a fixed vertex", slices.Min(p.vertices))
		}
	}
	s.length = make([]float64, len(s.g.Col))
	w.forEach(parts, func(w *worker, p part) { w.scaled(p) })
	return nil
}

func (s *solver) meetsHeld(v int32) bool {
	cols, _ := s.g.Row(int(v))
	return slices.ContainsFunc(cols, func(u int32) bool { return s.set[u] == held })
}

// scaled settles a component after giving it lengths l = 1/w: relative to the greatest weight where all then lie in
// [1, e^500], otherwise spread over [e^-500, e^500], and where even that is too narrow step by step (see wide).
func (w *worker) scaled(p part) {
	origin, wide := w.gauge(p)
	w.measure(p, origin)
	if wide {
		w.wide(p)
	} else {
		w.begin(p)
	}
}

// gauge gives the logarithm of the weight whose length is to be 1, and whether lengths then have to be cut.
func (w *worker) gauge(p part) (origin float64, wide bool) {
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range p.vertices {
		_, vals := w.g.Row(int(v))
		for _, x := range vals {
			low, high = min(low, x), max(high, x)
		}
	}
	if high-low > 2*reach {
		origin, _ = w.bottleneck(p)
		return origin, true
	}
	return high - max(0, high-low-reach), false
}

// measure sets lengths to e^(origin - ln w), cut to [e^-500, e^500].
func (w *worker) measure(p part, origin float64) {
	for _, v := range p.vertices {
		for k := w.g.RowPtr[v]; k < w.g.RowPtr[v+1]; k++ {
			w.length[k] = math.Exp(min(max(origin-w.g.Val[k], -reach), reach))
		}
	}
}

// negligible is the slope, with the bottleneck's length as unit, below which a path may depend on lengths that
// measure has cut.
const negligible = 1e-130

// wide settles a component whose weights span more than e^1000. The steepest path is about as long as its weakest edge,
// and no path between different values has a stronger weakest edge than the bottleneck: with that as the unit,
// stronger edges that are cut add nothing a float64 can show, and weaker ones lie on no path steeper than negligible.
// Those that are steeper are settled, and what remains starts again with its own bottleneck.
func (w *worker) wide(p part) {
	base := len(w.stack)
	defer func() { w.stack = w.stack[:base] }()
	w.loosen(p.vertices)
	above := w.steeper(p.vertices, p.id, negligible)
	if len(above) == 0 {
		w.begin(p) // flat: there is no bottleneck
		return
	}
	w.digAll(above, negligible)
	if w.stop.Load() {
		return
	}
	rest := w.keep(p.vertices, w.ids.Add(1))
	w.forEach(w.components(rest), func(w *worker, p part) { w.scaled(p) })
}

// bottleneck gives the greatest ln w such that edges at least as strong join two different held values through free
// vertices: Kruskal's order, with the least and the greatest value met by each tree.
func (w *worker) bottleneck(p part) (logw float64, found bool) {
	index := make(map[int32]int, len(p.vertices))
	parent := make([]int, len(p.vertices))
	low, high := make([]float64, len(p.vertices)), make([]float64, len(p.vertices))
	var edges []int // positions in Col, with the row's vertex in row
	row := map[int]int{}
	for i, v := range p.vertices {
		index[v], parent[i] = i, i
		low[i], high[i] = math.Inf(1), math.Inf(-1)
		for k := w.g.RowPtr[v]; k < w.g.RowPtr[v+1]; k++ {
			if u := w.g.Col[k]; w.set[u] == held || u > v {
				edges = append(edges, k)
				row[k] = i
			}
		}
	}
	slices.SortStableFunc(edges, func(a, b int) int {
		switch va, vb := w.g.Val[a], w.g.Val[b]; {
		case va > vb:
			return -1
		case va < vb:
			return 1
		}
		return a - b
	})
	root := func(i int) int {
		for parent[i] != i {
			parent[i] = parent[parent[i]]
			i = parent[i]
		}
		return i
	}
	for _, k := range edges {
		a := root(row[k])
		if u := w.g.Col[k]; w.set[u] == held {
			low[a], high[a] = min(low[a], w.f[u]), max(high[a], w.f[u])
		} else if b := root(index[u]); b != a {
			parent[b] = a
			low[a], high[a] = min(low[a], low[b]), max(high[a], high[b])
		}
		if high[a]-low[a] >= level {
			return w.g.Val[k], true
		}
	}
	return 0, false
}
