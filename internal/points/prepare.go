package points

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/parallel"
)

// Options say how raw rows become points.
type Options struct {
	Scale   Scale  // "" means Standard
	Metric  Metric // "" means Euclidean
	Workers int    // 0 means GOMAXPROCS; the answer does not depend on it
}

// Space is a set of distinct points and the way to it from the rows of the input.
type Space struct {
	Points   *Matrix   // one row a vertex: distinct, kept columns only, scaled, in the order of Order
	Vertex   []int32   // vertex of each input row
	Count    []int32   // input rows of each vertex, >= 1
	Scaling  Scaling   // takes an input row to a point
	Metric   Metric    // as asked for; searches treat Cosine as Euclidean
	Unit     float64   // one unit of Points in the user's scaled units: 1, but for Scale None on tables over 2^400 or under 2^-400
	Constant []int     // dropped input columns: one value in all rows
	RawShare []float64 // per kept column, its share of the mean squared Euclidean distance between input rows, unscaled
	Share    []float64 // the same after scaling
}

// ErrIdentical says that there are fewer than two distinct points.
var ErrIdentical = errors.New("all points are identical")

// NotFiniteError says which number of the input is NaN or infinite.
type NotFiniteError struct{ Row, Column int }

func (e *NotFiniteError) Error() string {
	return fmt.Sprintf("row %d, column %d is not a finite number", e.Row, e.Column)
}

// RowError says which input row could not become a point.
type RowError struct {
	Row int
	Err error // ErrZeroVector or ErrOutOfRange
}

func (e *RowError) Error() string { return fmt.Sprintf("row %d: %v", e.Row, e.Err) }

// Unwrap gives the cause.
func (e *RowError) Unwrap() error { return e.Err }

// Prepare makes points of raw, which it leaves as it is. Points and Count depend on the rows as a multiset: permuted
// rows give the same bits. With any scaling but None, columns multiplied by powers of two give the same bits too.
//
// Errors: ErrIdentical, *NotFiniteError, *RowError (the first row concerned), the context's error, or a wrong size.
func Prepare(ctx context.Context, raw *Matrix, o Options) (*Space, error) {
	if raw.N == 0 || raw.D == 0 {
		return nil, fmt.Errorf("no points in %d rows of %d columns", raw.N, raw.D)
	}
	if raw.N > math.MaxInt32 {
		return nil, fmt.Errorf("%d rows are more than %d", raw.N, math.MaxInt32)
	}
	workers := parallel.Workers(o.Workers)
	s := &Space{Metric: cmp.Or(o.Metric, Euclidean), Unit: 1}
	cols := make([]column, raw.D)
	if err := bounds(raw, cols, workers); err != nil {
		return nil, err
	}
	bufs := make([][]float64, workers)
	parallel.ForChunk(workers, raw.D, 1, func(w, _, j, _ int) {
		if c := &cols[j]; c.low != c.high && ctx.Err() == nil {
			if bufs[w] == nil {
				bufs[w] = make([]float64, raw.N)
			}
			c.ranks(raw, j, bufs[w])
		}
	})
	bufs = nil
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	deviations(raw, cols, workers)
	if err := s.choose(cols, cmp.Or(o.Scale, Standard)); err != nil {
		return nil, err
	}
	if err := s.place(raw, workers); err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	if err := s.collapse(ctx, workers); err != nil {
		return nil, err
	}
	if s.Points.N < 2 {
		return nil, ErrIdentical
	}
	return s, nil
}

// choose sets Scaling, Constant and the shares.
func (s *Space) choose(cols []column, scale Scale) error {
	s.Scaling = Scaling{Inputs: len(cols), Unit: s.Metric == Cosine}
	common := math.MinInt // the largest power of a kept column
	for j, c := range cols {
		if c.low == c.high {
			s.Constant = append(s.Constant, j)
			continue
		}
		s.Scaling.Columns = append(s.Scaling.Columns, j)
		common = max(common, c.power)
	}
	if len(s.Scaling.Columns) == 0 {
		return ErrIdentical
	}
	if scale == None && common >= -400 && common <= 400 {
		common = 0
	}
	var raw, scaled []float64
	for _, j := range s.Scaling.Columns {
		c := &cols[j]
		power, centre, spread := -c.power, c.median, c.deviation
		switch scale {
		case Standard:
		case Robust:
			if c.quartile > 0 {
				spread = c.quartile / 1.349 // the interquartile range of a normal variable over its standard deviation
			}
		case Range:
			spread = timesPower(c.high, -c.power) - timesPower(c.low, -c.power)
		case None:
			power, centre, spread = -common, 0, 1
		default:
			return fmt.Errorf("scale %q is not known", scale)
		}
		if s.Metric == Cosine {
			centre = 0
		}
		s.Scaling.Power = append(s.Scaling.Power, power)
		s.Scaling.Centre = append(s.Scaling.Centre, centre)
		s.Scaling.Spread = append(s.Scaling.Spread, spread)
		_, e := math.Frexp(c.deviation)
		raw = append(raw, float64(e+c.power)+math.Log2(timesPower(c.deviation, -e)))
		scaled = append(scaled, math.Log2(c.deviation/spread)+float64(c.power+power))
	}
	if scale == None {
		s.Unit = math.Ldexp(1, common)
	}
	s.RawShare, s.Share = shares(raw), shares(scaled)
	return nil
}

// shares turns binary logarithms of standard deviations into shares of the total variance.
func shares(log []float64) []float64 {
	top := slices.Max(log)
	var sum float64
	out := make([]float64, len(log))
	for j, v := range log {
		out[j] = math.Exp2(2 * (v - top))
		sum += out[j]
	}
	for j := range out {
		out[j] /= sum
	}
	return out
}

// place fills Points with the scaled rows of raw.
func (s *Space) place(raw *Matrix, workers int) error {
	s.Points = NewMatrix(raw.N, len(s.Scaling.Columns))
	chunks := (raw.N + rowGrain - 1) / rowGrain
	errs := make([]error, chunks)
	parallel.ForChunk(workers, raw.N, rowGrain, func(_, c, lo, hi int) {
		for i := lo; i < hi; i++ {
			if err := s.Scaling.Apply(s.Points.Row(i), raw.Row(i)); err != nil && errs[c] == nil {
				errs[c] = &RowError{Row: i, Err: err}
			}
		}
	})
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// collapse orders Points, makes equal ones one, and sets Vertex and Count.
func (s *Space) collapse(ctx context.Context, workers int) error {
	m := s.Points
	rows := m.N
	perm, err := Order(ctx, m, workers)
	if err != nil {
		return err
	}
	s.Vertex = make([]int32, rows)
	v := 0
	for i := range rows {
		if i > 0 && !slices.Equal(m.Row(i), m.Row(v)) {
			v++
			copy(m.Row(v), m.Row(i))
		}
		s.Vertex[perm[i]] = int32(v)
	}
	if v+1 < rows { // the cuts are placed afresh, as if each point had stood there once
		kept := NewMatrix(v+1, m.D)
		copy(kept.Data, m.Data)
		s.Points = kept
		if perm, err = Order(ctx, kept, workers); err != nil {
			return err
		}
		place := make([]int32, kept.N)
		for i, p := range perm {
			place[p] = int32(i)
		}
		for i, p := range s.Vertex {
			s.Vertex[i] = place[p]
		}
	}
	s.Count = make([]int32, s.Points.N)
	for _, p := range s.Vertex {
		s.Count[p]++
	}
	return nil
}
