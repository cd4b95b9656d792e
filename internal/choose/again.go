package choose

import (
	"context"
	"errors"
	"math"

	"pinfill/internal/laplace"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// leaveAgain is LeaveOut by solving each fold again without its labels, from the full answer.
func leaveAgain(ctx context.Context, p solve.Problem, l Labels, o LeaveOptions, out *LeftOut) error {
	answer := func(rest Labels) ([][]float64, error) {
		fields, results, err := Solve(ctx, p, rest, o.Start, solve.Settings{Tolerance: o.Tolerance, Workers: o.Workers, Rough: o.Rough})
		for _, r := range results {
			out.Count = addCounts(out.Count, r.Counts)
		}
		return fields, err
	}
	if p.P == 2 && o.Rough {
		if _, components := sparse.Components(p.Graph); components == 1 {
			linear := linearFolds(ctx, p, o, out)
			answer = linear
		}
	}
	for f, ks := range members(out.Fold, out.Folds) {
		rest := l.without(ks)
		fields, err := answer(rest)
		if err != nil {
			return err
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

// linearTolerance is the error of rough left-out answers at p = 2, as a share of the size of the targets.
const linearTolerance = 1e-3

// linearFolds answers a fold at p = 2 on a connected graph straight from the linear system: one set-up serves all
// classes, and the iteration starts from the full answer, from which a fold strays in places only.
func linearFolds(ctx context.Context, p solve.Problem, o LeaveOptions, out *LeftOut) func(Labels) ([][]float64, error) {
	conductance := Conductances(p.Graph, p.Energy)
	return func(rest Labels) ([][]float64, error) {
		system, err := laplace.New(ctx, conductance, rest.Vertex, laplace.Options{Workers: o.Workers})
		if err != nil {
			return nil, err
		}
		x := make([][]float64, len(rest.Target))
		for c := range x {
			x[c] = make([]float64, p.Graph.N)
			if o.Start != nil {
				copy(x[c], o.Start[c])
			}
		}
		st, err := system.SolveDirichlet(ctx, rest.Target, x, linearTolerance)
		out.Count.LinearSolves += len(x)
		out.Count.Iterations += st.Iterations
		return x, err
	}
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
