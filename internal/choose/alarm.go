package choose

import (
	"fmt"
	"math"
)

// Alarms. Spikiness raises none by itself: set against loss (docs/choosing-p.md) it does not tell a p that could be
// bettered from a table on which no p does better. A bulk below bulkAlarm leaves the order of the scores to differences
// that hardly rise above the labels' own spikes; the figure is a choice, not a finding. A class whose share of the decisions is less than a fifth of its share
// of the labels, or more than five times, is worth a look whatever the reason.
const (
	bulkAlarm  = 0.1
	shareAlarm = 5
)

// alarms says what in a chosen setting a user should know and what to change.
func (s *Score) alarms(l Labels) []string {
	var out []string
	if l.Task == Numbers && s.Bulk < bulkAlarm {
		out = append(out, fmt.Sprintf("the answers span only %.0f%% of the labels' range: they are near one value, and hardly depend on the features; a larger p or more labels would help", 100*s.Bulk))
	}
	if l.Task == Classes && s.Bulk < bulkAlarm {
		out = append(out, fmt.Sprintf("the class scores hardly differ from row to row (spread %.2f, below %.1f): decisions rest on the balance of the classes; more labels would help", s.Bulk, bulkAlarm))
	}
	if l.Task != Classes || len(s.Shares) < 2 {
		return out
	}
	counts, all := l.PerClass(), 0
	for _, n := range counts {
		all += n
	}
	far, at := 1.0, -1
	for c, n := range counts {
		if n == 0 {
			continue
		}
		ratio := s.Shares[c] * float64(all) / float64(n)
		if f := max(ratio, 1/max(ratio, 1e-6)); f > far {
			far, at = f, c
		}
	}
	if far > shareAlarm {
		out = append(out, fmt.Sprintf("one class takes %.2g%% of the unlabelled rows against %.2g%% of the labels: see whether its labels stand for all of it, or give --balance",
			100*s.Shares[at], 100*float64(counts[at])/float64(all)))
	}
	if math.IsNaN(s.Error) || l.Task != Classes {
		return out
	}
	if chance := 1 - float64(most(counts))/float64(all); s.LeftOut >= 10 && s.Error >= chance {
		out = append(out, fmt.Sprintf("left out, labels are told wrong as often (%.0f%%) as by always naming the commonest class: the features may not carry the classes", 100*s.Error))
	}
	return out
}

func most(n []int) int {
	m := 0
	for _, v := range n {
		m = max(m, v)
	}
	return m
}
