package neighbors

import (
	"math/rand/v2"
	"slices"

	"pinfill/internal/parallel"
)

// projections cuts the points of t along random directions until each part holds at most leaf points, and
// gives the places leaf by leaf with the start of each leaf. A part is cut at the median of the inner products with the
// difference of two of its points, so that the direction follows the data (a variant of the random projection trees of
// Dasgupta and Freund, STOC 2008). Draws depend on seed and the part alone.
func projections(t *tree, leaf int, seed uint64, workers int) (places []int32, starts []int) {
	n := t.pts.N
	places = make([]int32, n)
	for i := range places {
		places[i] = int32(i)
	}
	parts := []int{0, n}
	for level := uint64(0); n>>level > leaf; level++ {
		next := make([]int, 2*len(parts)-1)
		next[len(next)-1] = n
		parallel.For(workers, len(parts)-1, 1, func(v, _ int) {
			lo, hi := parts[v], parts[v+1]
			mid := lo + (hi-lo)/2
			next[2*v], next[2*v+1] = lo, mid
			cutAlong(t, places[lo:hi], rand.New(rand.NewPCG(seed^level<<56, uint64(v))))
		})
		parts = next
	}
	return places, parts
}

// keyed is a place with its position along a direction.
type keyed struct {
	key   float64
	place int32
}

// cutAlong reorders places so that the halves lie on two sides along a random direction.
func cutAlong(t *tree, places []int32, r *rand.Rand) {
	n, d := len(places), t.pts.D
	if n < 2 {
		return
	}
	a := r.IntN(n)
	c := (a + 1 + r.IntN(n-1)) % n
	direction := make([]float64, d)
	x, y := t.pts.Row(int(places[a])), t.pts.Row(int(places[c]))
	for j := range direction {
		direction[j] = x[j] - y[j]
	}
	keys := make([]keyed, n)
	for i, p := range places {
		keys[i] = keyed{inner(direction, t.pts.Row(int(p))), p}
	}
	slices.SortFunc(keys, func(a, b keyed) int {
		switch {
		case a.key < b.key:
			return -1
		case a.key > b.key:
			return 1
		}
		return int(a.place) - int(b.place)
	})
	for i, k := range keys {
		places[i] = k.place
	}
}

// inner is the inner product, summed in the manner of squared.
func inner(a, b []float64) float64 {
	var s0, s1, s2, s3 float64
	b = b[:len(a)]
	for len(a) >= 4 && len(b) >= 4 {
		s0 += float64(a[0] * b[0])
		s1 += float64(a[1] * b[1])
		s2 += float64(a[2] * b[2])
		s3 += float64(a[3] * b[3])
		a, b = a[4:], b[4:]
	}
	for j, v := range a {
		s0 += float64(v * b[j])
	}
	return (s0 + s1) + (s2 + s3)
}
