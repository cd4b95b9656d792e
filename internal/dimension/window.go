package dimension

import (
	"fmt"
	"math"
)

// The admissible window. Slepcev and Thorpe (2019) show that p-Laplacian interpolation with few labels has a
// continuous limit that takes the labels' values only if p exceeds the dimension d and the graph's radius h obeys
// (ln n/n)^(1/d) << h << n^(-1/p). With k = n h^d neighbours within h this reads ln n << k << n^(1-d/p). Constants are
// taken as 1 throughout: the window is a guide, its ends are not sharp.

// PMin is the p at which k neighbours are the upper end of the window for n vertices of dimension d:
// d ln n / ln(n/k), always above d. It is +Inf for k >= n.
func PMin(n int, d, k float64) float64 {
	if !(k < float64(n)) {
		return math.Inf(1)
	}
	return d * math.Log(float64(n)) / math.Log(float64(n)/max(k, 1))
}

// Range gives the window of k at p, ln n to n^(1-d/p); it is empty where low >= high. p may be +Inf, where high = n.
func Range(n int, d, p float64) (low, high float64) {
	return math.Log(float64(n)), math.Pow(float64(n), 1-d/p)
}

// Reason is one way in which a setting falls outside the window.
type Reason int

// The reasons.
const (
	TooFewNeighbours   Reason = iota // k below ln n
	TooManyNeighbours                // k above n^(1-d/p), with p > d
	PBelowDimension                  // p <= d: no number of neighbours will do
	EmptyWindow                      // p > d, but n is too small for any k at this p
	DimensionUncertain               // inside or outside by the estimate, the other at an end of its span
)

var sentences = []string{
	"fewer neighbours than ln n: the graph is likely to fall apart or to hang together by single edges",
	"more neighbours than n^(1-d/p): labels show as spikes, the rest of the rows goes to nearly one value; raise p or take fewer neighbours",
	"p is not above the dimension: as rows are added labels come to show as spikes, whatever the neighbours; raise p above the dimension",
	"at this p and number of rows no number of neighbours is both enough to connect and few enough to keep labels from showing as spikes",
	"the estimate of the dimension is too loose to say whether this setting is inside the window",
}

// String gives the reason in a sentence.
func (r Reason) String() string {
	if r < 0 || int(r) >= len(sentences) {
		return fmt.Sprintf("reason %d", int(r))
	}
	return sentences[r]
}

// Verdict judges one pair of k and p.
type Verdict struct {
	K, P      float64
	Low, High float64 // window of k at p, for the estimate of the dimension
	PMin      float64 // least p that k allows
	Inside    bool
	Reasons   []Reason // empty where the setting is inside for the whole span of the dimension
}

// Judge says whether k neighbours at exponent p are inside the window of n vertices whose dimension is r.
func Judge(n int, r Result, k, p float64) Verdict {
	v := Verdict{K: k, P: p, PMin: PMin(n, r.Value, k)}
	v.Low, v.High = Range(n, r.Value, p)
	v.Inside = inside(n, r.Value, k, p)
	if k < v.Low {
		v.Reasons = append(v.Reasons, TooFewNeighbours)
	}
	switch {
	case p <= r.Value:
		v.Reasons = append(v.Reasons, PBelowDimension)
	case v.Low >= v.High:
		v.Reasons = append(v.Reasons, EmptyWindow)
	case k > v.High:
		v.Reasons = append(v.Reasons, TooManyNeighbours)
	}
	if inside(n, r.Low, k, p) != v.Inside || inside(n, r.High, k, p) != v.Inside {
		v.Reasons = append(v.Reasons, DimensionUncertain)
	}
	return v
}

func inside(n int, d, k, p float64) bool {
	low, high := Range(n, d, p)
	return k >= low && k <= high
}
