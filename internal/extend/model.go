// Package extend labels rows that were not in the table when it was solved. Each new row is one more vertex beside
// neighbours whose values stay as they are, and takes the value that minimises its own part of the energy (Vertex).
//
// A Model holds what that needs. Write and Read keep it in a file (file.go); NewExtender makes it ready, and
// Extender.Row labels one row in microseconds, on as many goroutines as ask.
package extend

import (
	"context"
	"encoding/json"
	"fmt"
	"math"

	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/points"
)

// Model is a solved table, reduced to what new rows need.
type Model struct {
	Program  string          `json:"program"`
	Version  string          `json:"version"`
	Format   int             `json:"format"`
	Label    string          `json:"label"`    // label column
	Features []string        `json:"features"` // columns of an input row, in the order of Scaling
	Missing  string          `json:"missing"`  // stop, median or drop
	Median   []float64       `json:"median,omitempty"`
	Scaling  points.Scaling  `json:"scaling"`
	Metric   points.Metric   `json:"metric"`
	K        int             `json:"neighbors"` // 0 where Radius is used
	Radius   float64         `json:"radius"`    // in units of the points; 0 where K is used
	Kernel   string          `json:"kernel"`
	Width    graph.Bandwidth `json:"bandwidth"` // in units of the points
	Rank     int             `json:"local_rank"`
	P        float64         `json:"-"`
	PText    string          `json:"p"`
	Energy   string          `json:"energy"` // slope or conductance
	Classes  []string        `json:"classes,omitempty"`
	Labelled []int32         `json:"labelled"`           // vertices that were held, increasing; empty with tethers
	Bridged  []int32         `json:"bridged,omitempty"`  // vertices of components that were joined to a label, increasing
	Trust    json.RawMessage `json:"trust,omitempty"`    // what the judge of confidence keeps
	Settings json.RawMessage `json:"settings,omitempty"` // as in the run record

	Points *points.Matrix `json:"-"`          // one row a vertex
	Local  []float64      `json:"-"`          // own scale of each vertex
	Scores [][]float64    `json:"-"`          // one slice a class or one of numbers, by vertex; NaN out of reach
	Spread []float64      `json:"-"`          // how far the labels around each vertex disagree; nil for classes
	Rows   int            `json:"vertices"`   // = Points.N
	Dims   int            `json:"dimensions"` // = Points.D
}

// Extender labels new rows from a model. It is safe for many goroutines.
type Extender struct {
	*Model
	index  *neighbors.Index
	kernel graph.Kernel
	look   int // neighbours to look up: K, and enough for the own scale
}

// NewExtender builds the search index of a model.
func NewExtender(ctx context.Context, m *Model, workers int) (*Extender, error) {
	m.describe()
	kernel, err := graph.ParseKernel(m.Kernel)
	if err != nil {
		return nil, err
	}
	index, err := neighbors.NewIndex(ctx, m.Points, neighbors.Options{Metric: m.Metric, Workers: workers})
	if err != nil {
		return nil, err
	}
	x := &Extender{Model: m, index: index, kernel: kernel}
	x.look = min(max(m.K, m.Rank), m.Points.N)
	if m.Radius > 0 {
		x.look = min(max(radiusLook, m.Rank), m.Points.N)
	}
	return x, nil
}

// radiusLook is how many of the nearest points within the radius a new row looks at; more change its value little and
// cost much.
const radiusLook = 64

// Work is the scratch memory of one goroutine.
type Work struct {
	point, dist, logW, value []float64
	index                    []int32
}

// NewWork gives scratch memory for Row.
func (x *Extender) NewWork() *Work {
	return &Work{
		point: make([]float64, x.Dims), dist: make([]float64, x.look), logW: make([]float64, x.look),
		value: make([]float64, x.look), index: make([]int32, x.look),
	}
}

// Near is where a new row stands.
type Near struct {
	Distance float64 // to the nearest vertex, in units of the points
	Vertex   int32   // that vertex
	Spread   float64 // of the labels around the row: the mean of its neighbours', weighted as at p = 2; 0 for classes
}

