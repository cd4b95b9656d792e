package choose

import (
	"context"
	"errors"
	"math"

	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// LeaveOptions steer LeaveOut. The zero value means the defaults.
type LeaveOptions struct {
	Fold      []int32 // fold of each label, from FoldsOf; nil means one fold a label, or one a group
	Tolerance float64 // of the solves, a share of the label range; 0 means 1e-9
	Workers   int     // 0 means GOMAXPROCS; answers do not depend on it
	// Rough leaves labels out to about 1e-4 of the range where that takes solves, without certificates: far below the
	// noise of a few dozen labels.
	Rough bool
	// Start is the answer with all labels, one slice a class by vertex, from which the solves at p != 2 start; nil
	// means that it is not known.
	Start [][]float64
	// Field, if not nil, is called once for each fold, in the order of folds, and each class, with the answer that
	// the remaining labels give over all vertices (NaN where no label remains). The slice is used again afterwards.
	Field func(fold, class int, f []float64) error
}

// LeftOut holds what each label would have been told by the others.
type LeftOut struct {
	Fold  []int32     // fold of each label
	Folds int         // number of folds
	Score [][]float64 // Score[k][c]: score of class c (or the number, c = 0) at label k without its fold; NaN where no label remains in reach
	Mass  [][]float64 // Mass[fold][c]: sum of class c's scores without the fold, over the free vertices and the fold's own
	Exact bool        // from the Schur complement rather than by solving again
	Count solve.Counts
}

// LeaveOut answers each label by the others. At p = 2 the residuals of a fold F are e_F = S_FF^-1 (S y)_F with S the
// Schur complement of the Laplacian on the labels, so that one factorisation and one solve a label serve all classes
// and any folds; the whole left-out field is f - sum_F e_k h_k. At other p each fold is solved again from Start.
//
// The error says that the labels do not fit the graph, or is the solver's.
func LeaveOut(ctx context.Context, p solve.Problem, l Labels, o LeaveOptions) (*LeftOut, error) {
	if p.Graph == nil {
		return nil, errors.New("there is no graph")
	}
	if err := l.Validate(p.Graph.N); err != nil {
		return nil, err
	}
	if o.Fold == nil {
		o.Fold = FoldsOf(l, l.Count(), 0)
	}
	out := &LeftOut{Fold: o.Fold, Exact: p.P == 2, Score: make([][]float64, l.Count())}
	for _, f := range o.Fold {
		out.Folds = max(out.Folds, int(f)+1)
	}
	for k := range out.Score {
		out.Score[k] = make([]float64, len(l.Target))
	}
	out.Mass = make([][]float64, out.Folds)
	for f := range out.Mass {
		out.Mass[f] = make([]float64, len(l.Target))
	}
	if p.P == 2 && exactly(p.Graph.N, l, o, out.Folds) {
		return out, leaveExact(ctx, p, l, o, out)
	}
	out.Exact = false
	return out, leaveAgain(ctx, p, l, o, out)
}

// exactly says whether the closed form is worth it at p = 2: it takes one solve a label where solving again takes one
// a fold and class, each fold with a set-up of its own, and it holds one field a label where fields are asked for.
func exactly(n int, l Labels, o LeaveOptions, folds int) bool {
	if o.Field != nil && n*l.Count() > 1<<26 {
		return false
	}
	return n <= 5000 || l.Count() <= 4*folds*len(l.Target)
}

// members lists the labels of each fold.
func members(fold []int32, folds int) [][]int {
	m := make([][]int, folds)
	for k, f := range fold {
		m[f] = append(m[f], k)
	}
	return m
}

// Conductances gives w^2 (slope) or w (conductance), divided by the largest, from ln w. Edges too weak for a float64
// keep the smallest normal number, so that what they join stays joined.
func Conductances(g *sparse.CSR, e solve.Energy) *sparse.CSR {
	power := 2.0
	if e == solve.Conductance {
		power = 1
	}
	top := math.Inf(-1)
	for _, a := range g.Val {
		top = max(top, a)
	}
	val := make([]float64, len(g.Val))
	for k, a := range g.Val {
		val[k] = max(math.Exp(power*(a-top)), 0x1p-1000)
	}
	return g.WithValues(val)
}
