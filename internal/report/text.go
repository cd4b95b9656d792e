package report

import (
	"math"
	"strconv"
	"strings"
)

// count writes a whole number with its thousands apart.
func count(n int) string {
	s := strconv.Itoa(n)
	sign := ""
	if n < 0 {
		sign, s = "−", s[1:]
	}
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return sign + s
}

// figure writes a number with three significant digits; NaN is a dash.
func figure(v float64) string {
	switch {
	case math.IsNaN(v):
		return "–"
	case math.IsInf(v, 1):
		return "inf"
	case math.IsInf(v, -1):
		return "−inf"
	case v == 0:
		return "0"
	}
	a := math.Abs(v)
	if a < 1e-3 || a >= 1e7 {
		s := strconv.FormatFloat(v, 'e', 1, 64)
		return strings.Replace(minus(s), "e−0", "e−", 1)
	}
	digits := max(0, 2-int(math.Floor(math.Log10(a))))
	s := strconv.FormatFloat(v, 'f', digits, 64)
	if strings.Contains(s, ".") {
		s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	}
	return minus(s)
}

// minus writes the minus sign as one.
func minus(s string) string { return strings.ReplaceAll(s, "-", "−") }

// percent writes a share. What is not nothing never reads as nothing, nor what is not all as all.
func percent(share float64) string {
	p := 100 * share
	switch {
	case math.IsNaN(share):
		return "–"
	case p > 0 && p < 0.1:
		return "under 0.1%"
	case p > 99.9 && p < 100:
		return "over 99.9%"
	case p == 0 || p == 100 || p >= 10 && p < 99.5:
		return strconv.FormatFloat(p, 'f', 0, 64) + "%"
	}
	return strings.TrimSuffix(strconv.FormatFloat(p, 'f', 1, 64), ".0") + "%"
}

// power writes p as the flag takes it.
func power(p float64) string {
	if math.IsInf(p, 1) {
		return "inf"
	}
	return strconv.FormatFloat(p, 'g', -1, 64)
}

// short cuts a name for a plot's label.
func short(s string, most int) string {
	r := []rune(s)
	if len(r) <= most {
		return s
	}
	return string(r[:most-1]) + "…"
}

// coord writes a coordinate of a drawing with one decimal at most.
func coord(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return "0"
	}
	s := strconv.FormatFloat(v, 'f', 1, 64)
	s = strings.TrimSuffix(s, ".0")
	if s == "-0" {
		return "0"
	}
	return s
}

// fileText writes a file's size.
func fileText(n int64) string {
	switch {
	case n < 10_000:
		return count(int(n)) + " bytes"
	case n < 10_000_000:
		return strconv.FormatFloat(float64(n)/1e3, 'f', 0, 64) + " kB"
	}
	return strconv.FormatFloat(float64(n)/1e6, 'f', 1, 64) + " MB"
}

// seq numbers from 1.
func seq(i int) int { return i + 1 }

// plural gives "1 row", "2 rows".
func plural(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return count(n) + " " + what + "s"
}
