package job

import (
	"context"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/fault"
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
	row      int
	features []float64
	class    int32
	value    float64
}

func newRecheck(size int, seed uint64) *recheck { return &recheck{size: size, seed: seed} }

// mix is a bijection that scatters (splitmix64, Steele, Lea and Flood 2014): a row's rank in the sample depends on the
// seed and its number alone.
func mix(x uint64) uint64 {
	x += 0x9e3779b97f4a7c15
	x = (x ^ x>>30) * 0xbf58476d1ce4e5b9
	x = (x ^ x>>27) * 0x94d049bb133111eb
	return x ^ x>>31
}

// take offers the rows of a batch, whose first row has number start.
func (s *recheck) take(start int, nums *table.Numbers, res *encode.Result) {
	for row := range nums.Rows {
		rank := mix(mix(s.seed) ^ uint64(start+row))
		if res.Origin[row] == encode.OriginBlank || len(s.picks) == s.size && rank >= s.picks[len(s.picks)-1].rank {
			continue
		}
		p := pick{rank: rank, row: start + row, features: slices.Clone(nums.Data[row*nums.Cols : (row+1)*nums.Cols])}
		if res.Task == encode.Classes {
			p.class = res.Class[row]
		} else {
			p.value = res.Value[row]
		}
		at, _ := slices.BinarySearchFunc(s.picks, rank, func(q pick, r uint64) int {
			if q.rank < r {
				return -1
			}
			return 1
		})
		s.picks = slices.Insert(s.picks, at, p)
		if len(s.picks) > s.size {
			s.picks = s.picks[:s.size]
		}
	}
}

// solve puts the sampled rows into the model's graph, solves again and says how far extension strays.
func (s *recheck) solve(ctx context.Context, x *extension) error {
	m := x.model.Model
	if len(m.Labelled) == 0 || m.K == 0 {
		return fault.Usagef("P09", "--recheck needs a model with labels held exactly and nearest neighbours, not --tether or --radius")
	}
	all := &points.Matrix{N: m.Points.N, D: m.Points.D, Data: slices.Clone(m.Points.Data)}
	seen := map[string]bool{}
	var fresh []pick
	for _, p := range s.picks {
		y := make([]float64, m.Points.D)
		if err := m.Scaling.Apply(y, p.features); err != nil {
			continue
		}
		key := fmt.Sprint(y)
		at, err := x.model.Row(p.features, make([]float64, len(m.Scores)), x.model.NewWork())
		if err != nil || at.Distance == 0 || seen[key] {
			continue // on a vertex, or the same as another: nothing to learn
		}
		seen[key] = true
		fresh = append(fresh, p)
		all.Data = append(all.Data, y...)
		all.N++
	}
	if len(fresh) == 0 {
		x.note("recheck: every sampled row lies on a row of the model")
		return nil
	}
	fields, err := s.again(ctx, x, all)
	if err != nil {
		return err
	}
	x.note("%s", s.sentence(x, fresh, fields))
	return nil
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

// sentence says how far extension strays.
func (s *recheck) sentence(x *extension, fresh []pick, fields [][]float64) string {
	m := x.model.Model
	changed, worst := 0, 0.0
	var square float64
	for i, p := range fresh {
		v := m.Points.N + i
		if len(m.Classes) > 0 {
			if int32(x.judge.keep.Weights.Decide(func(c int) float64 { return fields[c][v] })) != p.class {
				changed++
			}
			continue
		}
		d := math.Abs(fields[0][v] - p.value)
		worst = max(worst, d)
		square += float64(d * d)
	}
	if len(m.Classes) > 0 {
		return fmt.Sprintf("recheck: solving again with %d of the new rows changes the label of %d (%.1f%%)", len(fresh), changed, 100*float64(changed)/float64(len(fresh)))
	}
	return fmt.Sprintf("recheck: solving again with %d of the new rows moves their values by %.3g (root mean square), at most %.3g", len(fresh), math.Sqrt(square/float64(len(fresh))), worst)
}
