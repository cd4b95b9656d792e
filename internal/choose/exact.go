package choose

import (
	"context"
	"math"

	"gonum.org/v1/gonum/mat"

	"pinfill/internal/laplace"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// responses is what p = 2 knows of one component: the harmonic measures of its labels and their Schur complement.
type responses struct {
	part   sparse.Part
	labels []int         // labels in the component, as positions in Labels
	fixed  []int32       // their vertices in the part
	schur  *mat.SymDense // nil if there is one label
	h      [][]float64   // h[i][v]: harmonic measure of labels[i] at vertex v of the part; nil unless fields are asked for
	mass   []float64     // mass[i]: sum of h[i] over the free vertices
}

// respond finds the responses of every component that holds a label.
func respond(ctx context.Context, p solve.Problem, l Labels, o LeaveOptions, count *solve.Counts) ([]responses, error) {
	at := make([]int32, p.Graph.N) // vertex -> 1 + its label, or 0
	for k, v := range l.Vertex {
		at[v] = int32(k) + 1
	}
	tol := o.Tolerance
	if tol == 0 {
		tol = 1e-9
	}
	var all []responses
	for _, part := range sparse.Split(Conductances(p.Graph, p.Energy)) {
		r := responses{part: part}
		for v, x := range part.Vertices {
			if at[x] > 0 {
				r.fixed = append(r.fixed, int32(v))
				r.labels = append(r.labels, int(at[x])-1)
			}
		}
		if len(r.fixed) == 0 {
			continue
		}
		keep := o.Field != nil
		if keep {
			r.h = make([][]float64, len(r.fixed))
		}
		r.mass = make([]float64, len(r.fixed))
		if len(r.fixed) == 1 { // the constant is the only answer
			if keep {
				r.h[0] = make([]float64, part.Graph.N)
				for v := range r.h[0] {
					r.h[0][v] = 1
				}
			}
			r.mass[0] = float64(part.Graph.N - 1)
			all = append(all, r)
			continue
		}
		s, err := laplace.New(ctx, part.Graph, r.fixed, laplace.Options{Workers: o.Workers})
		if err != nil {
			return nil, err
		}
		free := s.Free()
		schur, stats, err := s.Harmonic(ctx, tol, func(first int, h [][]float64) error {
			for k := range h {
				if keep {
					r.h[first+k] = append([]float64(nil), h[k]...)
				}
				var m float64
				for _, v := range free {
					m += h[k][v]
				}
				r.mass[first+k] = m
			}
			return nil
		})
		if err != nil {
			return nil, err
		}
		count.LinearSolves += len(r.fixed)
		count.Iterations += stats.Iterations
		r.schur = schur
		all = append(all, r)
	}
	return all, nil
}

// spread writes the answer of one component to the targets less the errors e (by position in r.labels; nil means none).
func (r *responses) spread(target, e, f []float64) {
	at := func(i int) float64 {
		y := target[r.labels[i]]
		if e != nil {
			y -= e[i]
		}
		return y
	}
	// The measures sum to one: differences from the first value keep an offset from costing digits.
	base := at(0)
	for v, x := range r.part.Vertices {
		t := base
		for i := 1; i < len(r.labels); i++ {
			t += float64(r.h[i][v] * (at(i) - base))
		}
		f[x] = t
	}
	for i, v := range r.fixed {
		f[r.part.Vertices[v]] = at(i)
	}
}

// currents gives S y, the current out of each label of the component.
func (r *responses) currents(target []float64) []float64 {
	l := len(r.labels)
	c := make([]float64, l)
	if r.schur == nil {
		return c
	}
	for i := range l {
		for j := range l { // rows of S sum to zero
			if j != i {
				c[i] += float64(r.schur.At(i, j) * (target[r.labels[j]] - target[r.labels[i]]))
			}
		}
	}
	return c
}

// errorsOf gives e_F = S_FF^-1 (S y)_F for the labels in (positions in r.labels), one slice a class, by position in
// in; false where they are all labels of the component, or cut from the others.
func (r *responses) errorsOf(in []int, current [][]float64) ([][]float64, bool) {
	if len(in) == len(r.labels) {
		return nil, false
	}
	e := make([][]float64, len(current))
	if len(in) == 1 {
		i := in[0]
		d := r.schur.At(i, i)
		if !(d > 0) {
			return nil, false
		}
		for c := range e {
			e[c] = []float64{current[c][i] / d}
		}
		return e, true
	}
	block := mat.NewSymDense(len(in), nil)
	for a, i := range in {
		for b := a; b < len(in); b++ {
			block.SetSym(a, b, r.schur.At(i, in[b]))
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(block) {
		return nil, false
	}
	for c := range e {
		b := mat.NewVecDense(len(in), nil)
		for a, i := range in {
			b.SetVec(a, current[c][i])
		}
		var x mat.VecDense
		if err := chol.SolveVecTo(&x, b); err != nil && x.Len() == 0 {
			return nil, false
		}
		e[c] = append([]float64(nil), x.RawVector().Data...)
	}
	return e, true
}

// leaveExact is LeaveOut for p = 2.
func leaveExact(ctx context.Context, p solve.Problem, l Labels, o LeaveOptions, out *LeftOut) error {
	rs, err := respond(ctx, p, l, o, &out.Count)
	if err != nil {
		return err
	}
	return leaveFrom(rs, l, o, out, p.Graph.N)
}

// leaveFrom is leaveExact with the responses at hand.
func leaveFrom(rs []responses, l Labels, o LeaveOptions, out *LeftOut, n int) error {
	classes := len(l.Target)
	current := make([][][]float64, len(rs)) // by component and class
	whole := make([]float64, classes)       // mass of each class with all labels
	for a := range rs {
		r := &rs[a]
		current[a] = make([][]float64, classes)
		for c, t := range l.Target {
			current[a][c] = r.currents(t)
			for i, k := range r.labels {
				whole[c] += float64(r.mass[i] * t[k])
			}
		}
	}
	type place struct{ part, i int }
	where := make([]place, l.Count())
	for a, r := range rs {
		for i, k := range r.labels {
			where[k] = place{a, i}
		}
	}
	var field []float64
	for f, ks := range members(out.Fold, out.Folds) {
		in := make(map[int][]int, 1) // component -> positions
		for _, k := range ks {
			in[where[k].part] = append(in[where[k].part], where[k].i)
		}
		copy(out.Mass[f], whole)
		left := make([][][]float64, len(rs))
		blank := make([]bool, len(rs))
		for a := range rs {
			if in[a] == nil {
				continue
			}
			r := &rs[a]
			e, ok := r.errorsOf(in[a], current[a])
			if !ok {
				blank[a] = true
				for _, i := range in[a] {
					for c := range classes {
						out.Score[r.labels[i]][c] = math.NaN()
					}
				}
				for c, t := range l.Target {
					for i, k := range r.labels {
						out.Mass[f][c] -= float64(r.mass[i] * t[k])
					}
				}
				continue
			}
			left[a] = make([][]float64, classes)
			for c, t := range l.Target {
				full := make([]float64, len(r.labels))
				for b, i := range in[a] {
					full[i] = e[c][b]
					out.Score[r.labels[i]][c] = t[r.labels[i]] - e[c][b]
					out.Mass[f][c] += out.Score[r.labels[i]][c] - float64(r.mass[i]*e[c][b])
				}
				left[a][c] = full
			}
		}
		if o.Field == nil {
			continue
		}
		if field == nil {
			field = make([]float64, n)
		}
		for c, t := range l.Target {
			for v := range field {
				field[v] = math.NaN()
			}
			for a := range rs {
				if blank[a] {
					continue
				}
				var e []float64
				if left[a] != nil {
					e = left[a][c]
				}
				rs[a].spread(t, e, field)
			}
			if err := o.Field(f, c, field); err != nil {
				return err
			}
		}
	}
	return nil
}
