package table

import (
	"math"
	"strconv"
	"unsafe"
)

// NumberError says why a cell is not a number. It is an error.
type NumberError uint8

// Reasons why a cell is not a number.
const (
	NotNumber NumberError = iota + 1 // not of the grammar; the diagnosis of a message tells more
	Overflow                         // too large for a float64
	Underflow                        // not zero, but too small for a float64
)

var numberErrors = [...]string{NotNumber: "not a number", Overflow: "out of range: larger than 1.8e308", Underflow: "out of range: not zero, but smaller than 4.9e-324"}

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
	if err != 0 {
		return 0, err
	}
	if n != len(cell) {
		return 0, NotNumber
	}
	return v, nil
}

// scanNumber reads the number that starts at data[pos] and gives its value and the position after it.
func scanNumber(data []byte, pos int, decimal byte) (float64, int, NumberError) {
	start, p := pos, pos
	if p < len(data) && (data[p] == '-' || data[p] == '+') {
		p++
	}
	digits, zero, comma := 0, true, -1
	for ; p < len(data); p++ {
		c := data[p]
		if c-'0' <= 9 {
			digits++
			zero = zero && c == '0'
		} else if c == decimal && comma < 0 {
			comma = p
		} else {
			break
		}
	}
	if digits == 0 {
		return 0, pos, NotNumber
	}
	if p < len(data) && data[p]|0x20 == 'e' {
		p++
		if p < len(data) && (data[p] == '-' || data[p] == '+') {
			p++
		}
		first := p
		for p < len(data) && data[p]-'0' <= 9 {
			p++
		}
		if p == first {
			return 0, pos, NotNumber
		}
	}
	v, err := slowNumber(data[start:p], comma-start)
	if err == nil && v == 0 && !zero {
		return 0, p, Underflow
	}
	if err != nil || math.IsInf(v, 0) {
		return 0, p, Overflow
	}
	return v, p, 0
}

// slowNumber lets strconv read text of the grammar; comma is the place of the decimal sign, or negative.
func slowNumber(text []byte, comma int) (float64, error) {
	if comma >= 0 && text[comma] != '.' {
		text = append([]byte(nil), text...)
		text[comma] = '.'
	}
	return strconv.ParseFloat(unsafe.String(&text[0], len(text)), 64)
}
