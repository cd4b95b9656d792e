package advise

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// AuditClasses ranks given classes by what the other labels say. prob[i] are the probabilities of the classes at label
// i without it (calibrated, from trust; a row with NaN is no answer). schur is the Schur complement of the Laplacian
// on the labels, for the voices, or nil.
//
// P is the total probability of the classes that are no likelier than the given one: the p-value of an exact test of
// one draw. It is as right as the probabilities are.
func AuditClasses(given []int, prob [][]float64, schur mat.Symmetric) ([]Doubt, error) {
	if len(prob) != len(given) || schur != nil && schur.SymmetricDim() != len(given) {
		return nil, fmt.Errorf("%d left-out answers for %d labels, or a Schur complement of another size", len(prob), len(given))
	}
	d := make([]Doubt, len(given))
	for i, g := range given {
		if g < 0 || g >= len(prob[i]) {
			return nil, fmt.Errorf("label %d: class %d of %d", i, g, len(prob[i]))
		}
		p := prob[i]
		own, best, other := p[g], 0, 0.0
		var tail float64
		silent := false
		for c, v := range p {
			silent = silent || math.IsNaN(v)
			if v > p[best] {
				best = c
			}
			if c != g {
				other = max(other, v)
			}
			if v <= own {
				tail += v
			}
		}
		nan := math.NaN()
		d[i] = Doubt{Label: i, Given: float64(g), Says: nan, Support: nan, Strength: nan, P: nan, Adjusted: nan}
		if silent {
			continue
		}
		const tiny = 1e-300
		d[i].Says, d[i].Support = float64(best), own
		d[i].Strength = math.Log(max(other, tiny)) - math.Log(max(own, tiny))
		d[i].P = min(tail, 1)
		d[i].Voices = voices(schur, i, func(j int) bool { return given[j] == best })
	}
	return rankDoubts(d), nil
}

// AuditNumbers ranks given numbers by their studentised left-out residual under the Gaussian field whose precision on
// the labels is the Schur complement S, up to a factor sigma^2: with current (S y)_i,
//
//	t_i = (S y)_i / sqrt(S_ii s_i^2),  s_i^2 = (y' S y - (S y)_i^2 / S_ii) / (l - 2),
//
// which follows Student's t with l - 2 degrees of freedom if all labels are right (externally studentised residual,
// Cook and Weisberg 1982, section 2.2, for the field with unknown mean and scale). What the others say of label i is
// y_i - (S y)_i / S_ii. It needs at least three labels.
func AuditNumbers(given []float64, schur mat.Symmetric) ([]Doubt, error) {
	l := len(given)
	if schur == nil || schur.SymmetricDim() != l {
		return nil, fmt.Errorf("%d labels and no Schur complement of that size", l)
	}
	// Residuals in place of y: S 1 = 0, and digits do not cancel.
	current := make([]float64, l)
	var energy float64
	for i := range l {
		for j := range l {
			if j != i {
				current[i] -= schur.At(i, j) * (given[i] - given[j])
			}
		}
	}
	for i := range l {
		energy += current[i] * (given[i] - given[0])
	}
	nan := math.NaN()
	d := make([]Doubt, l)
	for i, y := range given {
		d[i] = Doubt{Label: i, Given: y, Says: nan, Support: nan, Strength: nan, P: nan, Adjusted: nan}
		stiff := schur.At(i, i)
		if !(stiff > 0) || l < 3 {
			continue
		}
		d[i].Says = y - current[i]/stiff
		rest := max(energy-current[i]*current[i]/stiff, 0) / float64(l-2)
		switch {
		case rest > 0:
			d[i].Support = current[i] / math.Sqrt(stiff*rest)
		case current[i] == 0:
			d[i].Support = 0
		default:
			d[i].Support = math.Copysign(math.Inf(1), current[i])
		}
		d[i].Strength = math.Abs(d[i].Support)
		d[i].P = 2 * distuv.StudentsT{Mu: 0, Sigma: 1, Nu: float64(l - 2)}.Survival(d[i].Strength)
		d[i].Voices = voices(schur, i, nil)
	}
	return rankDoubts(d), nil
}
