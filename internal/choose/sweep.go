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
	done := 0
	for i, s := range settings {
		if c.Scores[i] != nil {
			continue
		}
		var err error
		if t.graph, err = source(ctx, s); err != nil {
			return nil, err
		}
		if err := l.Validate(t.graph.N); err != nil {
			return nil, err
		}
		var same []int
		for j := i; j < len(settings); j++ {
			if c.Scores[j] == nil && s.sameGraph(settings[j]) {
				same = append(same, j)
			}
		}
		for _, path := range paths(settings, same) {
			var start [][]float64
			for _, j := range path {
				// p = inf is solved exactly, from nothing.
				from := start
				if math.IsInf(settings[j].P, 1) {
					from = nil
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
	c.agree(l)
	return c, nil
}

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
	n := len(c.Scores)
	c.Agreement = make([][]float64, n)
	for i := range c.Agreement {
		c.Agreement[i] = make([]float64, n)
		c.Agreement[i][i] = 1
	}
	if l.Task == Numbers {
		size := slices.Max(l.Target[0]) - slices.Min(l.Target[0])
		for i := range n {
			for j := range i {
				a := numbersAgree(c.Scores[i].Fields[0], c.Scores[j].Fields[0], l, size)
				c.Agreement[i][j], c.Agreement[j][i] = a, a
			}
		}
		return
	}
	decided := make([][]int, n)
	for i, s := range c.Scores {
		for _, v := range freeOf(s.Fields, l) {
			decided[i] = append(decided[i], s.Weights.Decide(func(c int) float64 { return s.Fields[c][v] }))
		}
	}
	for i := range n {
		for j := range i {
			if len(decided[i]) != len(decided[j]) || len(decided[i]) == 0 {
				c.Agreement[i][j], c.Agreement[j][i] = math.NaN(), math.NaN()
				continue
			}
			same := 0
			for k := range decided[i] {
				if decided[i][k] == decided[j][k] {
					same++
				}
			}
			a := float64(same) / float64(len(decided[i]))
			c.Agreement[i][j], c.Agreement[j][i] = a, a
		}
	}
}

func numbersAgree(f, g []float64, l Labels, size float64) float64 {
	held := make([]bool, len(f))
	for _, v := range l.Vertex {
		held[v] = true
	}
	var s float64
	n := 0
	for v := range f {
		if !held[v] && !math.IsNaN(f[v]) && !math.IsNaN(g[v]) {
			s += (f[v] - g[v]) * (f[v] - g[v])
			n++
		}
	}
	if n == 0 || !(size > 0) {
		return math.NaN()
	}
	return 1 - math.Sqrt(s/float64(n))/size
}
