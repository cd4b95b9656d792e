package solve

import (
	"math"

	"pinfill/internal/testproblems"
)

// knnProblem is a k-nearest-neighbour graph of n points in d dimensions with l labels: of two classes, or numbers.
func knnProblem(seed uint64, n, d, l int, classes bool) Problem {
	p := problemOf(testproblems.Cloud(seed, n, d, 10, l))
	if classes {
		for k := range p.Values {
			p.Values[k] = math.Round(p.Values[k])
		}
	}
	return p
}
