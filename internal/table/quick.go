package table

import (
	"encoding/binary"
	"math"
	"math/bits"
)

const asciiZeros = 0x3030303030303030

// quickSpan is how far quickNumber may look: a sign, eight digits, the decimal sign, two times eight digits, one more.
const quickSpan = 1 + 8 + 1 + 16 + 1

// leadingDigits gives how many of eight bytes, the first in the lowest place, are digits before another byte comes,
// and the number they make.
func leadingDigits(w uint64) (n int, value uint64) {
	// Digits become 0 to 9; any other byte has a bit in its upper half, or gets one when 6 is added. A carry out of a
	// byte that is no digit runs into bytes after it, which do not matter.
	d := w ^ asciiZeros
	other := (d | (d + 0x0606060606060606)) & 0xf0f0f0f0f0f0f0f0 // | and + bind alike in Go
	n = bits.TrailingZeros64(other) >> 3
	d <<= 64 - 8*n // the last digit into the highest byte, zeros before the first
	// Pairs, fours, all eight: sums of neighbours with weights 10, 100 and 10000 (Lemire 2021, section 3).
	d = d*10 + d>>8
	return n, (d&0x000000ff000000ff*0x000f424000000064 + d>>16&0x000000ff000000ff*0x0000271000000001) >> 32
}

// quickNumber reads the usual kind of number at data[p]: at most 8 digits before the decimal sign and 16 after it, 19 in
// all, no exponent. It gives the position after it, or 0 where the number is of another kind or not one; scanNumber
// decides then. The caller must look at what follows.
func quickNumber(data []byte, p int, sign byte) (float64, int) {
	if p+quickSpan > len(data) {
		return 0, 0
	}
	minus := uint64(0)
	if data[p] == '-' {
		minus = 1 // set without a jump: signs of measurements are hard to predict
	}
	p += int(minus)
	n, m := leadingDigits(binary.LittleEndian.Uint64(data[p:]))
	p += n
	exp := 0
	if data[p] == sign {
		p++
		k, d := leadingDigits(binary.LittleEndian.Uint64(data[p:]))
		m = m*shift10[k&15] + d
		exp = k
		if k == 8 {
			k, d = leadingDigits(binary.LittleEndian.Uint64(data[p+8:]))
			m = m*shift10[k&15] + d
			exp += k
		}
		p += exp
	}
	if digits := n + exp; digits == 0 || digits > exactDigits {
		return 0, 0
	}
	v := float64(m) / exact10[exp] // both exact, one rounding: see decimalValue
	if m >= 1<<53 {
		var ok bool
		if v, ok = decimalValue(m, -exp); !ok {
			return 0, 0
		}
	}
	return math.Float64frombits(math.Float64bits(v) | minus<<63), p
}
