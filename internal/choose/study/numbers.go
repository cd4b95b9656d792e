package main

import (
	"context"
	"fmt"
	"io"
	"math"
	"os"

	"pinfill/internal/choose"
	"pinfill/internal/graph"
	"pinfill/internal/parallel"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

var (
	counts   = []int{10, 30, 100}
	numberPs = []float64{6, 2, 3, 4, 8, 16} // the first three are the rule's own candidates
	byP      = []int{1, 2, 3, 0, 4, 5}      // numberPs in increasing order
)

// numberDraw is one draw of labels on one table: RMSE on the unlabelled rows over the spread (standard deviation).
type numberDraw struct {
	yard  float64 // p = 2 on the yardstick's graph
	fixed []float64
	spike []float64
	bulk  []float64
	rule  float64
	ruleP float64
	cost  float64
}

type numberRow struct {
	table string
	count int
	draws []numberDraw
}

type numberStudy struct{ rows []numberRow }

func studyNumbers(ctx context.Context, tables []*table, draws int) (*numberStudy, error) {
	st := &numberStudy{}
	for _, t := range tables {
		s, err := newSpace(ctx, t)
		if err != nil {
			return nil, err
		}
		for _, count := range counts {
			row := numberRow{table: t.name, count: count, draws: make([]numberDraw, draws)}
			errs := make([]error, draws)
			parallel.For(0, draws, 1, func(lo, hi int) {
				for r := lo; r < hi; r++ {
					row.draws[r], errs[r] = s.numberDraw(ctx, count, uint64(r))
				}
			})
			for _, err := range errs {
				if err != nil {
					return nil, fmt.Errorf("%s, %d labels: %w", t.name, count, err)
				}
			}
			st.rows = append(st.rows, row)
			fmt.Fprintf(os.Stderr, "%s, %d: p=2 %.3f, rule %.3f\n", t.name, count,
				row.mean(func(d numberDraw) float64 { return d.yard }), row.mean(func(d numberDraw) float64 { return d.rule }))
		}
	}
	return st, nil
}

func (s *space) numberDraw(ctx context.Context, count int, draw uint64) (numberDraw, error) {
	var d numberDraw
	l := s.atRandom(count, draw)
	g, err := s.network(ctx, choose.DefaultNeighbors, plain, l, graph.Gaussian)
	if err != nil {
		return d, err
	}
	source := func(context.Context, choose.Setting) (*sparse.CSR, error) { return g, nil }
	auto, err := choose.Auto(ctx, source, l, choose.Asked{}, choose.Options{Workers: 1, Scores: true, All: true})
	if err != nil {
		return d, err
	}
	total := 0
	for _, sc := range auto.Scores {
		d.fixed = append(d.fixed, s.rmse(sc.Fields[0], l))
		d.spike, d.bulk = append(d.spike, sc.Spike), append(d.bulk, sc.Bulk)
		total += sc.Count.LinearSolves
	}
	d.rule, d.ruleP = s.rmse(auto.Chosen.Fields[0], l), auto.P
	d.cost = float64(total) / float64(max(solvesOf(auto.Chosen), 1))
	var rest []choose.Setting
	for _, p := range numberPs[len(d.fixed):] {
		rest = append(rest, choose.Setting{P: p, Neighbors: choose.DefaultNeighbors, Bandwidth: plain})
	}
	more, err := choose.Sweep(ctx, source, l, rest, choose.Options{Workers: 1})
	if err != nil {
		return d, err
	}
	for _, sc := range more.Scores {
		d.fixed = append(d.fixed, s.rmse(sc.Fields[0], l))
		d.spike, d.bulk = append(d.spike, sc.Spike), append(d.bulk, sc.Bulk)
	}
	f, _, err := choose.Solve(ctx, solve.Problem{Graph: g, P: 2}, l, nil, solve.Settings{Workers: 1})
	if err != nil {
		return d, err
	}
	d.yard = s.rmse(f[0], l)
	return d, nil
}

// rmse is the root mean square error on the unlabelled vertices over the standard deviation of all.
func (s *space) rmse(f []float64, l choose.Labels) float64 {
	held := make([]bool, s.n)
	for _, v := range l.Vertex {
		held[v] = true
	}
	mean := meanOf(s.value)
	var e, all float64
	free := 0
	for v, y := range s.value {
		all += (y - mean) * (y - mean)
		if !held[v] {
			e += (f[v] - y) * (f[v] - y)
			free++
		}
	}
	return math.Sqrt(e / float64(free) / (all / float64(s.n)))
}

func (r *numberRow) mean(of func(numberDraw) float64) float64 {
	var t float64
	for _, d := range r.draws {
		t += of(d)
	}
	return t / float64(len(r.draws))
}

func (r *numberRow) best() float64 {
	best := math.Inf(1)
	for i := range numberPs {
		best = min(best, r.mean(func(d numberDraw) float64 { return d.fixed[i] }))
	}
	return best
}

func (st *numberStudy) write(w io.Writer) {
	fmt.Fprintf(w, "### Numbers: RMSE on the unlabelled rows over the spread\n\n| table | labels |")
	for _, i := range byP {
		fmt.Fprintf(w, " p=%s |", pText(numberPs[i]))
	}
	fmt.Fprintf(w, " rule | rule over best fixed p | moved |\n|---|---|%s---|---|---|\n", repeat("---|", len(byP)))
	moved := func(d numberDraw) float64 {
		if d.ruleP != choose.DefaultNumberP {
			return 1
		}
		return 0
	}
	ruleOf := func(d numberDraw) float64 { return d.rule }
	var ratios, toTwo []float64
	for i := range st.rows {
		r := &st.rows[i]
		fmt.Fprintf(w, "| %s | %d |", r.table, r.count)
		for _, k := range byP {
			fmt.Fprintf(w, " %.3f |", r.mean(func(d numberDraw) float64 { return d.fixed[k] }))
		}
		ratio := r.mean(ruleOf) / r.best()
		ratios, toTwo = append(ratios, ratio), append(toTwo, r.mean(ruleOf)/r.mean(func(d numberDraw) float64 { return d.yard }))
		fmt.Fprintf(w, " **%.3f** | %.3f | %.2f |\n", r.mean(ruleOf), ratio, r.mean(moved))
	}
	var worst float64
	for _, r := range ratios {
		worst = max(worst, r)
	}
	fmt.Fprintf(w, "\nThe rule's RMSE is %.3f times the best fixed p's on average, %.3f at worst, and %.3f times that of p = 2. Choosing took %.1f times the linear solves of the chosen setting alone.\n\n",
		meanOf(ratios), worst, meanOf(toTwo), st.meanCost())
	st.writeDegeneracy(w)
}

func (st *numberStudy) meanCost() float64 {
	var v []float64
	for i := range st.rows {
		v = append(v, st.rows[i].mean(func(d numberDraw) float64 { return d.cost }))
	}
	return meanOf(v)
}

// writeDegeneracy sets the degeneracy numbers of each single solution against how much worse it is than the best p.
func (st *numberStudy) writeDegeneracy(w io.Writer) {
	fmt.Fprintf(w, "### Degeneracy against loss\n\nEach solution at each p, by its spikiness: how much larger its RMSE is than the best p's on the same draw.\n\n| spikiness S | solutions | median loss | lost more than a tenth |\n|---|---|---|---|\n")
	cuts := []float64{0, .1, .2, .3, .4, .5, .6, .7, 1.01}
	for c := range len(cuts) - 1 {
		var loss []float64
		bad := 0
		for _, r := range st.rows {
			for _, d := range r.draws {
				best := math.Inf(1)
				for _, e := range d.fixed {
					best = min(best, e)
				}
				for i, s := range d.spike {
					if s >= cuts[c] && s < cuts[c+1] {
						loss = append(loss, d.fixed[i]/best-1)
						if d.fixed[i] > 1.1*best {
							bad++
						}
					}
				}
			}
		}
		if len(loss) > 0 {
			fmt.Fprintf(w, "| %.1f to %.1f | %d | %.3f | %.2f |\n", cuts[c], min(cuts[c+1], 1), len(loss), medianOf(loss), float64(bad)/float64(len(loss)))
		}
	}
	fmt.Fprintln(w)
}
