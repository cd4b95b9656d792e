package neighbors

import (
	"math"

	"pinfill/internal/points"
)

// A closeness is what searches compare: the squared Euclidean distance, or the L1 distance. Each is summed in one fixed
// order, four sums over every fourth coordinate and the rest added to the first, so that all engines get the same bits
// and closeness(a, b) = closeness(b, a). Products are converted explicitly, which keeps them from being fused into the
// sum on processors that could.

// squared is the squared Euclidean distance.
func squared(a, b []float64) float64 {
	var s0, s1, s2, s3 float64
	b = b[:len(a)]
	for len(a) >= 4 && len(b) >= 4 {
		d0, d1, d2, d3 := a[0]-b[0], a[1]-b[1], a[2]-b[2], a[3]-b[3]
		s0 += float64(d0 * d0)
		s1 += float64(d1 * d1)
		s2 += float64(d2 * d2)
		s3 += float64(d3 * d3)
		a, b = a[4:], b[4:]
	}
	for j, v := range a {
		d := v - b[j]
		s0 += float64(d * d)
	}
	return (s0 + s1) + (s2 + s3)
}

// taxicab is the L1 distance.
func taxicab(a, b []float64) float64 {
	var s0, s1, s2, s3 float64
	b = b[:len(a)]
	for len(a) >= 4 && len(b) >= 4 {
		s0 += math.Abs(a[0] - b[0])
		s1 += math.Abs(a[1] - b[1])
		s2 += math.Abs(a[2] - b[2])
		s3 += math.Abs(a[3] - b[3])
		a, b = a[4:], b[4:]
	}
	for j, v := range a {
		s0 += math.Abs(v - b[j])
	}
	return (s0 + s1) + (s2 + s3)
}

// closeness gives the function that searches compare by.
func closeness(m points.Metric) func(a, b []float64) float64 {
	if m == points.Manhattan {
		return taxicab
	}
	return squared
}

// distances turns what searches compare into distances, in place.
func distances(m points.Metric, c []float64) {
	if m == points.Manhattan {
		return
	}
	for i, v := range c {
		c[i] = math.Sqrt(v)
	}
}

// upTo gives the function that computes closeness as far as it matters: where it exceeds most, the answer is some
// number above most. Partial sums never exceed the whole, rounded as they are, so that stopping early is safe.
func upTo(m points.Metric) func(a, b []float64, most float64) float64 {
	if m == points.Manhattan {
		return func(a, b []float64, _ float64) float64 { return taxicab(a, b) }
	}
	return squaredUpTo
}

// squaredUpTo is squared, or some number above most where squared is.
func squaredUpTo(a, b []float64, most float64) float64 {
	var s0, s1, s2, s3 float64
	b = b[:len(a)]
	for len(a) >= 16 && len(b) >= 16 {
		for j := 0; j < 16; j += 4 {
			d0, d1, d2, d3 := a[j]-b[j], a[j+1]-b[j+1], a[j+2]-b[j+2], a[j+3]-b[j+3]
			s0 += float64(d0 * d0)
			s1 += float64(d1 * d1)
			s2 += float64(d2 * d2)
			s3 += float64(d3 * d3)
		}
		if s := (s0 + s1) + (s2 + s3); s > most {
			return s
		}
		a, b = a[16:], b[16:]
	}
	for len(a) >= 4 && len(b) >= 4 {
		d0, d1, d2, d3 := a[0]-b[0], a[1]-b[1], a[2]-b[2], a[3]-b[3]
		s0 += float64(d0 * d0)
		s1 += float64(d1 * d1)
		s2 += float64(d2 * d2)
		s3 += float64(d3 * d3)
		a, b = a[4:], b[4:]
	}
	for j, v := range a {
		d := v - b[j]
		s0 += float64(d * d)
	}
	return (s0 + s1) + (s2 + s3)
}
