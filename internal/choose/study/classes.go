package main

import (
	"context"
	"fmt"
	"io"
	"math"
	"os"
	"slices"

	"pinfill/internal/choose"
	"pinfill/internal/graph"
	"pinfill/internal/parallel"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

var (
	rates   = []int{1, 2, 5, 10}                   // labels a class
	classPs = []float64{1.7, 2, 3, 6, math.Inf(1)} // the first three are the rule's own candidates
	local   = graph.Bandwidth{Local: true, H: 0.7} // the rule's default for classes
	plain   = graph.Bandwidth{Local: true, H: 1}   // the yardstick's
)

// classDraw is one draw of labels on one table: accuracies on the unlabelled rows.
type classDraw struct {
	yard       float64
	fixed      []float64 // by classPs, default balance
	none, mass []float64 // by classPs[:3]: other balances
	rule       float64
	moved      bool    // off the first candidate
	cost       float64 // linear solves of the rule over those of the setting it chose
	missed     int     // solves not certified
}

// classRow is the mean over draws.
type classRow struct {
	table string
	rate  int
	draws []classDraw
}

type classStudy struct{ rows []classRow }

func studyClasses(ctx context.Context, tables []*table, draws, large int) (*classStudy, error) {
	st := &classStudy{}
	for _, t := range tables {
		s, err := newSpace(ctx, t)
		if err != nil {
			return nil, err
		}
		n := draws
		if s.n > 1000 {
			n = min(n, large)
		}
		for _, rate := range rates {
			row := classRow{table: t.name, rate: rate, draws: make([]classDraw, n)}
			errs := make([]error, n)
			parallel.For(0, n, 1, func(lo, hi int) {
				for r := lo; r < hi; r++ {
					row.draws[r], errs[r] = s.classDraw(ctx, rate, uint64(r))
				}
			})
			for _, err := range errs {
				if err != nil {
					return nil, fmt.Errorf("%s, %d labels a class: %w", t.name, rate, err)
				}
			}
			st.rows = append(st.rows, row)
			fmt.Fprintf(os.Stderr, "%s, %d: yardstick %.3f, rule %.3f\n", t.name, rate, row.mean(yardOf), row.mean(ruleOf))
		}
	}
	return st, nil
}

func (s *space) classDraw(ctx context.Context, rate int, draw uint64) (classDraw, error) {
	var d classDraw
	l := s.perClass(rate, draw)
	g, err := s.network(ctx, 10, plain, l, graph.Gaussian)
	if err != nil {
		return d, err
	}
	if d.yard, err = s.yardstick(ctx, g, l); err != nil {
		return d, err
	}
	if g, err = s.network(ctx, choose.DefaultNeighbors, local, l, graph.Gaussian); err != nil {
		return d, err
	}
	source := func(ctx context.Context, st choose.Setting) (*sparse.CSR, error) {
		if st.Kernel == graph.Gaussian {
			return g, nil
		}
		return s.network(ctx, st.Neighbors, st.Bandwidth, l, st.Kernel)
	}
	o := choose.Options{Workers: 1, Scores: true, All: true}
	auto, err := choose.Auto(ctx, source, l, choose.Asked{}, o)
	if err != nil {
		return d, err
	}
	var all choose.Score
	own := len(auto.Scores)
	d.fixed, d.mass, d.none = make([]float64, own), make([]float64, own), make([]float64, own)
	for _, sc := range auto.Scores {
		at := slices.Index(classPs, sc.P)
		d.fixed[at] = s.accuracy(sc.Fields, sc.Weights, l)
		mass, err := choose.Balance{Mode: choose.Uniform}.Mass(sc.Fields, l)
		if err != nil {
			return d, err
		}
		d.mass[at] = s.accuracy(sc.Fields, mass, l)
		even := make(choose.Weights, len(l.Target))
		for c := range even {
			even[c] = 1
		}
		d.none[at] = s.accuracy(sc.Fields, even, l)
		if !sc.Certified {
			d.missed++
		}
		all.Count.LinearSolves += sc.Count.LinearSolves
	}
	d.rule, d.moved = s.accuracy(auto.Chosen.Fields, auto.Chosen.Weights, l), auto.Chosen != auto.Scores[0]
	d.cost = float64(all.Count.LinearSolves) / float64(max(solvesOf(auto.Chosen), 1))
	var rest []choose.Setting
	for _, p := range classPs[len(d.fixed):] {
		rest = append(rest, choose.Setting{P: p, Neighbors: choose.DefaultNeighbors, Bandwidth: local, Balance: auto.Balance})
	}
	more, err := choose.Sweep(ctx, source, l, rest, choose.Options{Workers: 1})
	if err != nil {
		return d, err
	}
	for _, sc := range more.Scores {
		d.fixed = append(d.fixed, s.accuracy(sc.Fields, sc.Weights, l))
	}
	return d, nil
}

// solvesOf is the linear solves of the chosen setting alone, without its folds.
func solvesOf(sc *choose.Score) int {
	n := sc.Count.LinearSolves
	if left := sc.Left(); left != nil {
		n -= left.Count.LinearSolves
	}
	return n
}

// yardstick is what a hand-written linear solve does: conductances exp(-d^2/(s_i s_j)) on the 10-nearest graph, the
// harmonic solution, class-mass normalisation to equal shares.
func (s *space) yardstick(ctx context.Context, g *sparse.CSR, l choose.Labels) (float64, error) {
	fields, _, err := choose.Solve(ctx, solve.Problem{Graph: g, P: 2}, l, nil, solve.Settings{Workers: 1})
	if err != nil {
		return 0, err
	}
	w, err := choose.Balance{Mode: choose.Uniform}.Mass(fields, l)
	if err != nil {
		return 0, err
	}
	return s.accuracy(fields, w, l), nil
}

func yardOf(d classDraw) float64 { return d.yard }
func ruleOf(d classDraw) float64 { return d.rule }

func (r *classRow) mean(of func(classDraw) float64) float64 {
	var t float64
	for _, d := range r.draws {
		t += of(d)
	}
	return t / float64(len(r.draws))
}

// best is the best fixed p in hindsight for the table and rate.
func (r *classRow) best() (acc float64, p float64) {
	for i := range classPs {
		if a := r.mean(func(d classDraw) float64 { return d.fixed[i] }); a > acc {
			acc, p = a, classPs[i]
		}
	}
	return acc, p
}

func (st *classStudy) write(w io.Writer) {
	fmt.Fprintf(w, "### Classes: accuracy on the unlabelled rows\n\n| table | labels a class | yardstick |")
	for _, p := range classPs {
		fmt.Fprintf(w, " p=%s |", pText(p))
	}
	fmt.Fprintf(w, " rule | rule less yardstick | best fixed p less rule |\n|---|---|---|%s---|---|---|\n", repeat("---|", len(classPs)))
	for i := range st.rows {
		r := &st.rows[i]
		best, _ := r.best()
		fmt.Fprintf(w, "| %s | %d | %.3f |", r.table, r.rate, r.mean(yardOf))
		for k := range classPs {
			fmt.Fprintf(w, " %.3f |", r.mean(func(d classDraw) float64 { return d.fixed[k] }))
		}
		rule := r.mean(ruleOf)
		fmt.Fprintf(w, " **%.3f** | %+.3f | %.3f |\n", rule, rule-r.mean(yardOf), best-rule)
	}
	fmt.Fprintf(w, "\nMeans over the tables:\n\n| labels a class | yardstick |")
	for _, p := range classPs {
		fmt.Fprintf(w, " p=%s |", pText(p))
	}
	fmt.Fprintf(w, " rule | p=1.7, scores as they are | p=1.7, mass | p=2, scores as they are | p=2, mass | regret | moved |\n|---|---|%s---|---|---|---|---|---|---|\n", repeat("---|", len(classPs)))
	for _, rate := range append([]int{0}, rates...) {
		name := fmt.Sprint(rate)
		if rate == 0 {
			name = "all"
		}
		fmt.Fprintf(w, "| %s | %.4f |", name, st.over(rate, func(r *classRow) float64 { return r.mean(yardOf) }))
		for k := range classPs {
			fmt.Fprintf(w, " %.4f |", st.over(rate, func(r *classRow) float64 { return r.mean(func(d classDraw) float64 { return d.fixed[k] }) }))
		}
		each := func(of func(classDraw) float64) float64 {
			return st.over(rate, func(r *classRow) float64 { return r.mean(of) })
		}
		fmt.Fprintf(w, " **%.4f** | %.4f | %.4f | %.4f | %.4f | %.4f | %.2f |\n", each(ruleOf),
			each(func(d classDraw) float64 { return d.none[0] }), each(func(d classDraw) float64 { return d.mass[0] }),
			each(func(d classDraw) float64 { return d.none[1] }), each(func(d classDraw) float64 { return d.mass[1] }),
			st.over(rate, func(r *classRow) float64 { b, _ := r.best(); return b - r.mean(ruleOf) }),
			each(func(d classDraw) float64 {
				if d.moved {
					return 1
				}
				return 0
			}))
	}
	worst, name := 1.0, ""
	byTable := map[string][]float64{}
	var order []string
	for i := range st.rows {
		r := &st.rows[i]
		if byTable[r.table] == nil {
			order = append(order, r.table)
		}
		byTable[r.table] = append(byTable[r.table], r.mean(ruleOf)-r.mean(yardOf))
	}
	for _, t := range order {
		if m := meanOf(byTable[t]); m < worst {
			worst, name = m, t
		}
	}
	var missed, solved int
	for _, r := range st.rows {
		for _, d := range r.draws {
			missed += d.missed
			solved += 3
		}
	}
	fmt.Fprintf(w, "\nThe table on which the rule does worst against the yardstick, its rates together: %s, %+.3f. Of %d solutions at p = 1.7, 2 and 3, %d missed their certificate. Choosing by leave-out took %.1f times the linear solves of the chosen setting alone on average, at the rates where labels are left out.\n\n",
		name, worst, solved, missed, st.overRates([]int{5, 10}, func(r *classRow) float64 { return r.mean(func(d classDraw) float64 { return d.cost }) }))
}

// over is a mean over the tables at one rate, or at all for rate 0.
func (st *classStudy) over(rate int, of func(*classRow) float64) float64 {
	if rate == 0 {
		return st.overRates(rates, of)
	}
	return st.overRates([]int{rate}, of)
}

func (st *classStudy) overRates(rs []int, of func(*classRow) float64) float64 {
	var v []float64
	for i := range st.rows {
		for _, rate := range rs {
			if st.rows[i].rate == rate {
				v = append(v, of(&st.rows[i]))
			}
		}
	}
	return meanOf(v)
}
