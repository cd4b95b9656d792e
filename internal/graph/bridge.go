package graph

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/neighbors"
	"pinfill/internal/parallel"
	"pinfill/internal/points"
	"pinfill/internal/sparse"
)

// ErrNoPoints says that components cannot be bridged because the graph came as edges, without points.
var ErrNoPoints = errors.New("a graph given by its edges has no distances to bridge components by; leave their rows blank, or stop")

// ErrNoLabel says that no component holds a label.
var ErrNoLabel = errors.New("no component of the graph holds a label")

// Bridge is an edge that joins a component without a label to the nearest component with one.
type Bridge struct {
	Component int32 // the component joined, in Reach's numbering
	From, To  int32 // its vertex, and that of the labelled component
	Distance  float64
	LogWeight float64
}

// Join adds to the weighted graph a (Val = ln w, of g with kernel k and bandwidth b) one edge for each component
// without a label, along the shortest distance to a vertex of a component with one, and gives the bridges in order of
// component. Equal distances are settled by the order of the vertices. pts are the points of the vertices.
//
// A single edge carries no flow, so every value of the component is the value at the bridge's far end, whatever the
// weight and p; the weight matters for arithmetic alone. It is the kernel at the bridge's length or, where the kernel
// is zero or below anything in the graph, the least weight of the graph.
//
// Errors: ErrNoPoints for pts = nil, ErrNoLabel, or the context's.
func (g *Graph) Join(ctx context.Context, a *sparse.CSR, r *Reach, pts *points.Matrix, k Kernel, b Bandwidth, o neighbors.Options) (*sparse.CSR, []Bridge, error) {
	bridges, err := findBridges(ctx, r, pts, o)
	if err != nil || len(bridges) == 0 {
		return a, nil, err
	}
	least := 0.0
	if a.NNZ() > 0 {
		least = slices.Min(a.Val)
	}
	for t := range bridges {
		e := &bridges[t]
		d := e.Distance
		e.LogWeight = max(k.Log(b.t2(d, g.scaleOr(e.From, d), g.scaleOr(e.To, d))), least)
	}
	return addBridges(a, bridges), bridges, nil
}

// scaleOr is the own scale of v, or d for a vertex without neighbours.
func (g *Graph) scaleOr(v int32, d float64) float64 {
	if s := g.Local[v]; !math.IsNaN(s) {
		return s
	}
	return d
}

// findBridges asks, for every vertex that no label reaches, for the nearest that one does, and keeps the shortest of
// each component.
func findBridges(ctx context.Context, r *Reach, pts *points.Matrix, o neighbors.Options) ([]Bridge, error) {
	lost := r.Unlabelled()
	if len(lost) == 0 {
		return nil, nil
	}
	if len(lost) == len(r.Labels) {
		return nil, ErrNoLabel
	}
	if pts == nil {
		return nil, ErrNoPoints
	}
	if pts.N != len(r.Component) {
		return nil, sizeError("matrix of points", pts.N, len(r.Component))
	}
	var reached, unreached []int32
	for v, c := range r.Component {
		if r.Labels[c] > 0 {
			reached = append(reached, int32(v))
		} else {
			unreached = append(unreached, int32(v))
		}
	}
	sub := points.NewMatrix(len(reached), pts.D)
	for i, v := range reached {
		copy(sub.Row(i), pts.Row(int(v)))
	}
	index, err := neighbors.NewIndex(ctx, sub, o)
	if err != nil {
		return nil, fmt.Errorf("joining components: %w", err)
	}
	to := make([]int32, len(unreached))
	dist := make([]float64, len(unreached))
	parallel.For(o.Workers, len(unreached), 64, func(lo, hi int) {
		for i := lo; i < hi && ctx.Err() == nil; i++ {
			// The query has the points' number of columns, which is all that Nearest can refuse.
			_ = index.Nearest(pts.Row(int(unreached[i])), to[i:i+1], dist[i:i+1])
		}
	})
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	best := make([]int32, len(r.Labels)) // of each component, 1 + its place in bridges
	var bridges []Bridge
	for i, v := range unreached {
		c := r.Component[v]
		e := Bridge{Component: c, From: v, To: reached[to[i]], Distance: dist[i]}
		switch {
		case best[c] == 0:
			bridges = append(bridges, e)
			best[c] = int32(len(bridges))
		case e.Distance < bridges[best[c]-1].Distance: // equal ones: the smaller From stays
			bridges[best[c]-1] = e
		}
	}
	return bridges, nil
}

// addBridges inserts the bridges, which are no edges of a.
func addBridges(a *sparse.CSR, bridges []Bridge) *sparse.CSR {
	more := make(map[int32][]int, 2*len(bridges)) // of each vertex, its bridges; read by vertex, never in map order
	for t, e := range bridges {
		more[e.From] = append(more[e.From], t)
		more[e.To] = append(more[e.To], t)
	}
	j := &sparse.CSR{N: a.N, RowPtr: make([]int, a.N+1)}
	j.Col = make([]int32, 0, a.NNZ()+2*len(bridges))
	j.Val = make([]float64, 0, a.NNZ()+2*len(bridges))
	for v := range a.N {
		col, val := a.Row(v)
		at := len(j.Col)
		j.Col = append(j.Col, col...)
		j.Val = append(j.Val, val...)
		if extra := more[int32(v)]; len(extra) > 0 {
			for _, t := range extra {
				e := bridges[t]
				j.Col = append(j.Col, e.From+e.To-int32(v))
				j.Val = append(j.Val, e.LogWeight)
			}
			sparse.SortRow(j.Col[at:], j.Val[at:])
		}
		j.RowPtr[v+1] = len(j.Col)
	}
	return j
}
