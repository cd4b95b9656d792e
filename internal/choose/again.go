package choose

import (
	"context"
	"errors"
	"math"

	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// leaveAgain is LeaveOut for p other than 2: each fold is solved again without its labels, from the full answer.
func leaveAgain(ctx context.Context, p solve.Problem, l Labels, o LeaveOptions, out *LeftOut) error {
	for f, ks := range members(out.Fold, out.Folds) {
		rest := l.without(ks)
		fields, results, err := Solve(ctx, p, rest, o.Start, solve.Settings{Tolerance: o.Tolerance, Workers: o.Workers, Rough: o.Rough})
		if err != nil {
			return err
		}
		for _, r := range results {
			out.Count = addCounts(out.Count, r.Counts)
		}
		held := make([]bool, p.Graph.N)
		for _, v := range rest.Vertex {
			held[v] = true
		}
		for c, field := range fields {
			for _, k := range ks {
				out.Score[k][c] = field[l.Vertex[k]]
			}
			var m float64
			for v, t := range field {
				if !held[v] && !math.IsNaN(t) {
					m += t
				}
			}
			out.Mass[f][c] = m
			if o.Field != nil {
				if err := o.Field(f, c, field); err != nil {
					return err
				}
			}
		}
	}
	return nil
}

// without gives the labels other than those in ks, increasing.
func (l Labels) without(ks []int) Labels {
	out := make([]bool, l.Count())
	for _, k := range ks {
		out[k] = true
	}
	r := Labels{Task: l.Task, Target: make([][]float64, len(l.Target))}
	for k, v := range l.Vertex {
		if out[k] {
			continue
		}
		r.Vertex = append(r.Vertex, v)
		for c := range l.Target {
			r.Target[c] = append(r.Target[c], l.Target[c][k])
		}
		if l.Group != nil {
			r.Group = append(r.Group, l.Group[k])
		}
	}
	return r
}

// Solve gives the answer to every target over all vertices, NaN in components without a label, and the solver's
// results, one a component and class. start is one guess a class by vertex, or nil.
func Solve(ctx context.Context, p solve.Problem, l Labels, start [][]float64, s solve.Settings) ([][]float64, []solve.Result, error) {
	if p.Graph == nil {
		return nil, nil, errors.New("there is no graph")
	}
	if err := l.Validate(p.Graph.N); err != nil {
		return nil, nil, err
	}
	fields := make([][]float64, len(l.Target))
	for c := range fields {
		fields[c] = make([]float64, p.Graph.N)
		for v := range fields[c] {
			fields[c][v] = math.NaN()
		}
	}
	at := make([]int32, p.Graph.N) // vertex -> 1 + its label, or 0
	for k, v := range l.Vertex {
		at[v] = int32(k) + 1
	}
	var results []solve.Result
	for _, part := range sparse.Split(p.Graph) {
		sub := solve.Problem{Graph: part.Graph, P: p.P, Energy: p.Energy}
		var held []int
		for v, x := range part.Vertices {
			if at[x] > 0 {
				sub.Fixed = append(sub.Fixed, int32(v))
				held = append(held, int(at[x])-1)
			}
		}
		if len(held) == 0 {
			continue
		}
		values := make([][]float64, len(l.Target))
		var starts [][]float64
		for c, t := range l.Target {
			for _, k := range held {
				values[c] = append(values[c], t[k])
			}
			if start != nil {
				guess := make([]float64, len(part.Vertices))
				for v, x := range part.Vertices {
					guess[v] = start[c][x]
				}
				starts = append(starts, guess)
			}
		}
		got, err := solve.RunMany(ctx, sub, values, starts, s)
		if err != nil {
			return nil, nil, err
		}
		for c, r := range got {
			for v, x := range part.Vertices {
				fields[c][x] = r.Values[v]
			}
			results = append(results, r)
		}
	}
	return fields, results, nil
}

func addCounts(a, b solve.Counts) solve.Counts {
	return solve.Counts{
		LinearSolves: a.LinearSolves + b.LinearSolves, Iterations: a.Iterations + b.Iterations,
		Newton: a.Newton + b.Newton, Paths: a.Paths + b.Paths,
	}
}
