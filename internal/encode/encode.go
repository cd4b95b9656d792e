// Package encode stands between the table's text and the numbers of the model: feature columns become points, label
// cells become classes or numbers, an edge table becomes edges, and results become the columns written back.
// Everything it refuses names the file, line, column and value it was found at.
package encode

import "strings"

// Warning is something the user should know that did not stop the run.
type Warning struct {
	Code string `json:"code"` // row of the catalogue of bad input, or ""
	Text string `json:"text"`
}

// Task is what kind of label the table holds.
type Task string

// Kinds of label.
const (
	TaskAuto Task = ""        // decided by content
	Classes  Task = "classes" // names
	Numbers  Task = "numbers" // measurements
)

// Missing says what to do with a missing feature.
type Missing string

// Ways to treat a missing feature.
const (
	MissingStop   Missing = "stop"   // refuse, naming the cell
	MissingMedian Missing = "median" // put the column's median
	MissingDrop   Missing = "drop"   // leave the row out of the graph; it comes back blank
)

// Conflicts says what to do with identical points whose labels differ.
type Conflicts string

// Ways to treat identical points with different labels.
const (
	ConflictsStop     Conflicts = "stop"
	ConflictsMajority Conflicts = "majority"
	ConflictsMean     Conflicts = "mean"
)

// Balance says which shares the classes are expected to have among the unlabelled rows.
type Balance struct {
	Mode   string             // auto, uniform, labels, none or shares
	Shares map[string]float64 // class name -> share, for mode shares
}

// Nearest finds the candidate with the smallest edit distance to name, when it is close enough to be a slip: at most
// a third of the name's length, and at least 1.
func Nearest(name string, candidates []string) (string, bool) {
	best, bestDist := "", max(1, len(name)/3)+1
	for _, c := range candidates {
		if d := editDistance(strings.ToLower(name), strings.ToLower(c), bestDist); d < bestDist {
			best, bestDist = c, d
		}
	}
	return best, best != ""
}

// editDistance is the optimal-string-alignment distance (insert, delete, replace, swap neighbours), cut at limit.
func editDistance(a, b string, limit int) int {
	ra, rb := []rune(a), []rune(b)
	if d := len(ra) - len(rb); d >= limit || -d >= limit {
		return limit
	}
	before, prev, cur := make([]int, len(rb)+1), make([]int, len(rb)+1), make([]int, len(rb)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := 1; i <= len(ra); i++ {
		cur[0] = i
		for j := 1; j <= len(rb); j++ {
			cost := 1
			if ra[i-1] == rb[j-1] {
				cost = 0
			}
			cur[j] = min(prev[j]+1, cur[j-1]+1, prev[j-1]+cost)
			if i > 1 && j > 1 && ra[i-1] == rb[j-2] && ra[i-2] == rb[j-1] {
				cur[j] = min(cur[j], before[j-2]+1)
			}
		}
		before, prev, cur = prev, cur, before
	}
	return prev[len(rb)]
}
