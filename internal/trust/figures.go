package trust

import (
	"math"
	"math/rand/v2"
	"slices"
)

// ClassFigures say how good probabilities are on rows whose class is known.
type ClassFigures struct {
	Count    int     // rows
	Accuracy float64 // share of rows whose most likely class is right
	LogLoss  float64 // mean of -ln p of the right class, nats
	Brier    float64 // mean over rows of sum over classes of (p - [right])^2, in [0, 2]
	ECE      float64 // expected calibration error of the leading probability, ten bins of equal width
	// ECEFloor is the mean calibration error that as many rows with the same probabilities would show if every
	// probability were exactly right: what chance alone makes. An ECE near it is no fault found.
	ECEFloor float64
	Bins     []CalibrationBin // those that hold a row, in order
}

// CalibrationBin is a point of the calibration plot.
type CalibrationBin struct {
	Low, High  float64 // limits of the leading probability
	Count      int
	Confidence float64 // mean leading probability
	Accuracy   float64 // share right
}

const calibrationBins = 10

// MeasureClasses compares probabilities (n by C) with the right classes.
func MeasureClasses(prob [][]float64, right []int) ClassFigures {
	f := ClassFigures{Count: len(prob)}
	if len(prob) == 0 {
		return f
	}
	lead := make([]float64, len(prob))
	hit := make([]bool, len(prob))
	n := float64(len(prob))
	for i, p := range prob {
		best := 0
		for c, v := range p {
			d := v
			if c == right[i] {
				d = v - 1
			}
			f.Brier += d * d / n
			if v > p[best] {
				best = c
			}
		}
		lead[i], hit[i] = p[best], best == right[i]
		if hit[i] {
			f.Accuracy += 1 / n
		}
		f.LogLoss -= math.Log(max(p[right[i]], 1e-300)) / n
	}
	f.Bins = reliability(lead, hit)
	f.ECE = calibrationError(f.Bins, len(lead))
	f.ECEFloor = chanceError(lead)
	return f
}

// bin of a leading probability: (k/10, (k+1)/10], as scikit-learn's calibration_curve, with 0 in the first.
func bin(p float64) int {
	return min(max(int(math.Ceil(p*calibrationBins))-1, 0), calibrationBins-1)
}

func reliability(lead []float64, hit []bool) []CalibrationBin {
	bins := make([]CalibrationBin, calibrationBins)
	for i, p := range lead {
		b := &bins[bin(p)]
		b.Count++
		b.Confidence += p
		if hit[i] {
			b.Accuracy++
		}
	}
	kept := bins[:0]
	for k, b := range bins {
		if b.Count == 0 {
			continue
		}
		b.Low, b.High = float64(k)/calibrationBins, float64(k+1)/calibrationBins
		b.Confidence /= float64(b.Count)
		b.Accuracy /= float64(b.Count)
		kept = append(kept, b)
	}
	return kept
}

// calibrationError is sum over bins of n_b/n |accuracy - confidence| (Naeini, Cooper and Hauskrecht 2015).
func calibrationError(bins []CalibrationBin, n int) float64 {
	var e float64
	for _, b := range bins {
		e += float64(float64(b.Count) / float64(n) * math.Abs(b.Accuracy-b.Confidence))
	}
	return e
}

// chanceError simulates the calibration error of rows that are right with exactly their leading probability. Past a
// few thousand rows it is nearly nothing and is simulated on as many rows drawn evenly.
func chanceError(lead []float64) float64 {
	const draws, most = 200, 4000
	lead = slices.Clone(lead)
	slices.Sort(lead)
	n := len(lead)
	if n > most {
		few := make([]float64, most)
		for k := range few {
			few[k] = lead[k*n/most]
		}
		shrink := math.Sqrt(float64(most) / float64(n))
		return shrink * chanceError(few)
	}
	r := rand.New(rand.NewPCG(1, uint64(n)))
	hit := make([]bool, n)
	var sum float64
	for range draws {
		for i, p := range lead {
			hit[i] = float64(r.Uint64()>>11)/(1<<53) < p
		}
		sum += calibrationError(reliability(lead, hit), n)
	}
	return sum / draws
}

// leaveOneOut measures the calibration with each label's own likelihood taken out of the weights of its temperature.
func leaveOneOut(q [][]float64, given []int, grid, post []float64, like [][]float64) ClassFigures {
	prob := make([][]float64, len(q))
	without := make([]float64, len(grid))
	for i, row := range q {
		for g := range grid {
			without[g] = post[g] - like[i][g]
		}
		w := normalise(without)
		prob[i] = make([]float64, len(row))
		for g, beta := range grid {
			if w[g] < 1e-12 {
				continue
			}
			for c := range row {
				prob[i][c] += w[g] * math.Exp(logSoftmax(row, beta, c))
			}
		}
	}
	return MeasureClasses(prob, given)
}

// Nested gives left-out answers that are honest about a choice among candidates (several p, bandwidths, balances): for
// each label, the candidate is chosen by the loss of the other labels alone and its answer taken. leftOut[m] are the
// left-out answers of candidate m, each l by C; loss[m][i] is its loss at label i (lower is better; NaN counts as the
// worst). It gives the answers and which candidate each label took.
func Nested(leftOut [][][]float64, loss [][]float64) (answers [][]float64, pick []int) {
	if len(leftOut) == 0 {
		return nil, nil
	}
	l := len(leftOut[0])
	total := make([]float64, len(loss))
	bad := make([]int, len(loss)) // losses that are not numbers
	for m, row := range loss {
		for _, v := range row {
			if math.IsNaN(v) {
				bad[m]++
			} else {
				total[m] += v
			}
		}
	}
	answers, pick = make([][]float64, l), make([]int, l)
	for i := range l {
		best, least, fewest := 0, math.Inf(1), math.MaxInt
		for m, row := range loss {
			t, b := total[m], bad[m]
			if math.IsNaN(row[i]) {
				b--
			} else {
				t -= row[i]
			}
			if b < fewest || b == fewest && t < least {
				best, least, fewest = m, t, b
			}
		}
		answers[i], pick[i] = leftOut[best][i], best
	}
	return answers, pick
}
