package table

import (
	"errors"
	"math"
	"math/rand/v2"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// grammar is the grammar of ParseNumber's documentation with '.' as the decimal sign, said a second way.
var grammar = regexp.MustCompile(`^[+-]?([0-9]+(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?$`)

// checkNumber compares ParseNumber with strconv.ParseFloat on one text.
func checkNumber(t *testing.T, text string) {
	t.Helper()
	got, err := ParseNumber([]byte(text), '.')
	if !grammar.MatchString(text) {
		if err != NotNumber {
			t.Fatalf("%q: %v, %v; want NotNumber", text, got, err)
		}
		return
	}
	want, wrong := strconv.ParseFloat(text, 64)
	mantissa, _, _ := strings.Cut(strings.ToLower(text), "e")
	switch {
	case errors.Is(wrong, strconv.ErrRange):
		if err != Overflow {
			t.Fatalf("%q: %v, %v; want Overflow", text, got, err)
		}
	case want == 0 && strings.ContainsAny(mantissa, "123456789"):
		if err != Underflow {
			t.Fatalf("%q: %v, %v; want Underflow", text, got, err)
		}
	case err != nil || math.Float64bits(got) != math.Float64bits(want):
		t.Fatalf("%q: %v (%x), %v; strconv says %v (%x)", text, got, math.Float64bits(got), err, want, math.Float64bits(want))
	}
	padded := []byte(text + ";" + strings.Repeat(" ", quickSpan))
	if v, next := quickNumber(padded, 0, '.'); next == len(text) && math.Float64bits(v) != math.Float64bits(got) {
		t.Fatalf("%q: the quick way gives %v, the other %v", text, v, got)
	}
	if comma, err2 := ParseNumber([]byte(strings.Replace(text, ".", ",", 1)), ','); comma != got || err2 != err {
		t.Fatalf("%q with a decimal comma: %v, %v; want %v, %v", text, comma, err2, got, err)
	}
}

func TestNumberTexts(t *testing.T) {
	for _, text := range []string{
		"", "0", "-0", "+0", "1", "-1", "+1", "1.", ".5", ".", "-", "+", "-.", "e5", "1e", "1e+", "1e5", "1E-5", "1.5e+3", "--1", "+-1",
		"1_000", "0x1p3", "0X10", "inf", "Inf", "+infinity", "nan", "NaN", " 1", "1 ", "1,5", "1.2.3", "1e5.5", "12kg", "1e400", "-1e400",
		"1e-400", "0e-400", "0.0e999", "5e-324", "2.4703282292062327e-324", "2.4703282292062328e-324", "2.2250738585072011e-308",
		"1.7976931348623157e308", "1.7976931348623158e308", "1.7976931348623159e308", "9007199254740993", "9007199254740992.5", "9007199254740993.0000000000000000001",
		"18446744073709551615", "18446744073709551616", "99999999999999999999", "0.000000000000000000000000012345678901234567",
		"00000000000000000000000000000000001", "0.1234567890123456789012345678901234567890", "123456789012345678901234567890e-20", "1e99999999999999999999", "1e-99999999999999999999", "0e99999999999999999999",
		"1٣", "−5", "1234567:", "12345678/", "1234567812345678:", "1.0000000000000002220446049250313080847263336181640625", // 1 + 2^-52
		"1.00000000000000011102230246251565404236316680908203125", // 1 + 2^-53, a tie
		"1.00000000000000011102230246251565404236316680908203124", "1.00000000000000011102230246251565404236316680908203126",
	} {
		checkNumber(t, text)
	}
}

// TestEveryByte puts each byte in each place among digits.
func TestEveryByte(t *testing.T) {
	for c := range 256 {
		for at := range 18 {
			text := []byte("123456789012345678")
			text[at] = byte(c)
			checkNumber(t, string(text))
			text[(at+3)%18] = '.'
			checkNumber(t, string(text))
		}
	}
}

// TestNumberRandom compares with strconv on the kinds of number a table holds, and on all bit patterns.
func TestNumberRandom(t *testing.T) {
	n := 100_000
	if testing.Short() {
		n = 30_000
	}
	// Nineteen digits just below a power of two: the mantissa rounds up to the next binade.
	for k := -200; k <= 200; k++ {
		text := []byte(strconv.FormatFloat(math.Ldexp(1, k), 'e', 18, 64))
		for i := len("1.000000000000000000") - 1; text[i] != '.'; i-- {
			if text[i] > '0' {
				text[i]--
				break
			}
			text[i] = '9'
		}
		checkNumber(t, string(text))
	}
	r := rand.New(rand.NewPCG(71, 3))
	for range n {
		x := math.Float64frombits(r.Uint64())
		if !math.IsNaN(x) && !math.IsInf(x, 0) {
			checkNumber(t, strconv.FormatFloat(x, 'g', -1, 64))
		}
		y := r.NormFloat64() * math.Pow(10, float64(r.IntN(30)-15))
		checkNumber(t, strconv.FormatFloat(y, 'f', -1, 64))
		checkNumber(t, strconv.FormatFloat(y, 'f', r.IntN(20), 64))
		checkNumber(t, strconv.FormatFloat(y, 'e', r.IntN(20), 64))
		// The middle of two float64, and one digit off it: where rounding is hardest.
		m := r.Uint64N(1<<53) | 1<<52
		checkNumber(t, strconv.FormatUint(m<<1|1, 10)+"e"+strconv.Itoa(r.IntN(40)-20))
		checkNumber(t, strconv.FormatUint(r.Uint64(), 10)+"e"+strconv.Itoa(r.IntN(140)-70))
	}
}

// TestNumberRefusesPlantedErrors sees to it that checkNumber's oracle can fail: a value one unit off is noticed.
func TestNumberRefusesPlantedErrors(t *testing.T) {
	for _, exp := range []int{-60, -30, -23, 23, 30, 60} {
		v, ok := decimalValue(12345678901234567, exp)
		if !ok {
			t.Fatalf("exponent %d is not in the table", exp)
		}
		want, _ := strconv.ParseFloat("12345678901234567e"+strconv.Itoa(exp), 64)
		if v != want {
			t.Errorf("exponent %d: %v, want %v", exp, v, want)
		}
		saved := powers[exp-minPower]
		powers[exp-minPower].hi += 1 << 12
		if off, ok := decimalValue(12345678901234567, exp); ok && off == want {
			t.Errorf("exponent %d: a wrong power goes unnoticed", exp)
		}
		powers[exp-minPower] = saved
	}
}

func FuzzNumber(f *testing.F) {
	for _, s := range []string{"1", "-1.5e3", "1_0", "0x1", "9007199254740993", "1e400", ".5", "12345678.87654321"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if len(text) < 400 { // strconv cuts mantissas of more than 800 digits; nothing else changes with length
			checkNumber(t, text)
		}
	})
}