// Row writes to scores the value of each class for a row of features (in the order of Features). A row on a vertex
// takes its value. The scores are NaN where no neighbour has a value. The error says that the row cannot be scaled.
func (x *Extender) Row(row, scores []float64, w *Work) (Near, error) {
	var at Near
	if err := x.Scaling.Apply(w.point, row); err != nil {
		return at, err
	}
	if err := x.index.Nearest(w.point, w.index, w.dist); err != nil {
		return at, err
	}
	at.Distance, at.Vertex = w.dist[0], w.index[0]
	if at.Distance == 0 {
		for c := range scores {
			scores[c] = x.Scores[c][at.Vertex]
		}
		if x.Spread != nil {
			at.Spread = x.Spread[at.Vertex]
		}
		return at, nil
	}
	k := x.weigh(w)
	for c := range scores {
		scores[c] = x.value(x.Scores[c], w, k, x.P)
	}
	if x.Spread != nil {
		at.Spread = x.value(x.Spread, w, k, 2)
	}
	return at, nil
}

// weigh fills in ln w of the edges to the neighbours and gives their number. Where the kernel reaches none of them,
// the nearest alone counts, as a bridge does in the graph.
func (x *Extender) weigh(w *Work) int {
	own := w.dist[min(x.Rank, len(w.dist))-1] // the distance to the neighbour of that rank, as for a vertex of the graph
	limit := len(w.dist)
	if x.Radius == 0 {
		limit = min(x.K, limit)
	}
	k := 0
	for j := range limit {
		d := w.dist[j]
		if x.Radius > 0 && d > x.Radius {
			break
		}
		t := d / x.Width.H
		t2 := t * t
		if x.Width.Local {
			s := x.Local[w.index[j]]
			if math.IsNaN(s) {
				s = d
			}
			t2 = (d / own) * (d / s) / (x.Width.H * x.Width.H)
		}
		log := x.kernel.Log(t2)
		if math.IsInf(log, -1) || math.IsNaN(x.Scores[0][w.index[j]]) {
			continue // no edge, or a vertex out of reach of any label, for every class alike
		}
		w.index[k], w.logW[k] = w.index[j], log
		k++
	}
	if k == 0 {
		w.logW[0] = 0
		return 1
	}
	if x.Energy == conductance { // sum w |t-f|^p is sum (w^(1/p) |t-f|)^p; at p = inf every weight is 1
		for j := range k {
			if math.IsInf(x.P, 1) {
				w.logW[j] = 0
			} else {
				w.logW[j] /= x.P
			}
		}
	}
	return k
}

// conductance is the name of the energy sum w |df|^p.
const conductance = "conductance"

func (x *Extender) value(score []float64, w *Work, k int, p float64) float64 {
	for j := range k {
		w.value[j] = score[w.index[j]]
	}
	if math.IsNaN(w.value[0]) {
		return w.value[0] // the nearest vertex, alone, is out of reach
	}
	return Vertex(w.logW[:k], w.value[:k], p)
}

// validate says what keeps a model, as read from a file, from being used.
func (m *Model) validate() error {
	n := m.Points.N
	switch {
	case n < 1 || m.Points.D != len(m.Scaling.Columns):
		return fmt.Errorf("%d points of %d columns for %d scaled columns", n, m.Points.D, len(m.Scaling.Columns))
	case len(m.Features) != m.Scaling.Inputs || (m.Median != nil && len(m.Median) != m.Scaling.Inputs):
		return fmt.Errorf("%d features, %d medians, %d inputs", len(m.Features), len(m.Median), m.Scaling.Inputs)
	case len(m.Scores) == 0 || (len(m.Classes) > 0 && len(m.Scores) != len(m.Classes)):
		return fmt.Errorf("%d scores for %d classes", len(m.Scores), len(m.Classes))
	case m.Spread != nil && len(m.Spread) != n:
		return fmt.Errorf("%d spreads for %d points", len(m.Spread), n)
	case !(m.P > 1):
		return fmt.Errorf("p is %v", m.P)
	case m.K < 0 || (m.K == 0) == (m.Radius == 0) || !(m.Radius >= 0) || m.Rank < 1 || m.Rank > n:
		return fmt.Errorf("%d neighbours, radius %v, rank %d", m.K, m.Radius, m.Rank)
	}
	if err := m.Width.Validate(); err != nil {
		return err
	}
	for _, list := range [][]int32{m.Labelled, m.Bridged} {
		for i, v := range list {
			if v < 0 || int(v) >= n || i > 0 && list[i-1] >= v {
				return fmt.Errorf("labelled or bridged vertices are out of order at %d", i)
			}
		}
	}
	for _, v := range m.Points.Data {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("a coordinate is %v", v)
		}
	}
	return m.Scaling.Validate()
}
