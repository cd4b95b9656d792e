package extend

import (
	"math"
	"math/rand/v2"
	"testing"
)

// energy is the p-th root of the one-vertex energy, in logarithms, so that no p overflows.
func energy(logW, f []float64, p, t float64) float64 {
	if math.IsInf(p, 1) {
		var m float64
		for j, v := range f {
			m = max(m, math.Exp(logW[j])*math.Abs(t-v))
		}
		return m
	}
	big := energy(logW, f, math.Inf(1), t)
	if big == 0 {
		return 0
	}
	var s float64
	for j, v := range f {
		s += math.Pow(math.Exp(logW[j])*math.Abs(t-v)/big, p)
	}
	return big * math.Pow(s, 1/p)
}

// golden minimises a unimodal function on [a, b] by golden sections: an oracle that knows nothing of derivatives.
func golden(fn func(float64) float64, a, b float64) float64 {
	g := (math.Sqrt(5) - 1) / 2
	for range 200 {
		c, d := b-g*(b-a), a+g*(b-a)
		if fn(c) < fn(d) {
			b = d
		} else {
			a = c
		}
	}
	return (a + b) / 2
}

func TestVertexMinimisesItsEnergy(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 7))
	for range 200 {
		k := 1 + rng.IntN(12)
		logW, f := make([]float64, k), make([]float64, k)
		for j := range f {
			logW[j], f[j] = -6*rng.Float64(), rng.NormFloat64()
		}
		for _, p := range []float64{1.3, 1.5, 2, 2.5, 3, 4, 8, 32, 200, math.Inf(1)} {
			got := Vertex(logW, f, p)
			at := energy(logW, f, p, got)
			best := at
			for _, x := range []float64{golden(func(x float64) float64 { return energy(logW, f, p, x) }, -5, 5), got - 1e-6, got + 1e-6} {
				best = min(best, energy(logW, f, p, x))
			}
			// The oracle's energies are right to a few units in the last place; nothing may be lower by more.
			if at > best*(1+1e-12) {
				t.Fatalf("p=%v k=%d: value %v has energy %v, found %v", p, k, got, at, best)
			}
		}
	}
}

// A star with a ones and b zeros of unit weight: t/(1+t), t = (a/b)^(1/(p-1)). Closed form from the stationarity
// condition; the limit p = inf is one half.
func TestVertexStar(t *testing.T) {
	for _, c := range []struct{ p, want float64 }{
		{1.5, 1.0 / 26}, {2, 1.0 / 6}, {3, 0.309016994374947}, {4, 1 / (1 + math.Cbrt(5))}, {math.Inf(1), 0.5},
	} {
		got := Vertex(make([]float64, 6), []float64{1, 0, 0, 0, 0, 0}, c.p)
		if math.Abs(got-c.want) > 1e-14 {
			t.Errorf("p=%v: %v, want %v", c.p, got, c.want)
		}
	}
	// p = inf, y = (0, 1, 4), lengths (1, 2, 1): slope 2 between the first and the last, so 2.
	if got := Vertex([]float64{0, -math.Ln2, 0}, []float64{0, 1, 4}, math.Inf(1)); math.Abs(got-2) > 1e-14 {
		t.Errorf("star at p=inf: %v, want 2", got)
	}
}

func TestVertexInvariants(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 9))
	for range 500 {
		k := 2 + rng.IntN(10)
		logW, f, g := make([]float64, k), make([]float64, k), make([]float64, k)
		for j := range f {
			logW[j], f[j] = -3*rng.Float64(), rng.Float64()
			g[j] = 4*f[j] + 1e6
		}
		for _, p := range []float64{1.5, 2, 3, 16, math.Inf(1)} {
			a, b := Vertex(logW, f, p), Vertex(logW, g, p)
			if math.Abs(b-(4*a+1e6)) > 1e-9*4 { // a 1e6 offset leaves about 1e-10 of absolute rounding
				t.Fatalf("p=%v: f(4y+1e6) = %v, 4f(y)+1e6 = %v", p, b, 4*a+1e6)
			}
		}
	}
}

func BenchmarkVertex(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 1))
	logW, f := make([]float64, 10), make([]float64, 10)
	for j := range f {
		logW[j], f[j] = -2*rng.Float64(), rng.Float64()
	}
	for _, p := range []float64{2, 3, 8, math.Inf(1)} {
		b.Run("p="+map[bool]string{true: "inf"}[math.IsInf(p, 1)]+string(rune('0'+int(min(p, 9)))), func(b *testing.B) {
			for b.Loop() {
				Vertex(logW, f, p)
			}
		})
	}
}
