// Package advise says which given labels to doubt and which rows to label next.
//
// AuditClasses and AuditNumbers rank the given labels by how strongly the others dispute them, with the labels that
// say so; SteepestPair names the two labels that force the steepest slope at p = inf; Conflicts finds labels that
// disagree at one place. Next picks the vertices whose labels would settle most of what is in doubt.
//
// Vertices, labels and classes are numbers; weights of a graph are conductances c (w^2 in the slope convention) unless
// said otherwise.
package advise

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// Doubt is a given label with what the others say of it.
type Doubt struct {
	Label    int     // index of the label
	Given    float64 // value, or class
	Says     float64 // value or class that the others give it; NaN if they say nothing
	Support  float64 // classes: probability of the given class by the others; numbers: studentised residual, signed as given - says
	Strength float64 // what the list is sorted by, larger is more doubtful: classes ln(p of the best other / p of the given); numbers |Support|
	P        float64 // probability of a label at least this odd at one place if all labels are right
	Adjusted float64 // the same for a list of so many labels, by Holm (1979), at most 1
	Voices   []Voice // labels that say so, strongest first
}

// Voice is the part a label has in what is said of another.
type Voice struct {
	Label  int     // index of the label
	Weight float64 // share, all voices sum to 1: probability that a walk from the doubted label ends here
}

// mostVoices is how many voices a doubt names.
const mostVoices = 5

// voices gives the labels that decide what is said of label i when it is hidden: h_j^(-i)(i) = -S_ij / S_ii, with S
// the Schur complement of the Laplacian on the labels (p = 2). agree, if not nil, says which labels to name.
func voices(schur mat.Symmetric, i int, agree func(j int) bool) []Voice {
	if schur == nil || !(schur.At(i, i) > 0) {
		return nil
	}
	var v []Voice
	for j := range schur.SymmetricDim() {
		if w := -schur.At(i, j) / schur.At(i, i); j != i && w > 0 && (agree == nil || agree(j)) {
			v = append(v, Voice{Label: j, Weight: w})
		}
	}
	slices.SortStableFunc(v, func(a, b Voice) int { return descending(a.Weight, b.Weight) })
	return v[:min(len(v), mostVoices)]
}

// descending compares for a sort with the largest first and NaN last.
func descending(a, b float64) int {
	switch {
	case a > b || math.IsNaN(b) && !math.IsNaN(a):
		return -1
	case a < b || math.IsNaN(a) && !math.IsNaN(b):
		return 1
	}
	return 0
}

// rankDoubts adjusts the p-values for the number of looks and sorts, most doubtful first, equals by label.
func rankDoubts(d []Doubt) []Doubt {
	order := make([]int, len(d))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return descending(d[b].P, d[a].P) })
	// Holm: the k-th smallest of m is multiplied by m - k + 1, then made increasing.
	looks := 0
	for i := range d {
		if !math.IsNaN(d[i].P) {
			looks++
		}
	}
	running, k := 0.0, 0
	for _, i := range order {
		if math.IsNaN(d[i].P) {
			d[i].Adjusted = math.NaN()
			continue
		}
		running = max(running, min(1, d[i].P*float64(looks-k)))
		d[i].Adjusted = running
		k++
	}
	slices.SortStableFunc(d, func(a, b Doubt) int { return descending(a.Strength, b.Strength) })
	return d
}

// Conflicts lists the places that carry labels which disagree: for each vertex with more than one class among its
// labels, the labels there, in order. vertex and class hold one entry a label.
func Conflicts(vertex []int32, class []int) [][]int {
	order := make([]int, len(vertex))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return int(vertex[a]) - int(vertex[b]) })
	var out [][]int
	for lo := 0; lo < len(order); {
		hi, mixed := lo, false
		for hi < len(order) && vertex[order[hi]] == vertex[order[lo]] {
			mixed = mixed || class[order[hi]] != class[order[lo]]
			hi++
		}
		if mixed {
			out = append(out, slices.Clone(order[lo:hi]))
		}
		lo = hi
	}
	return out
}
