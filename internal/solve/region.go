package solve

import (
	"math"

	"pinfill/internal/sparse"
)

// region is a connected set of free vertices with the fixed vertices beside it. The fixed vertices cut the graph
// into regions whose answers do not depend on each other, so each is solved on its own, in its own scale: a region
// between equal values is constant, a small one is eliminated directly.
type region struct {
	graph    *sparse.CSR // Val holds ln of the slope weight, the largest 0; no edges between fixed vertices
	vertices []int32     // vertex of the whole graph for each vertex here, strictly increasing
	fixed    []int32     // here, strictly increasing
	given    []int32     // position in Problem.Fixed of each of fixed
	free     int
}

const (
	fixedMark   = -2
	pendantMark = -3
)

// regions cuts the graph and leaves out the pendant vertices, for which it gives the vertex each hangs from (see
// pendants). The error is an *UnreachableError. Time and memory are O(n + edges).
func regions(p Problem) ([]region, []int32, error) {
	g := p.Graph
	label := make([]int32, g.N)
	for v := range label {
		label[v] = -1
	}
	for _, v := range p.Fixed {
		label[v] = fixedMark
	}
	var count int32
	var stack []int32
	var sizes []int
	for start := range g.N {
		if label[start] != -1 {
			continue
		}
		label[start] = count
		held, size := false, 0
		stack = append(stack[:0], int32(start))
		for len(stack) > 0 {
			v := stack[len(stack)-1]
			stack = stack[:len(stack)-1]
			size++
			cols, _ := g.Row(int(v))
			for _, u := range cols {
				switch label[u] {
				case fixedMark:
					held = true
				case -1:
					label[u] = count
					stack = append(stack, u)
				}
			}
		}
		if !held {
			return nil, nil, &UnreachableError{Vertex: start}
		}
		count++
		sizes = append(sizes, size)
	}
	anchor := pendants(g, func(v int32) bool { return label[v] == fixedMark })
	for v, a := range anchor {
		if a >= 0 {
			sizes[label[v]]--
			label[v] = pendantMark
		}
	}
	out := make([]region, count)
	for c := range out {
		out[c].vertices = make([]int32, 0, sizes[c]+8)
		out[c].free = sizes[c]
	}
	given := int32(0)
	for v := range g.N {
		if c := label[v]; c >= 0 {
			out[c].vertices = append(out[c].vertices, int32(v))
			continue
		} else if c == pendantMark {
			continue
		}
		cols, _ := g.Row(v)
		for _, u := range cols {
			c := label[u]
			if c < 0 {
				continue
			}
			r := &out[c]
			if k := len(r.vertices); k > 0 && r.vertices[k-1] == int32(v) {
				continue
			}
			r.fixed = append(r.fixed, int32(len(r.vertices)))
			r.given = append(r.given, given)
			r.vertices = append(r.vertices, int32(v))
		}
		given++
	}
	place := make([]int32, g.N)
	for c := range out {
		out[c].cut(p, int32(c), label, place)
	}
	return out, anchor, nil
}

// cut fills the graph of region c; place is scratch.
func (r *region) cut(p Problem, c int32, label, place []int32) {
	g := p.Graph
	for k, v := range r.vertices {
		place[v] = int32(k)
	}
	n := len(r.vertices)
	entries := 0
	for _, v := range r.vertices {
		if label[v] == c {
			entries += g.RowPtr[v+1] - g.RowPtr[v]
		}
	}
	sub := &sparse.CSR{N: n, RowPtr: make([]int, n+1), Col: make([]int32, 0, entries+entries/8), Val: make([]float64, 0, entries+entries/8)}
	top := math.Inf(-1)
	for k, v := range r.vertices {
		cols, vals := g.Row(int(v))
		inside := label[v] == c
		for t, u := range cols {
			if label[u] == pendantMark || !inside && label[u] != c {
				continue
			}
			a := slopeLog(p, vals[t])
			top = max(top, a)
			sub.Col = append(sub.Col, place[u])
			sub.Val = append(sub.Val, a)
		}
		sub.RowPtr[k+1] = len(sub.Col)
	}
	for k := range sub.Val {
		sub.Val[k] -= top
	}
	r.graph = sub
}

// slopeLog is the logarithm of the weight in the slope convention for a stored ln w: conductance w at exponent p is
// slope w^(1/p), and 1 in the limit.
func slopeLog(p Problem, a float64) float64 {
	switch {
	case p.Energy == Slope:
		return a
	case math.IsInf(p.P, 1):
		return 0
	default:
		return a / p.P
	}
}
