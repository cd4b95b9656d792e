package table

import (
	"encoding/binary"
	"math"
	"strconv"
	"unsafe"
)

// NumberError says why a cell is not a number. It is an error.
type NumberError uint8

// Reasons why a cell is not a number.
const (
	NotNumber NumberError = iota + 1 // not of the grammar; NumberFault tells more
	Overflow                         // too large for a float64
	Underflow                        // not zero, but too small for a float64
)

var numberErrors = [...]string{
	NotNumber: "not a number",
	Overflow:  "out of range: larger than 1.8e308",
	Underflow: "out of range: not zero, but smaller than 4.9e-324",
}

// Error is the reason in words.
func (e NumberError) Error() string { return numberErrors[e] }

// ParseNumber reads a cell that holds a decimal number and nothing else:
//
//	[+-] (digits [. digits*] | . digits) [(e|E) [+-] digits]
//
// where . is the decimal sign, '.' or ','. Separators of thousands, underscores, hexadecimal, inf, nan and spaces are
// refused, and so are numbers beyond float64 at either end. The result is the float64 nearest to the number, ties to
// even. The error is a NumberError.
func ParseNumber(cell []byte, decimal byte) (float64, error) {
	v, n, err := scanNumber(cell, 0, decimal)
	if n != len(cell) { // also where the number before the rest is out of range
		err = NotNumber
	}
	if err != 0 {
		return 0, err
	}
	return v, nil
}

// scanNumber reads the longest number that starts at data[pos] and gives its value and the position after it. Decimal
// sign 0 stands for none. The data beyond the number may be looked at but do not matter.
func scanNumber(data []byte, pos int, decimal byte) (float64, int, NumberError) {
	p := pos
	if p < len(data) && (data[p] == '-' || data[p] == '+') {
		p++
	}
	m, end := scanDigits(data, p, 0)
	digits, exp := end-p, 0
	comma := -1
	if p = end; p < len(data) && data[p] == decimal {
		comma = p
		m, end = scanDigits(data, p+1, m)
		exp = p + 1 - end
		digits -= exp
		p = end
	}
	if digits == 0 {
		return 0, pos, NotNumber
	}
	if p < len(data) && data[p]|0x20 == 'e' {
		e, after := scanExponent(data, p+1)
		if after == 0 {
			return 0, pos, NotNumber
		}
		exp, p = exp+e, after
	}
	if digits <= exactDigits || significant(data[pos:p]) <= exactDigits {
		if v, ok := decimalValue(m, exp); ok {
			if data[pos] == '-' {
				v = -v
			}
			return v, p, 0
		}
	}
	v, err := slowNumber(data[pos:p], comma-pos)
	return v, p, err
}

// exactDigits is how many significant digits a uint64 always holds.
const exactDigits = 19

// scanDigits reads digits from data[p] on, eight at a time, and gives m followed by them (modulo 2^64) and the
// position after the last.
func scanDigits(data []byte, p int, m uint64) (uint64, int) {
	for p+8 <= len(data) {
		n, d := leadingDigits(binary.LittleEndian.Uint64(data[p:]))
		m = m*shift10[n&15] + d
		p += n
		if n < 8 {
			return m, p
		}
	}
	for ; p < len(data) && data[p]-'0' <= 9; p++ {
		m = m*10 + uint64(data[p]-'0')
	}
	return m, p
}

var shift10 = [16]uint64{1, 10, 100, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8}

// scanExponent reads a signed exponent at data[p] and gives it, cut at ±100,000, and the position after it; 0 when
// there are no digits.
func scanExponent(data []byte, p int) (exp, after int) {
	sign := 1
	if p < len(data) && (data[p] == '-' || data[p] == '+') {
		if data[p] == '-' {
			sign = -1
		}
		p++
	}
	first := p
	for ; p < len(data) && data[p]-'0' <= 9; p++ {
		exp = min(exp*10+int(data[p]-'0'), 100_000)
	}
	if p == first {
		return 0, 0
	}
	return sign * exp, p
}

// significant counts the digits of a number's mantissa from the first that is not zero.
func significant(text []byte) int {
	n := 0
	for _, c := range text {
		switch {
		case c-'0' <= 9 && (n > 0 || c != '0'):
			n++
		case c|0x20 == 'e':
			return n
		}
	}
	return n
}

// slowNumber lets strconv read text of the grammar; comma is the place of the decimal sign, or negative.
func slowNumber(text []byte, comma int) (float64, NumberError) {
	if comma >= 0 && text[comma] != '.' {
		text = append([]byte(nil), text...)
		text[comma] = '.'
	}
	v, err := strconv.ParseFloat(unsafe.String(&text[0], len(text)), 64)
	switch {
	case err != nil || math.IsInf(v, 0):
		return 0, Overflow
	case v == 0 && significant(text) > 0:
		return 0, Underflow
	}
	return v, 0
}
