package choose

import (
	"context"
	"math"
	"slices"

	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// Score is one setting tried.
type Score struct {
	Setting
	Advised bool
	// Error is the left-out error: the share of labels decided wrong, or the root mean square of the residuals; NaN
	// where no label was left out. StdError is its standard error.
	Error, StdError float64
	LogLoss         float64 // mean -ln of the balanced share of the right class, floored at 1e-3; NaN for numbers
	LeftOut         int     // labels that were left out and answered
	Degeneracy
	Shares      []float64 // share of the unlabelled vertices decided for each class; nil for numbers
	Weights     Weights   // nil for numbers
	Certificate solve.Certificate
	Certified   bool // every solve met its tolerance
	Count       solve.Counts
	Fields      [][]float64    // the solution, class by vertex
	Solves      []solve.Result // certificates behind Fields, one a component and class in that order, without values
	Loss        []float64      // by label: 0 or 1, or the squared residual; NaN where not answered
	left        *LeftOut
}

// Left gives the left-out answers behind Error, nil where labels were not left out.
func (s *Score) Left() *LeftOut { return s.left }

// trial is what scoring needs besides a setting.
type trial struct {
	graph   *sparse.CSR
	energy  solve.Energy
	labels  Labels
	fold    []int32 // nil: leave nothing out
	solve   solve.Settings
	measure bool
}

// score solves a setting from start (or nil) and scores it.
func (t *trial) score(ctx context.Context, s Setting, start [][]float64) (*Score, error) {
	sc := &Score{Setting: s, Error: math.NaN(), StdError: math.NaN(), LogLoss: math.NaN(), Certified: true}
	p := solve.Problem{Graph: t.graph, P: s.P, Energy: t.energy}
	fields, results, err := Solve(ctx, p, t.labels, start, t.solve)
	if err != nil {
		return nil, err
	}
	nan := math.NaN()
	sc.Fields, sc.Certificate = fields, solve.Certificate{Gap: nan, Imbalance: nan, Width: nan, SlopeImbalance: nan}
	for _, r := range results {
		r.Values = nil
		sc.Solves = append(sc.Solves, r)
		sc.Count = addCounts(sc.Count, r.Counts)
		sc.Certificate = worse(sc.Certificate, r.Certificate)
		sc.Certified = sc.Certified && (r.Status == solve.Certified || r.Status == solve.Trivial)
	}
	if t.measure {
		sc.Degeneracy = Measure(p, t.labels, fields)
	}
	if t.labels.Task == Classes {
		if sc.Weights, err = s.Balance.Weigh(p, fields, t.labels, t.solve.Workers); err != nil {
			return nil, err
		}
		sc.Shares = decidedShares(fields, sc.Weights, t.labels)
	}
	if t.fold != nil {
		o := LeaveOptions{Fold: t.fold, Tolerance: t.solve.Tolerance, Workers: t.solve.Workers, Start: fields, Rough: true}
		if sc.left, err = LeaveOut(ctx, p, t.labels, o); err != nil {
			return nil, err
		}
		sc.Count = addCounts(sc.Count, sc.left.Count)
		sc.judge(t.labels)
	}
	return sc, nil
}

// decidedShares counts the decisions of the free vertices.
func decidedShares(fields [][]float64, w Weights, l Labels) []float64 {
	n := make([]float64, len(fields))
	var all float64
	for _, v := range freeOf(fields, l) {
		if c := w.Decide(func(c int) float64 { return fields[c][v] }); c >= 0 {
			n[c]++
			all++
		}
	}
	for c := range n {
		n[c] /= max(all, 1)
	}
	return n
}

// judge turns left-out answers into losses.
func (s *Score) judge(l Labels) {
	s.Loss = make([]float64, l.Count())
	var logs float64
	var all []float64
	for k := range s.Loss {
		score := s.left.Score[k]
		s.Loss[k] = math.NaN()
		if math.IsNaN(score[0]) {
			continue
		}
		if l.Task == Numbers {
			e := score[0] - l.Target[0][k]
			s.Loss[k] = e * e
		} else {
			w := LeftWeights(s.left, int(s.left.Fold[k]), s.Balance, l)
			at := func(c int) float64 { return score[c] }
			own := l.Class(k)
			s.Loss[k] = 1
			if w.Decide(at) == own {
				s.Loss[k] = 0
			}
			logs -= math.Log(max(w.Shares(nil, at)[own], 1e-3))
		}
		all = append(all, s.Loss[k])
	}
	s.LeftOut = len(all)
	if s.LeftOut == 0 {
		return
	}
	m := mean(all)
	var v float64
	for _, x := range all {
		v += float64((x - m) * (x - m))
	}
	n := float64(len(all))
	se := math.Sqrt(v / max(n-1, 1) / n)
	s.Error, s.StdError = m, se
	if l.Task == Classes {
		s.LogLoss = logs / n
		return
	}
	s.Error = math.Sqrt(m)
	s.StdError = 0
	if m > 0 {
		s.StdError = se / (2 * s.Error) // by the derivative of the root
	}
}

// LeftWeights are the class weights of a fold's left-out answer: mass normalisation with the masses that the remaining
// labels give. AutoBalance counts as FromLabels here: the cut of every fold would cost a solve's worth each.
func LeftWeights(left *LeftOut, fold int, b Balance, l Labels) Weights {
	switch b.Mode {
	case NoBalance:
		return equalWeights(len(l.Target))
	case AutoBalance:
		b.Mode = FromLabels
	}
	return massWeights(left.Mass[fold], b.shares(l.PerClass()))
}

// LeftOutWeights are, by fold, the class weights that an answer without the fold would have had: the weights of the
// whole answer, moved as mass normalisation moves when the fold is left out. The shares it aims at do not count the
// labels left out; with them counted, left-out answers lean to the right class and sets of classes come out too small.
func (s *Score) LeftOutWeights(l Labels) []Weights {
	out := make([]Weights, s.left.Folds)
	b := s.Balance
	if b.Mode == AutoBalance {
		b.Mode = FromLabels
	}
	whole := massWeights(masses(s.Fields, l), b.shares(l.PerClass()))
	for f, ks := range members(s.left.Fold, s.left.Folds) {
		out[f] = slices.Clone(s.Weights)
		if b.Mode == NoBalance {
			continue
		}
		part := massWeights(s.left.Mass[f], b.shares(l.without(ks).PerClass()))
		for c := range out[f] {
			out[f][c] *= part[c] / whole[c]
		}
	}
	return out
}
