package table

import (
	"math"
	"math/big"
	"math/bits"
)

// decimalValue gives the float64 nearest to m * 10^exp, or false where it does not know.
//
// Where m and 10^|exp| are exact as float64, one operation rounds once (Clinger 1990, "How to read floating point
// numbers accurately"). Otherwise m is multiplied by the leading 128 bits of the power, and the product tells the nearest
// float64 unless it lies too close to the middle of two (Lemire 2021, "Number parsing at a gigabyte per second",
// algorithm 1; here without subnormal results and with exponents that tables of measurements have).
func decimalValue(m uint64, exp int) (float64, bool) {
	if m < 1<<53 {
		switch {
		case exp == 0 || m == 0:
			return float64(m), true
		case exp < 0 && exp >= -22:
			return float64(m) / exact10[-exp], true
		case exp > 0 && exp <= 22:
			return float64(m) * exact10[exp], true
		}
	}
	if exp < minPower || exp > maxPower || m == 0 {
		return 0, m == 0
	}
	power := &powers[exp-minPower]
	shift := bits.LeadingZeros64(m)
	w := m << shift
	hi, lo := bits.Mul64(w, power.hi)
	if hi&0x1ff == 0x1ff && lo+w < w { // the bits left out of the power could still carry into the 55 that count
		hi2, lo2 := bits.Mul64(w, power.lo)
		sum, carry := bits.Add64(lo, hi2, 0)
		hi, lo = hi+carry, sum
		if hi&0x1ff == 0x1ff && lo == math.MaxUint64 && lo2+w < w {
			return 0, false
		}
	}
	upper := int(hi >> 63)
	mantissa := hi >> (upper + 9) // 54 bits: one more than a float64 has, to round by
	// 217706/2^16 is log2(10) to 1e-6: the floor below is exact for |exp| < 350.
	exponent := exp*217706>>16 + 1024 + 62 + upper - shift
	if lo == 0 && hi&0x1ff == 0 && mantissa&3 == 1 {
		return 0, false // in the middle of two as far as these bits tell
	}
	mantissa = (mantissa + mantissa&1) >> 1
	if mantissa == 1<<53 {
		mantissa >>= 1
		exponent++
	}
	return math.Float64frombits(uint64(exponent)<<52 | mantissa&(1<<52-1)), true
}

// exact10 are the powers of ten that float64 holds exactly.
var exact10 = [...]float64{
	1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
}

// Exponents of ten whose powers are at hand. Others are left to strconv: they are rare, and the table costs time at
// every start of the program.
const (
	minPower = -64
	maxPower = 64
)

// power is the leading 128 bits of a power of ten, the first bit set.
type power struct{ hi, lo uint64 }

var powers = makePowers()

// makePowers computes the table: powers of 5 truncated to 128 bits, and 2^b / 5^-q rounded up where 5^-q has at most 64 bits,
// truncated otherwise, as the proof in the paper asks.
func makePowers() (table [maxPower - minPower + 1]power) {
	one, low := big.NewInt(1), new(big.Int).SetUint64(math.MaxUint64)
	for q := minPower; q <= maxPower; q++ {
		c := new(big.Int).Exp(big.NewInt(5), big.NewInt(int64(max(q, -q))), nil)
		if q < 0 {
			b := uint(c.BitLen() + 127) // the quotient has 128 bits
			if q < -27 {
				b = uint(2*c.BitLen() + 128)
			}
			c.Div(new(big.Int).Lsh(one, b), c)
			c.Add(c, one)
		}
		if n := c.BitLen(); n < 128 {
			c.Lsh(c, uint(128-n))
		} else {
			c.Rsh(c, uint(n-128))
		}
		table[q-minPower] = power{new(big.Int).Rsh(c, 64).Uint64(), new(big.Int).And(c, low).Uint64()}
	}
	return table
}
