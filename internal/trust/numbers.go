package trust

import "math"

// NumberFigures say how good answers are on rows whose value is known.
type NumberFigures struct {
	Count int
	RMSE  float64 // root mean square error, units of the label
	MAE   float64 // mean absolute error
	Bias  float64 // mean of answer - truth
	R2    float64 // 1 - sum of squared errors over sum of squares about the mean; NaN for constant truth
}

// MeasureNumbers compares answers with the right values. Pairs with NaN are passed over.
func MeasureNumbers(answer, right []float64) NumberFigures {
	var f NumberFigures
	var sum, square, mean float64
	for i, a := range answer {
		d := a - right[i]
		if math.IsNaN(d) {
			continue
		}
		f.Count++
		f.MAE += math.Abs(d)
		f.Bias += d
		square += float64(d * d)
		mean += right[i]
	}
	if f.Count == 0 {
		nan := math.NaN()
		return NumberFigures{RMSE: nan, MAE: nan, Bias: nan, R2: nan}
	}
	n := float64(f.Count)
	mean /= n
	for i, a := range answer {
		if d := a - right[i]; !math.IsNaN(d) {
			sum += float64((right[i] - mean) * (right[i] - mean))
		}
	}
	f.RMSE, f.MAE, f.Bias = math.Sqrt(square/n), f.MAE/n, f.Bias/n
	f.R2 = math.NaN()
	if sum > 0 {
		f.R2 = 1 - square/sum
	}
	return f
}

// CoverageFigures say how often intervals or sets hold the truth.
type CoverageFigures struct {
	Count   int
	Covered Estimate // share that holds the truth, with the binomial standard error
	Size    float64  // mean width of the intervals, or mean number of classes; infinite if any is
}

// MeasureIntervals compares intervals with the right values. Rows with NaN are passed over.
func MeasureIntervals(low, high, right []float64) CoverageFigures {
	var f CoverageFigures
	var in float64
	for i, r := range right {
		if math.IsNaN(r) || math.IsNaN(low[i]) || math.IsNaN(high[i]) {
			continue
		}
		f.Count++
		f.Size += high[i] - low[i]
		in += indicator(low[i] <= r && r <= high[i])
	}
	return f.over(in)
}

// MeasureSets compares sets with the right classes.
func MeasureSets(sets [][]int32, right []int) CoverageFigures {
	var f CoverageFigures
	var in float64
	for i, set := range sets {
		f.Count++
		f.Size += float64(len(set))
		for _, c := range set {
			if int(c) == right[i] {
				in++
				break
			}
		}
	}
	return f.over(in)
}

func (f CoverageFigures) over(in float64) CoverageFigures {
	n := float64(f.Count)
	p := in / n
	f.Covered = Estimate{p, math.Sqrt(p * (1 - p) / n)}
	f.Size /= n
	return f
}
