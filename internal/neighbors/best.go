package neighbors

import (
	"slices"

	"pinfill/internal/points"
)

// best collects the k nearest of the points offered to it, nearest first.
type best struct {
	pts   *points.Matrix // the points that index names
	id    []int32        // their numbers for the caller; nil where they are the same
	close []float64      // closeness, increasing, len k
	index []int32
	n     int // found so far
	worst float64
}

// reset empties b for len(close) = len(index) = k results.
func (b *best) reset(close []float64, index []int32, inf float64) {
	b.close, b.index, b.n, b.worst = close, index, 0, inf
}

// offer puts point i at closeness c <= b.worst where it belongs, and gives the new b.worst.
func (b *best) offer(c float64, i int32) float64 {
	if b.n == len(b.close) {
		if c == b.worst && !b.before(i, b.index[b.n-1]) {
			return b.worst
		}
	} else {
		b.n++
	}
	j := b.n - 1
	for j > 0 && (c < b.close[j-1] || (c == b.close[j-1] && b.before(i, b.index[j-1]))) {
		b.close[j], b.index[j] = b.close[j-1], b.index[j-1]
		j--
	}
	b.close[j], b.index[j] = c, i
	if b.n == len(b.close) {
		b.worst = b.close[b.n-1]
	}
	return b.worst
}

// before settles ties: lexicographically by coordinates, identical points by number.
func (b *best) before(i, j int32) bool {
	if c := slices.Compare(b.pts.Row(int(i)), b.pts.Row(int(j))); c != 0 {
		return c < 0
	}
	if b.id != nil {
		return b.id[i] < b.id[j]
	}
	return i < j
}
