package main

import (
	"context"
	"slices"

	"pinfill/internal/choose"
	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/sparse"
)

// space is a table made ready: its distinct points, their neighbours, and the truth by vertex.
type space struct {
	table  *table
	points *points.Matrix
	lists  *neighbors.Lists
	class  []int // of each vertex, the first row's
	value  []float64
	n      int
}

const listK = 15 // neighbours searched for: the most that a candidate or the dimension asks for

func newSpace(ctx context.Context, t *table) (*space, error) {
	s, err := points.Prepare(ctx, t.raw, points.Options{})
	if err != nil {
		return nil, err
	}
	lists, _, err := neighbors.KNearest(ctx, s.Points, min(listK, s.Points.N-1), neighbors.Options{})
	if err != nil {
		return nil, err
	}
	sp := &space{table: t, points: s.Points, lists: lists, n: s.Points.N}
	sp.class, sp.value = make([]int, sp.n), make([]float64, sp.n)
	for i := len(s.Vertex) - 1; i >= 0; i-- {
		if t.class != nil {
			sp.class[s.Vertex[i]] = t.class[i]
		} else {
			sp.value[s.Vertex[i]] = t.value[i]
		}
	}
	return sp, nil
}

// network gives the weighted graph of a setting, components without a label joined to the nearest with one.
func (s *space) network(ctx context.Context, k int, b graph.Bandwidth, l choose.Labels, kernel graph.Kernel) (*sparse.CSR, error) {
	g, err := graph.FromLists(s.lists, min(k, s.lists.K), 0)
	if err != nil {
		return nil, err
	}
	w, err := g.LogWeights(kernel, b, 0)
	if err != nil {
		return nil, err
	}
	reach, err := graph.FindReach(w, l.Vertex)
	if err != nil || len(reach.Unlabelled()) == 0 {
		return w, err
	}
	joined, _, err := g.Join(ctx, w, reach, s.points, kernel, b, neighbors.Options{})
	return joined, err
}

// perClass draws k labels of each class.
func (s *space) perClass(k int, seed uint64) choose.Labels {
	classes := s.table.classes()
	r := seedOf(100+seed, uint64(k))
	byClass := make([][]int32, classes)
	for v, c := range s.class {
		byClass[c] = append(byClass[c], int32(v))
	}
	var vs []int32
	for _, of := range byClass {
		for _, i := range r.Perm(len(of))[:min(k, len(of))] {
			vs = append(vs, of[i])
		}
	}
	return s.classLabels(vs)
}

func (s *space) classLabels(vs []int32) choose.Labels {
	slices.Sort(vs)
	l := choose.Labels{Vertex: vs, Target: make([][]float64, s.table.classes())}
	for c := range l.Target {
		l.Target[c] = make([]float64, len(vs))
	}
	for k, v := range vs {
		l.Target[s.class[v]][k] = 1
	}
	return l
}

// atRandom draws labels from all vertices; numbers.
func (s *space) atRandom(count int, seed uint64) choose.Labels {
	r := seedOf(100+seed, uint64(count))
	var vs []int32
	for _, i := range r.Perm(s.n)[:count] {
		vs = append(vs, int32(i))
	}
	slices.Sort(vs)
	l := choose.Labels{Task: choose.Numbers, Vertex: vs, Target: [][]float64{make([]float64, count)}}
	for k, v := range vs {
		l.Target[0][k] = s.value[v]
	}
	return l
}

// accuracy is the share of unlabelled vertices decided right.
func (s *space) accuracy(scores [][]float64, w choose.Weights, l choose.Labels) float64 {
	held := make([]bool, s.n)
	for _, v := range l.Vertex {
		held[v] = true
	}
	right, all := 0, 0
	for v, c := range s.class {
		if held[v] {
			continue
		}
		all++
		if w.Decide(func(c int) float64 { return scores[c][v] }) == c {
			right++
		}
	}
	return float64(right) / float64(all)
}
