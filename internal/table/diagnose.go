package table

import (
	"bytes"
	"fmt"
	"regexp"
	"strings"
	"unicode"
	"unicode/utf8"
)

var (
	// A digit, a comma or full stop, digits: a number with the other decimal sign.
	otherDecimal = regexp.MustCompile(`^[+-]?[0-9]*[.,][0-9]+([eE][+-]?[0-9]+)?$|^[+-]?[0-9]+[.,]([eE][+-]?[0-9]+)?$`)
	// Groups of three behind one to three digits, with any of the separators of thousands in use, U+00A0 and U+202F among them.
	thousands   = regexp.MustCompile("^[+-]?[0-9]{1,3}([ ,.'_\u00a0\u202f\u2019][0-9]{3})+([.,][0-9]*)?$")
	underscores = regexp.MustCompile(`^[+-]?[0-9]+(_[0-9]+)+(\.[0-9]*)?([eE][+-]?[0-9]+)?$`)
	hexadecimal = regexp.MustCompile(`(?i)^[+-]?0[xbo][0-9a-f_.]+(p[+-]?[0-9]+)?$`)
	nonFinite   = regexp.MustCompile(`(?i)^[+-]?(inf|infinity|∞|nan|1\.#(inf|qnan|ind))$`)
	dateLike    = regexp.MustCompile(`^[0-9]{1,4}[-/.][0-9]{1,2}[-/.][0-9]{1,4}([T ].*)?$|^[0-9]{1,2}:[0-9]{2}(:[0-9.]+)?$`)
)

// missingWords are what people write for no value, in lower case.
var missingWords = []string{"na", "n/a", "#n/a", "null", "none", "nil", "missing", "unknown", "?", "-", "--", ".", "*"}

// diagnose says which row of the catalogue a cell that is not a number belongs to, and what to do about it. cell is
// trimmed and not empty.
func diagnose(cell []byte, decimal byte, err NumberError, column string) (code, message, hint string) {
	drop := "leave the column out with --ignore=" + column
	switch err {
	case Overflow:
		return "C27", err.Error(), "rescale the column"
	case Underflow:
		return "C28", err.Error(), "write 0 if that is meant, or rescale the column"
	}
	const longest = 400 // no damaged number is longer, and patterns take their time
	if len(cell) > longest {
		return "C25", err.Error(), drop
	}
	text := string(cell)
	if c, m, h := oddCharacter(text); c != "" {
		return c, m, h
	}
	other := byte(',')
	if decimal == ',' {
		other = '.'
	}
	switch {
	case nonFinite.MatchString(text):
		return "C26", "not a finite number", "pass --na=" + text + " if it means missing"
	case hexadecimal.MatchString(text):
		return "C26", "not a decimal number", "write it in decimal digits"
	case isMissingWord(text):
		return "C26", "not a number", "pass --na=" + shellWord(text) + " if it means missing"
	case dateLike.MatchString(text):
		return "C25", "a date or time, not a number", drop
	case thousands.MatchString(text) || underscores.MatchString(text):
		return "C24", "not a number: separators of thousands are not taken", "write plain digits"
	case otherDecimal.MatchString(text):
		return "C23", "not a number", fmt.Sprintf("if the %s is a decimal point pass --decimal=%c", signName(other), other)
	case strings.HasSuffix(text, "%"):
		return "C25", "a percentage, not a number", "write the number alone, or " + drop
	}
	if v, n, e := scanNumber(cell, 0, decimal); e == 0 && n < len(cell) && v == v && unicode.IsLetter(firstRune(bytes.TrimLeft(cell[n:], " \t"))) {
		return "C25", fmt.Sprintf("a number with a unit (%s), not a number", bytes.TrimLeft(cell[n:], " \t")), "write the number alone, or " + drop
	}
	return "C25", "not a number", drop
}

func firstRune(b []byte) rune {
	r, _ := utf8.DecodeRune(b)
	return r
}

func signName(sign byte) string {
	if sign == ',' {
		return "comma"
	}
	return "full stop"
}

func isMissingWord(text string) bool {
	lower := strings.ToLower(text)
	for _, w := range missingWords {
		if lower == w {
			return true
		}
	}
	return false
}

// shellWord quotes a text that a shell would expand.
func shellWord(text string) string {
	if strings.ContainsAny(text, "?*#'\"$ ") {
		return "'" + text + "'"
	}
	return text
}

// oddCharacter finds the first character that looks like one of the grammar but is another: a typographic minus, digits
// of another script, a space that does not break.
func oddCharacter(text string) (code, message, hint string) {
	for _, r := range text {
		name := ""
		switch {
		case r < 0x80:
			continue
		case r == '\u2212' || r == '\u2010' || r == '\u2011' || r == '\u2012' || r == '\u2013' || r == '\ufe63' || r == '\uff0d':
			name = "looks like a minus sign"
			hint = "write the ASCII minus '-'"
		case unicode.Is(unicode.Nd, r):
			name = "is a digit of another script"
			hint = "write the digits 0 to 9"
		case unicode.IsSpace(r) || r == '\u200b' || r == '\ufeff' || r == '\u2060':
			if thousands.MatchString(text) {
				continue
			}
			return "C30", fmt.Sprintf("not a number: U+%04X is a space that is not trimmed", r), "remove the character"
		default:
			return "", "", ""
		}
		return "C31", fmt.Sprintf("not a number: U+%04X %s", r, name), hint
	}
	return "", "", ""
}
