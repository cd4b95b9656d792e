package points

import (
	"math"
	"math/bits"
	"slices"

	"pinfill/internal/parallel"
)

// rowGrain is the number of rows a chunk of a parallel loop holds.
const rowGrain = 8192

// column describes the values of one input column, in units of 2^power.
type column struct {
	low, high float64 // smallest and largest value, in the table's own units
	power     int     // the largest |value| is in [0.5, 1) * 2^power
	median    float64 // an order statistic of the column, so a value that stands in it
	quartile  float64 // third quartile less the first
	deviation float64 // standard deviation
}

// bounds sets low and high of each column, and says where the first number that is not finite stands.
func bounds(raw *Matrix, cols []column, workers int) error {
	d := raw.D
	chunks := (raw.N + rowGrain - 1) / rowGrain
	low, high := make([]float64, chunks*d), make([]float64, chunks*d)
	bad := make([]int, chunks)
	parallel.ForChunk(workers, raw.N, rowGrain, func(_, c, lo, hi int) {
		l, h := low[c*d:(c+1)*d], high[c*d:(c+1)*d]
		copy(l, raw.Row(lo))
		copy(h, raw.Row(lo))
		bad[c] = -1
		for i := lo; i < hi; i++ {
			for j, v := range raw.Row(i) {
				if v-v != 0 && bad[c] < 0 {
					bad[c] = i*d + j
				}
				l[j], h[j] = min(l[j], v), max(h[j], v)
			}
		}
	})
	for c := range chunks {
		if bad[c] >= 0 {
			return &NotFiniteError{Row: bad[c] / d, Column: bad[c] % d}
		}
		for j := range cols {
			if c == 0 {
				cols[j].low, cols[j].high = low[j], high[j]
			}
			cols[j].low, cols[j].high = min(cols[j].low, low[c*d+j]), max(cols[j].high, high[c*d+j])
		}
	}
	for j := range cols {
		_, cols[j].power = math.Frexp(max(math.Abs(cols[j].low), math.Abs(cols[j].high)))
	}
	return nil
}

// ranks sets median and quartile of column j of raw.
func (c *column) ranks(raw *Matrix, j int, buf []float64) {
	buf = buf[:raw.N]
	for i := range buf {
		buf[i] = timesPower(raw.Data[i*raw.D+j], -c.power) + 0 // + 0 turns -0 into 0
	}
	n := len(buf)
	c.median = selectNth(buf, (n-1)/2)
	c.quartile = selectNth(buf[(n-1)/2:], (3*(n-1)+3)/4-(n-1)/2) - selectNth(buf[:(n-1)/2+1], (n-1)/4)
}

// selectNth gives the k-th smallest of x (0-based), which it reorders so that smaller values stand before it. Expected
// cost O(len(x)); after too many rounds without progress it sorts.
func selectNth(x []float64, k int) float64 {
	lo, hi := 0, len(x)-1
	for round := 0; hi-lo > 12; round++ {
		if round > 64 {
			break
		}
		m := lo + (hi-lo)/2
		step := (hi - lo) / 8
		p := median3(median3(x[lo], x[lo+step], x[lo+2*step]), median3(x[m-step], x[m], x[m+step]), median3(x[hi-2*step], x[hi-step], x[hi]))
		i, j := lo, hi
		for i <= j {
			for x[i] < p {
				i++
			}
			for x[j] > p {
				j--
			}
			if i <= j {
				x[i], x[j] = x[j], x[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return x[k]
		}
	}
	slices.Sort(x[lo : hi+1])
	return x[k]
}

func median3(a, b, c float64) float64 { return max(min(a, b), min(max(a, b), c)) }

// moments are sums of whole numbers, so that they are the same for any order of the rows and any number of workers.
type moments struct {
	sumHi  int64
	sumLo  uint64
	sqHi   uint64
	sqLo   uint64
	counts int
}

// fixedBits is the number of bits of a deviation from the median that enter the sums, counted from the largest
// deviation of the column: 2^27 rows of squares below 2^100 fit in 128 bits. The rounding moves the standard deviation,
// which is at least the largest deviation over sqrt(2n), by less than 1e-11 of itself at n = 1e8.
const fixedBits = 50

func (m *moments) add(q int64) {
	var carry uint64
	m.sumLo, carry = bits.Add64(m.sumLo, uint64(q), 0)
	m.sumHi += q>>63 + int64(carry)
	a := uint64(max(q, -q))
	h, l := bits.Mul64(a, a)
	m.sqLo, carry = bits.Add64(m.sqLo, l, 0)
	m.sqHi, _ = bits.Add64(m.sqHi, h, carry)
	m.counts++
}

func (m *moments) merge(o moments) {
	var carry uint64
	m.sumLo, carry = bits.Add64(m.sumLo, o.sumLo, 0)
	m.sumHi += o.sumHi + int64(carry)
	m.sqLo, carry = bits.Add64(m.sqLo, o.sqLo, 0)
	m.sqHi, _ = bits.Add64(m.sqHi, o.sqHi, carry)
	m.counts += o.counts
}

// deviation is sqrt(E q^2 - (E q)^2). The difference loses at most one bit or so, because a mean is never farther from
// the median than one standard deviation.
func (m *moments) deviation() float64 {
	n := float64(m.counts)
	mean := (math.Ldexp(float64(m.sumHi), 64) + float64(m.sumLo)) / n
	square := (math.Ldexp(float64(m.sqHi), 64) + float64(m.sqLo)) / n
	return math.Sqrt(max(0, square-float64(mean*mean)))
}

// deviations sets deviation of each column that is not constant; median must be set.
func deviations(raw *Matrix, cols []column, workers int) {
	d := raw.D
	unit := make([]int, d) // the largest deviation from the median is below 2^unit
	for j := range cols {
		c := &cols[j]
		_, unit[j] = math.Frexp(max(timesPower(c.high, -c.power)-c.median, c.median-timesPower(c.low, -c.power)))
	}
	chunks := (raw.N + rowGrain - 1) / rowGrain
	part := make([]moments, chunks*d)
	parallel.ForChunk(workers, raw.N, rowGrain, func(_, ch, lo, hi int) {
		for j := range cols {
			c, m := &cols[j], &part[ch*d+j]
			if c.low == c.high {
				continue
			}
			for i := lo; i < hi; i++ {
				u := timesPower(raw.Data[i*d+j], -c.power) - c.median
				m.add(int64(math.RoundToEven(timesPower(u, fixedBits-unit[j]))))
			}
		}
	})
	for j := range cols {
		var m moments
		for ch := range chunks {
			m.merge(part[ch*d+j])
		}
		if cols[j].low != cols[j].high {
			cols[j].deviation = timesPower(m.deviation(), unit[j]-fixedBits)
		}
	}
}
