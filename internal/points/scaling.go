package points

import (
	"errors"
	"fmt"
	"math"
)

// Scale says how feature columns are brought to a common spread.
type Scale string

// Ways to scale a column. All but None also move the column's median to 0, which changes no Euclidean or Manhattan
// distance and keeps the most digits where most of the points are; with Cosine nothing is moved, because an angle
// depends on where 0 is.
const (
	Standard Scale = "standard" // divide by the standard deviation (over n, not n-1)
	Robust   Scale = "robust"   // divide by the interquartile range over 1.349; by the standard deviation where that is 0
	Range    Scale = "range"    // divide by the largest value less the smallest
	None     Scale = "none"     // leave as it is
)

// Metric is the distance between points.
type Metric string

// Metrics. Cosine is the Euclidean distance of the vectors brought to length 1, sqrt(2 - 2 cos), so that searches know
// two metrics only.
const (
	Euclidean Metric = "euclidean"
	Manhattan Metric = "manhattan"
	Cosine    Metric = "cosine"
)

// ErrZeroVector says that a row has length 0, so that it has no direction for the cosine metric.
var ErrZeroVector = errors.New("a row whose kept columns are all 0 has no direction for the cosine metric")

// ErrOutOfRange says that a row's scaled coordinates overflow: it is over 1e150 spreads away from the rest.
var ErrOutOfRange = errors.New("the scaled row overflows")

// tiny is the size below which a scaled coordinate is set to 0. Two coordinates that differ after that differ by at
// least tiny * 2^-52 = 2^-502, whose square is still a normal number: distinct points are at a distance above 0.
const tiny = 0x1p-450

// huge is the size that no scaled coordinate may exceed, so that sums of squares stay finite.
const huge = 0x1p500

// Scaling takes a row of the input to the coordinates of a point:
//
//	y_j = (x_c * 2^Power_j - Centre_j) / Spread_j,   c = Columns[j],
//
// divided by the length of y where Unit is set. The power of two makes the squares of tables in units of 1e300 or 1e-300
// representable, and changes no digit. All fields are plain so that a model file can hold them.
type Scaling struct {
	Inputs  int       // columns of an input row
	Columns []int     // kept input columns, strictly increasing
	Power   []int     // one a kept column
	Centre  []float64 // one a kept column, in units of 2^-Power
	Spread  []float64 // one a kept column, > 0, in units of 2^-Power
	Unit    bool      // points are brought to Euclidean length 1
}

// Validate says what keeps s, as read from a file, from being used.
func (s *Scaling) Validate() error {
	d := len(s.Columns)
	if d == 0 || len(s.Power) != d || len(s.Centre) != d || len(s.Spread) != d {
		return fmt.Errorf("scaling has %d columns, %d powers, %d centres and %d spreads", d, len(s.Power), len(s.Centre), len(s.Spread))
	}
	last := -1
	for j, c := range s.Columns {
		if c <= last || c >= s.Inputs {
			return fmt.Errorf("scaling keeps column %d of %d after column %d", c, s.Inputs, last)
		}
		last = c
		if s.Power[j] < -2200 || s.Power[j] > 2200 || !finite(s.Centre[j]) || !finite(s.Spread[j]) || s.Spread[j] <= 0 {
			return fmt.Errorf("scaling of column %d is not usable: power %d, centre %v, spread %v", c, s.Power[j], s.Centre[j], s.Spread[j])
		}
	}
	return nil
}

// Apply writes to dst the scaled coordinates of row: len(dst) = len(s.Columns), len(row) = s.Inputs, all finite. It is
// safe for many goroutines and allocates nothing. Errors: ErrZeroVector, ErrOutOfRange.
func (s *Scaling) Apply(dst, row []float64) error {
	for j, c := range s.Columns {
		y := (timesPower(row[c], s.Power[j]) - s.Centre[j]) / s.Spread[j]
		if math.Abs(y) < tiny {
			y = 0 // never -0: equal points have equal bits
		}
		if !(math.Abs(y) <= huge) {
			return ErrOutOfRange
		}
		dst[j] = y
	}
	if s.Unit {
		return normalise(dst)
	}
	return nil
}

// normalise divides x, of moderate size, by its Euclidean length.
func normalise(x []float64) error {
	var top float64
	for _, v := range x {
		top = max(top, math.Abs(v))
	}
	if top == 0 {
		return ErrZeroVector
	}
	_, e := math.Frexp(top)
	var sum float64
	for j, v := range x {
		x[j] = timesPower(v, -e)
		sum += float64(x[j] * x[j])
	}
	length := math.Sqrt(sum)
	for j := range x {
		x[j] /= length
		if math.Abs(x[j]) < tiny {
			x[j] = 0
		}
	}
	return nil
}

// timesPower is x * 2^e. Two factors serve powers that no float64 holds.
func timesPower(x float64, e int) float64 {
	if e >= -1022 && e <= 1023 {
		return x * math.Float64frombits(uint64(e+1023)<<52)
	}
	return math.Ldexp(x, e)
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
