package demo

import (
	"math"
	"math/rand/v2"
)

// Curves and noise from +, -, * and / alone. Every product stands in float64(...), which the language guarantees to
// be rounded, so that no compiler fuses it into a sum.

// uniform draws from [0, 1).
func uniform(r *rand.Rand) float64 { return float64(float64(r.Uint64()>>11) / (1 << 53)) }

// normal draws a value of mean 0 and variance 1, nearly Gaussian: the sum of twelve uniform values less 6.
func normal(r *rand.Rand) float64 {
	s := -6.0
	for range 12 {
		s += uniform(r)
	}
	return s
}

// wave is a smooth wave of period 1 and height 1, made of parabolas: wave(0) = 0, wave(1/4) = 1, wave(3/4) = -1.
func wave(t float64) float64 {
	t -= math.Floor(t)
	if t < 0.5 {
		return float64(16*t) * (0.5 - t)
	}
	return float64(-16*(t-0.5)) * (1 - t)
}

// bump is a hill of height 1 at t = 0, smooth, and 0 from |t| = 1 on.
func bump(t float64) float64 {
	if t <= -1 || t >= 1 {
		return 0
	}
	u := 1 - float64(t*t)
	return float64(u * u)
}

// step rises smoothly from 0 at t <= 0 to 1 at t >= 1.
func step(t float64) float64 {
	t = min(max(t, 0), 1)
	return float64(float64(t*t) * (3 - float64(2*t)))
}

// hypot is the length of (x, y).
func hypot(x, y float64) float64 { return math.Sqrt(float64(x*x) + float64(y*y)) }

// field is a smooth random surface: independent values of mean 0 at the corners of unit squares, eased in between.
type field struct {
	side   int
	corner []float64
}

func newField(r *rand.Rand, side int) *field {
	f := &field{side: side, corner: make([]float64, side*side)}
	for i := range f.corner {
		f.corner[i] = normal(r)
	}
	return f
}

// at is the height of the surface at (x, y), both in [0, side-1).
func (f *field) at(x, y float64) float64 {
	x = min(max(x, 0), float64(f.side)-1.001)
	y = min(max(y, 0), float64(f.side)-1.001)
	i, j := int(x), int(y)
	u, v := step(x-float64(i)), step(y-float64(j))
	k := j*f.side + i
	low := f.corner[k] + float64(u*(f.corner[k+1]-f.corner[k]))
	high := f.corner[k+f.side] + float64(u*(f.corner[k+f.side+1]-f.corner[k+f.side]))
	return low + float64(v*(high-low))
}
