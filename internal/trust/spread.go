package trust

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Spread measures how far the labels that a row hears of disagree: the standard deviation of the label at which a
// random walk from the row ends, V(x)^2 = sum_i h_i(x) (y_i - m(x))^2 with h the harmonic measures and m = sum_i h_i y_i.
// It takes two solves, whatever the number of labels: values and squares.
//
// mean and square are the harmonic extensions (p = 2) of y - shift and of (y - shift)^2, one value a vertex; shift
// is best the mean of y, so that no digits cancel. The answer is one value a vertex, >= 0, NaN where there is none.
func Spread(mean, square []float64) ([]float64, error) {
	if len(mean) != len(square) {
		return nil, fmt.Errorf("%d means and %d squares", len(mean), len(square))
	}
	v := make([]float64, len(mean))
	for i, m := range mean {
		v[i] = deviation(m, square[i])
	}
	return v, nil
}

// LeftOutSpread is the spread at each label when its own label is hidden, from the Schur complement S of the Laplacian
// on the labels: the walk from label i ends at label j with probability -S_ij / S_ii. NaN for a label without others.
func LeftOutSpread(schur mat.Symmetric, given []float64) ([]float64, error) {
	l := len(given)
	if schur.SymmetricDim() != l {
		return nil, fmt.Errorf("the Schur complement of %d labels for %d values", schur.SymmetricDim(), l)
	}
	v := make([]float64, l)
	for i := range l {
		var sum, mean, square float64
		for j := range l {
			if j == i {
				continue
			}
			w := max(-schur.At(i, j), 0)
			d := given[j] - given[i]
			sum += w
			mean += float64(w * d)
			square += float64(w * float64(d*d))
		}
		v[i] = math.NaN()
		if sum > 0 {
			v[i] = deviation(mean/sum, square/sum)
		}
	}
	return v, nil
}

func deviation(mean, square float64) float64 {
	if math.IsNaN(mean) || math.IsNaN(square) {
		return math.NaN()
	}
	return math.Sqrt(max(square-float64(mean*mean), 0))
}
