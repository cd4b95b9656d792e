// Package fault gives every refusal of the program one shape: where it is, what was found there,
// what mends it, and the exit code it leads to.
//
// Packages that read what a user wrote return a *fault.Error (or a *fault.List of them). Numeric packages return
// plain errors and leave it to the caller to say which file and flag they came from.
package fault

import (
	"errors"
	"fmt"
	"strings"
)

// Exit codes of the program. Code 2 is never used: the Go runtime exits 2 on a crash.
const (
	OK          = 0   // done and certified
	Input       = 3   // the input is wrong
	File        = 4   // a file could not be read or written
	Uncertified = 5   // a solve missed its tolerance
	Limit       = 6   // a limit was reached
	Usage       = 64  // the command line is wrong
	Bug         = 70  // a defect of the program
	Signal      = 128 // plus the signal's number
)

// Error is one refusal. The zero values of File, Line, Column, Name and Value mean that there is none to show.
type Error struct {
	Exit    int    // exit code, one of the constants above
	Code    string // row of the catalogue of bad input, like "C23"
	File    string // as the user typed it; "-" is standard input
	Line    int    // 1-based line in File
	Column  int    // 1-based byte column in Line
	Name    string // column name or flag the value belongs to
	Value   string // the value as it stands in the file
	Message string // lower case, no full stop
	Hint    string // what to do, naming the flag that mends it
	Err     error  // the cause, if there is one
}

// Error gives one line: FILE:LINE:COL: column "x": value "v": message; hint [CODE].
func (e *Error) Error() string {
	var b strings.Builder
	if e.File != "" {
		b.WriteString(Name(e.File))
		if e.Line > 0 {
			fmt.Fprintf(&b, ":%d", e.Line)
			if e.Column > 0 {
				fmt.Fprintf(&b, ":%d", e.Column)
			}
		}
		b.WriteString(": ")
	}
	if e.Name != "" {
		fmt.Fprintf(&b, "column %s: ", Quote(e.Name))
	}
	if e.Value != "" {
		fmt.Fprintf(&b, "value %s: ", Quote(e.Value))
	}
	b.WriteString(e.Message)
	if e.Hint != "" {
		b.WriteString("; " + e.Hint)
	}
	if e.Code != "" {
		b.WriteString(" [" + e.Code + "]")
	}
	return b.String()
}

// Unwrap returns the cause.
func (e *Error) Unwrap() error { return e.Err }

// maxValue is the longest piece of a user's value shown in a message, in bytes.
const maxValue = 80

// Quote shows a user's value on one line with control and direction-changing characters escaped, cut at 80 bytes.
func Quote(v string) string {
	if len(v) <= maxValue {
		return fmt.Sprintf("%q", v)
	}
	cut := maxValue
	for cut > 0 && v[cut]&0xC0 == 0x80 { // never cut inside a UTF-8 sequence
		cut--
	}
	return fmt.Sprintf("%q...", v[:cut])
}

// Name shows a file name: bare where it is plain, quoted where it holds spaces, controls or invalid UTF-8.
func Name(path string) string {
	q := fmt.Sprintf("%q", path)
	if q == `"`+path+`"` && !strings.ContainsAny(path, " :") {
		return path
	}
	return q
}

// Usagef is a refusal of the command line.
func Usagef(code, format string, args ...any) *Error {
	return &Error{Exit: Usage, Code: code, Message: fmt.Sprintf(format, args...)}
}

// Inputf is a refusal of the input that has no one position.
func Inputf(code, format string, args ...any) *Error {
	return &Error{Exit: Input, Code: code, Message: fmt.Sprintf(format, args...)}
}

// Limitf is a limit that was reached.
func Limitf(code, format string, args ...any) *Error {
	return &Error{Exit: Limit, Code: code, Message: fmt.Sprintf(format, args...)}
}

// maxListed is the number of messages printed before the rest is counted.
const maxListed = 20

// List collects refusals of one pass over the input; it keeps the first 20 and counts the rest.
type List struct {
	First []*Error
	Total int
}

// Add appends e.
func (l *List) Add(e *Error) {
	if len(l.First) < maxListed {
		l.First = append(l.First, e)
	}
	l.Total++
}

// Err returns nil for an empty list, the list otherwise.
func (l *List) Err() error {
	if l == nil || l.Total == 0 {
		return nil
	}
	return l
}

// Error gives one line a refusal.
func (l *List) Error() string {
	lines := make([]string, 0, len(l.First)+1)
	for _, e := range l.First {
		lines = append(lines, e.Error())
	}
	if more := l.Total - len(l.First); more > 0 {
		lines = append(lines, fmt.Sprintf("and %d more like these", more))
	}
	return strings.Join(lines, "\n")
}

// ExitCode gives the exit code of err: 0 for nil, that of the first *Error inside, or Bug.
func ExitCode(err error) int {
	if err == nil {
		return OK
	}
	var l *List
	if errors.As(err, &l) && len(l.First) > 0 {
		return l.First[0].Exit
	}
	var e *Error
	if errors.As(err, &e) {
		return e.Exit
	}
	return Bug
}
