package job

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/extend"
	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/points"
	"pinfill/internal/solve"
	"pinfill/internal/table"
)

// recheck keeps a seeded sample of new rows and solves again with them in the graph.
type recheck struct {
	size  int
	seed  uint64
	picks []pick // the rows of smallest rank, by rank
}

// pick is a sampled row with what extension said of it.
type pick struct {
	rank     uint64
	features []float64
	class    int32
	value    float64
}

// StrayFigure says how far extension strays from solving again.
type StrayFigure struct {
	Rows    int     `json:"rows"`
	Changed *int    `json:"labels_changed,omitempty"` // classes
	RMS     *Number `json:"rms_change,omitempty"`     // numbers
	Largest *Number `json:"largest_change,omitempty"` // numbers
}

func newRecheck(size int, seed uint64) *recheck { return &recheck{size: size, seed: seed} }

// take offers the rows of a batch. Equal rows are sampled once, and the order of rows does not matter.
func (s *recheck) take(nums *table.Numbers, res *encode.Result) {
	for row := range nums.Rows {
		features := nums.Data[row*nums.Cols : (row+1)*nums.Cols]
		rank, whole := rankOf(s.seed, features)
		if !whole || res.Origin[row] == encode.OriginBlank || len(s.picks) == s.size && rank >= s.picks[len(s.picks)-1].rank {
			continue
		}
		at, twice := slices.BinarySearchFunc(s.picks, rank, func(q pick, r uint64) int { return cmp.Compare(q.rank, r) })
		if twice {
			continue
		}
		p := pick{rank: rank, features: slices.Clone(features)}
		if res.Task == encode.Classes {
			p.class = res.Class[row]
		} else {
			p.value = res.Value[row]
		}
		s.picks = slices.Insert(s.picks, at, p)
		if len(s.picks) > s.size {
			s.picks = s.picks[:s.size]
		}
	}
}

// canRecheck tells whether the model's graph and labels can be put together again.
func canRecheck(m *extend.Model) bool { return len(m.Labelled) > 0 && m.K > 0 }

// recheck solves again with the sampled rows and says how far extension strays.
func (x *extension) recheck(ctx context.Context) error {
	f, err := x.stray.measure(ctx, x)
	if err != nil {
		return err
	}
	if f == nil {
		x.note("recheck: every sampled row lies on a row of the model")
		return nil
	}
	x.note("%s", f.sentence("recheck", "new rows"))
	return nil
}

// measure puts the sampled rows into the model's graph and solves again. It is nil where each lies on a vertex.
func (s *recheck) measure(ctx context.Context, x *extension) (*StrayFigure, error) {
	m := x.model.Model
	all := &points.Matrix{N: m.Points.N, D: m.Points.D, Data: slices.Clone(m.Points.Data)}
	seen := map[string]bool{}
	var fresh []pick
	work, scores := x.model.NewWork(), make([]float64, len(m.Scores))
	for _, p := range s.picks {
		y := make([]float64, m.Points.D)
		if err := m.Scaling.Apply(y, p.features); err != nil {
			continue
		}
		key := fmt.Sprint(y)
		at, err := x.model.Row(p.features, scores, work)
		if err != nil || at.Distance == 0 || seen[key] {
			continue // on a vertex, or the same as another: nothing to learn
		}
		seen[key] = true
		fresh = append(fresh, p)
		all.Data = append(all.Data, y...)
		all.N++
	}
	if len(fresh) == 0 {
		return nil, nil
	}
	fields, err := s.again(ctx, x, all)
	if err != nil {
		return nil, err
	}
	return s.figure(x, fresh, fields), nil
}

func (s *recheck) again(ctx context.Context, x *extension, all *points.Matrix) ([][]float64, error) {
	m := x.model.Model
	lists, _, err := neighbors.KNearest(ctx, all, max(m.K, m.Rank), neighbors.Options{Metric: m.Metric, Workers: x.Workers, Seed: x.Seed})
	if err != nil {
		return nil, err
	}
	g, err := graph.FromLists(lists, m.K, x.Workers)
	if err != nil {
		return nil, err
	}
	kernel, err := graph.ParseKernel(m.Kernel)
	if err != nil {
		return nil, err
	}
	w, err := g.LogWeights(kernel, m.Width, x.Workers)
	if err != nil {
		return nil, err
	}
	labels := choose.Labels{Task: choose.Classes, Vertex: m.Labelled, Target: make([][]float64, len(m.Scores))}
	for c, score := range m.Scores {
		for _, v := range m.Labelled {
			labels.Target[c] = append(labels.Target[c], score[v])
		}
	}
	energy := solve.Slope
	if m.Energy == energyText(solve.Conductance) {
		energy = solve.Conductance
	}
	fields, _, err := choose.Solve(ctx, solve.Problem{Graph: w, P: m.P, Energy: energy}, labels, nil, solve.Settings{Workers: x.Workers})
	return fields, err
}

// figure compares what extension said with the new solution.
func (s *recheck) figure(x *extension, fresh []pick, fields [][]float64) *StrayFigure {
	f := &StrayFigure{Rows: len(fresh)}
	changed, worst, square := 0, 0.0, 0.0
	scores := make([]float64, len(fields))
	for i, p := range fresh {
		for c := range scores {
			scores[c] = fields[c][x.model.Points.N+i]
		}
		if len(x.model.Classes) > 0 {
			if x.judge.decide(scores) != p.class {
				changed++
			}
			continue
		}
		d := math.Abs(scores[0] - p.value)
		worst = max(worst, d)
		square += float64(d * d)
	}
	if len(x.model.Classes) > 0 {
		f.Changed = &changed
	} else {
		f.RMS, f.Largest = figure(math.Sqrt(square/float64(len(fresh)))), figure(worst)
	}
	return f
}

func (f *StrayFigure) sentence(what, rows string) string {
	if f.Changed != nil {
		return fmt.Sprintf("%s: solving again with %d of the %s changes the label of %d (%.1f%%)", what, f.Rows, rows, *f.Changed, 100*float64(*f.Changed)/float64(f.Rows))
	}
	return fmt.Sprintf("%s: solving again with %d of the %s moves their values by %.3g (root mean square), at most %.3g", what, f.Rows, rows, float64(*f.RMS), float64(*f.Largest))
}
