package solve

import "fmt"

// Status says how a solve ended.
type Status int

const (
	// Certified means that every figure of the certificate is within its tolerance.
	Certified Status = iota
	// Missed means that the values are the best found and their certificate misses the tolerance.
	Missed
	// Trivial means that nothing had to be solved: no free vertex, or all labels equal.
	Trivial
	// Stopped means that the solve was ended from outside before it had values.
	Stopped
	// Rough means that the values are near the minimiser, as asked, and that nothing was certified.
	Rough
)

// statuses has the name and the sentence of each Status, in order.
var statuses = [...]struct{ name, sentence string }{
	Certified: {"certified", "the values are proven to lie within the tolerance of the minimiser"},
	Missed:    {"missed", "the values are the best found, but their certificate misses the tolerance"},
	Trivial:   {"trivial", "nothing had to be solved: no free vertex, or all given values equal"},
	Stopped:   {"stopped", "the solve was ended by a limit or a signal before it had values"},
	Rough:     {"rough", "the values are near the minimiser, as asked; nothing was certified"},
}

// String is the name of the status, one lower-case word.
func (s Status) String() string {
	if s < 0 || int(s) >= len(statuses) {
		return fmt.Sprintf("Status(%d)", int(s))
	}
	return statuses[s].name
}

// Sentence says what the status means.
func (s Status) Sentence() string {
	if s < 0 || int(s) >= len(statuses) {
		return "the status is unknown"
	}
	return statuses[s].sentence
}

// Proven says whether the values may be used without a warning.
func (s Status) Proven() bool { return s == Certified || s == Trivial }
