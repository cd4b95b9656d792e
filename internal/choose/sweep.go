package choose

import (
	"cmp"
	"context"
	"math"
	"slices"

	"pinfill/internal/solve"
)

// Comparison is what Sweep found: one score a setting, in the order asked, and how far each two agree.
type Comparison struct {
	Scores []*Score
	// Agreement[i][j] is the share of unlabelled vertices that settings i and j give the same class; for numbers, one
	// less the root mean square of their difference over the range of the labels.
	Agreement [][]float64
}

// Sweep scores every setting. Settings with one graph share it, and each p starts from the solution of the p before it
// on the way from 2, so that all of them cost a small multiple of one. Labels are left out in folds, as Auto does,
// where there are enough of them; p = 2 needs no solve for that.
//
// The error is the source's, the solver's, or says that the labels do not fit the graph.
func Sweep(ctx context.Context, source Source, l Labels, settings []Setting, o Options) (*Comparison, error) {
	c := &Comparison{Scores: make([]*Score, len(settings))}
	var fold []int32
	if speak, _ := speaking(l); speak && o.Scores {
		fold = FoldsOf(l, foldCount, o.Seed)
	}
	t := trial{energy: o.Energy, labels: l, fold: fold, solve: solve.Settings{Tolerance: o.Tolerance, Workers: o.Workers}, measure: true}
	visited := make([]bool, len(settings))
	done := 0
	for i, s := range settings {
		if visited[i] {
			continue
		}
		var same []int
		wanted := false
		for j := i; j < len(settings); j++ {
			if !visited[j] && s.sameGraph(settings[j]) {
				same, visited[j] = append(same, j), true
				wanted = wanted || o.wants(j)
			}
		}
		if !wanted {
			continue
		}
		var err error
		if t.graph, err = source(ctx, s); err != nil {
			return nil, err
		}
		if err := l.Validate(t.graph.N); err != nil {
			return nil, err
		}
		for _, path := range paths(settings, same) {
			for len(path) > 0 && !o.wants(path[len(path)-1]) {
				path = path[:len(path)-1]
			}
			var start [][]float64
			for _, j := range path {
				// p = inf is solved exactly, from nothing.
				from := start
				if math.IsInf(settings[j].P, 1) {
					from = nil
				}
				if !o.wants(j) { // on the way to one that is
					p := solve.Problem{Graph: t.graph, P: settings[j].P, Energy: t.energy}
					if start, _, err = Solve(ctx, p, l, from, t.solve); err != nil {
						return nil, err
					}
					continue
				}
				sc, err := t.score(ctx, settings[j], from)
				if err != nil {
					return nil, err
				}
				c.Scores[j], start = sc, sc.Fields
				done++
				if o.Progress != nil {
					o.Progress(float64(done) / float64(len(settings)))
				}
			}
		}
	}
	if o.Want == nil {
		c.agree(l)
	}
	return c, nil
}

func (o Options) wants(i int) bool { return o.Want == nil || o.Want[i] }

// paths orders settings of one graph by the way p is approached: from 2 upwards, and from below 2 downwards.
func paths(settings []Setting, of []int) [][]int {
	var up, down []int
	for _, j := range of {
		if settings[j].P >= 2 {
			up = append(up, j)
		} else {
			down = append(down, j)
		}
	}
	slices.SortStableFunc(up, func(a, b int) int { return cmp.Compare(settings[a].P, settings[b].P) })
	slices.SortStableFunc(down, func(a, b int) int { return cmp.Compare(settings[b].P, settings[a].P) })
	return [][]int{up, down}
}

// agree fills the agreement of each pair.
func (c *Comparison) agree(l Labels) {
	answers := make([]Answers, len(c.Scores))
	for i, s := range c.Scores {
		answers[i] = s.Answers(l)
	}
	c.Agreement = Agreement(answers, l)
}
