package choose

import (
	"context"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// Options steer Auto and Sweep. The zero value means the defaults.
type Options struct {
	Energy    solve.Energy
	Tolerance float64 // of the solves; 0 means the solver's
	Workers   int     // 0 means GOMAXPROCS; answers do not depend on it
	Seed      uint64  // of the folds
	Progress  func(share float64)
	// Scores asks for left-out scores even where there is nothing to choose.
	Scores bool
	// All makes Auto solve every candidate even where labels are too few to compare them.
	All bool
	// Want marks the settings that Sweep scores; others are solved only where a wanted one starts from them, so that
	// the scores of parts of a sweep are those of the whole. nil means all.
	Want []bool
}

// Decision is what Auto chose.
type Decision struct {
	Setting
	Chosen   *Score   // the score of Setting, its Fields a solution ready to use
	Scores   []*Score // every setting tried, in order
	Reason   string   // one sentence
	Warnings []string // what a user should know or change
}

const (
	foldCount = 5
	// fewLabels: with fewer labels in a class, leaving one out says next to nothing of how a setting does with all.
	fewLabels = 3
	// enoughNumbers is the same for numbers.
	enoughNumbers = 10
	// A setting must beat the default by this many standard errors of the paired difference. Left-out classes are
	// right or wrong, and the settings tried are within a point or two of each other: at one standard error the
	// study's tables lost half a point by moving.
	classMargin  = 2
	numberMargin = 1
	// largeWork is the number of stored edges times classes above which Auto tries no second setting, and takes p = 2 for
	// classes: there a solve at p = 1.7 takes tens of times as long.
	largeWork = 20_000_000
)

// Folds is the number of folds that labels are left out in: fewer on large graphs, where each costs a solve of its own.
func Folds(g *sparse.CSR, classes int) int {
	if g.NNZ()*classes > largeWork/4 {
		return 3
	}
	return foldCount
}

// Auto chooses the setting. The first setting of Asked, or the study's default, stands unless leave-out shows another
// to be better by more than the noise of the paired difference; where labels are too few to say, or a
// setting cannot be certified, the next one that can stands instead. The cost is that of a few solves: one for each
// setting tried and, but for p = 2, the folds, warm from it.
//
// The error is the source's, the solver's, or says that the labels do not fit the graph.
func Auto(ctx context.Context, source Source, l Labels, a Asked, o Options) (*Decision, error) {
	all := a.Settings(l.Task)
	d := &Decision{}
	speak, why := speaking(l)
	var fold []int32
	if speak && (len(all) > 1 || o.Scores) {
		fold = FoldsOf(l, foldCount, o.Seed)
	}
	fixed := len(all) == 1
	if fold == nil && !o.All {
		if len(a.P) == 0 && len(all) == len(classPs) {
			all = all[:2] // the default, and p = 2 to fall back on
		}
	}
	t := trial{energy: o.Energy, labels: l, fold: fold, solve: solve.Settings{Tolerance: o.Tolerance, Workers: o.Workers}, measure: true}
	var first error
	single := false // the table is too large for more than one setting
	even := false   // the rows lie without gaps
	for i := 0; i < len(all); i++ {
		s := all[i]
		if t.fold == nil && !o.All && len(d.Scores) > 0 && d.Scores[0].Certified {
			break // nothing to compare: the first that holds stands
		}
		if t.graph == nil || !s.sameGraph(all[i-1]) {
			var err error
			if t.graph, err = source(ctx, s); err != nil {
				return nil, err
			}
		}
		if err := l.Validate(t.graph.N); err != nil {
			return nil, err
		}
		if i == 0 && !fixed && t.graph.NNZ()*len(l.Target) > largeWork {
			why = "the table is too large to try several settings by default"
			if len(a.P) == 0 && l.Task == Classes {
				all = withP(all, 2)
				s = all[0]
				why += ", and p=2 solves fastest"
			}
			all, single = all[:1], true
			if !o.Scores {
				t.fold = nil
			}
		}
		if i == 0 && !single && l.Task == Classes && len(a.P) == 0 {
			c, err := contrast(ctx, source, s)
			if err != nil {
				return nil, err
			}
			if c < evenBelow {
				even = true
				all = evenly(all)
				s = all[0]
			}
		}
		if t.fold != nil {
			t.fold = FoldsOf(l, Folds(t.graph, len(l.Target)), o.Seed)
		}
		sc, err := t.score(ctx, s, nil)
		if err != nil {
			if fixed || ctx.Err() != nil {
				return nil, err
			}
			if first == nil {
				first = err
			}
			d.Warnings = append(d.Warnings, fmt.Sprintf("%s could not be solved on this graph and was passed over: %v", s.describe(all), err))
			continue
		}
		d.Scores = append(d.Scores, sc)
		if o.Progress != nil {
			o.Progress(float64(i+1) / float64(len(all)))
		}
	}
	if len(d.Scores) == 0 {
		return nil, first
	}
	d.settle(l, all, t.fold != nil && !single, fixed, even, why)
	return d, nil
}

// evenly puts p = 2 first, and takes mass normalisation for the balance that looks for gaps: where rows lie evenly there
// are none for a boundary to follow.
func evenly(all []Setting) []Setting {
	some := slices.Clone(all)
	slices.SortStableFunc(some, func(s, t Setting) int {
		two := func(s Setting) int {
			if s.P == 2 {
				return 0
			}
			return 1
		}
		if !s.sameGraph(t) {
			return 0
		}
		return two(s) - two(t)
	})
	for i := range some {
		if some[i].Balance.Mode == AutoBalance {
			some[i].Balance.Mode = FromLabels
		}
	}
	return some
}

// withP keeps the settings at one p; with none there, all of them.
func withP(all []Setting, p float64) []Setting {
	var some []Setting
	for _, s := range all {
		if s.P == p {
			some = append(some, s)
		}
	}
	if len(some) == 0 {
		return all
	}
	return some
}

// speaking says whether there are labels enough to leave some out, or why not.
func speaking(l Labels) (bool, string) {
	units := map[int32]bool{}
	for k := range l.Vertex {
		if l.Group != nil {
			units[l.Group[k]] = true
		} else {
			units[int32(k)] = true
		}
	}
	if l.Task == Numbers {
		if len(units) < enoughNumbers {
			return false, fmt.Sprintf("%d labels (or groups) are too few to leave some out", len(units))
		}
		return true, ""
	}
	present, thin := 0, 0
	for _, n := range l.PerClass() {
		if n > 0 {
			present++
		}
		if n > 0 && n < fewLabels {
			thin++
		}
	}
	switch {
	case present < 2:
		return false, "there is one class"
	case 2*thin > present || len(units) < 2*present:
		return false, fmt.Sprintf("most classes have fewer than %d labels (or groups), too few to leave some out", fewLabels)
	}
	return true, ""
}

// Advise gives the setting to use among scores of one table, and the one it is measured against: the first certified
// one at the default p, or the first certified. Another is better where its left-out loss is lower by more than the
// noise of the paired difference allows. Scores without left-out losses only fall back.
func Advise(scores []*Score, task Task) (best, first int) {
	if task == Numbers {
		return advise(scores, task, DefaultNumberP)
	}
	return advise(scores, task, DefaultClassP)
}

// advise is Advise with the p to measure against.
func advise(scores []*Score, task Task, def float64) (best, first int) {
	first = -1
	margin := float64(classMargin)
	if task == Numbers {
		margin = numberMargin
	}
	for i, s := range scores {
		if s.Certified && (first < 0 || s.P == def && scores[first].P != def) {
			first = i
		}
	}
	first = max(first, 0)
	best = first
	var gain float64
	for i, s := range scores {
		if i == first || !s.Certified || s.Loss == nil || scores[first].Loss == nil {
			continue
		}
		g, e := paired(scores[first].Loss, s.Loss)
		if g > margin*e && g > gain {
			best, gain = i, g
		}
	}
	return best, first
}

// settle picks among the scores.
func (d *Decision) settle(l Labels, all []Setting, compared, fixed, even bool, why string) {
	best, first := advise(d.Scores, l.Task, d.Scores[0].P)
	skipped := first != 0
	c := d.Scores[best]
	c.Advised = true
	d.Setting, d.Chosen = c.Setting, c
	name := c.describe(all)
	kind := taskText(l.Task)
	if even {
		kind += " on rows that lie without gaps"
	}
	unit := "left-out error"
	if l.Task == Numbers {
		unit = "left-out RMSE"
	}
	switch {
	case fixed:
		d.Reason = name + ": as asked"
	case best != first:
		d.Reason = fmt.Sprintf("%s: its %s is %.3g against %.3g of %s, more than the noise of %d labels",
			name, unit, c.Error, d.Scores[first].Error, d.Scores[first].describe(all), c.LeftOut)
	case compared:
		d.Reason = fmt.Sprintf("%s: the default for %s; no other setting tried has a %s better than %.3g by more than the noise of %d labels",
			name, kind, unit, c.Error, c.LeftOut)
	default:
		d.Reason = fmt.Sprintf("%s: the default for %s; %s", name, kind, why)
	}
	if skipped && !fixed && d.Scores[0] != c {
		d.Warnings = append(d.Warnings, fmt.Sprintf("%s could not be certified on this graph and was passed over", d.Scores[0].describe(all)))
	}
	d.Warnings = append(d.Warnings, c.alarms(l)...)
}

// paired gives the mean of a less b over the labels that both answer, and its standard error.
func paired(a, b []float64) (gain, stdError float64) {
	var diff []float64
	for k := range a {
		if !math.IsNaN(a[k]) && !math.IsNaN(b[k]) {
			diff = append(diff, a[k]-b[k])
		}
	}
	if len(diff) < 2 {
		return 0, math.Inf(1)
	}
	m := mean(diff)
	var v float64
	for _, x := range diff {
		v += float64((x - m) * (x - m))
	}
	n := float64(len(diff))
	return m, math.Sqrt(v / (n - 1) / n)
}

func taskText(t Task) string {
	if t == Numbers {
		return "numbers"
	}
	return "classes"
}
