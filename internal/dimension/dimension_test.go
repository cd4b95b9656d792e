package dimension

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/neighbors"
	"pinfill/internal/points"
)

// sample fills a matrix of n points in d columns row by row.
func sample(seed uint64, n, d int, fill func(r *rand.Rand, x []float64)) *points.Matrix {
	r := rand.New(rand.NewPCG(seed, 5417))
	m := points.NewMatrix(n, d)
	for i := range n {
		fill(r, m.Row(i))
	}
	return m
}

func lists(t testing.TB, m *points.Matrix, k int) *neighbors.Lists {
	t.Helper()
	s, err := points.Prepare(context.Background(), m, points.Options{Scale: points.None})
	if err != nil {
		t.Fatal(err)
	}
	l, _, err := neighbors.KNearest(context.Background(), s.Points, min(k, s.Points.N-1), neighbors.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func uniform(r *rand.Rand, x []float64) {
	for j := range x {
		x[j] = r.Float64()
	}
}

func gaussian(r *rand.Rand, x []float64) {
	for j := range x {
		x[j] = r.NormFloat64()
	}
}

// swissRoll is the surface (u cos u, v, u sin u), u in [1.5 pi, 4.5 pi], v in [0, 21].
func swissRoll(r *rand.Rand, x []float64) {
	u := math.Pi * (1.5 + 3*r.Float64())
	x[0], x[1], x[2] = u*math.Cos(u), 21*r.Float64(), u*math.Sin(u)
}

func sphere(r *rand.Rand, x []float64) {
	gaussian(r, x)
	var s float64
	for _, v := range x {
		s += v * v
	}
	for j := range x {
		x[j] /= math.Sqrt(s)
	}
}

// TestSurfacesCubesAndClouds compares both estimators with runs of an independent implementation in Python on data of
// the same kind and size (one draw each), and on the surfaces with the known dimension: Levina and Bickel (2004)
// report 2.1 (standard error 0.02) for the roll, with the average that leans high. Two draws differ by the sampling
// error, about d/sqrt(n) for TwoNN and half that for the likelihood; four of those are allowed.
func TestSurfacesCubesAndClouds(t *testing.T) {
	for _, c := range []struct {
		name       string
		n, d       int
		fill       func(*rand.Rand, []float64)
		likelihood float64
		twoNN      float64
	}{
		{"square", 1000, 2, uniform, 1.98, 2.04},
		{"roll 1e3", 1000, 3, swissRoll, 1.95, 2.11},
		{"roll 5e3", 5000, 3, swissRoll, 1.98, 2.02},
		{"sphere", 2000, 3, sphere, 1.99, 2.02},
		{"cube 5", 2000, 5, uniform, 4.49, 4.59},
		{"cube 10", 2000, 10, uniform, 8.24, 8.66},
		{"cube 20", 2000, 20, uniform, 14.8, 15.8},
		{"cloud 5", 2000, 5, gaussian, 5.00, 5.00},
		{"cloud 10", 2000, 10, gaussian, 9.12, 9.82},
		{"cloud 20", 2000, 20, gaussian, 15.9, 17.9},
	} {
		r, err := Estimate(lists(t, sample(11, c.n, c.d, c.fill), 20), Options{})
		if err != nil {
			t.Fatal(err)
		}
		t.Logf("%-9s MG k=10 %6.3f (%.3f) want %6.2f   TwoNN %6.3f (%.3f) want %6.2f   span %.2f..%.2f", c.name,
			r.Value, r.Likelihood[1].StdError, c.likelihood, r.TwoNN.Value, r.TwoNN.StdError, c.twoNN, r.Low, r.High)
		noise := c.twoNN / math.Sqrt(float64(c.n))
		if e := math.Abs(r.Value - c.likelihood); e > 2*noise+0.01 {
			t.Errorf("%s: likelihood %.3f, reference %.3f", c.name, r.Value, c.likelihood)
		}
		if e := math.Abs(r.TwoNN.Value - c.twoNN); e > 4*noise+0.01 {
			t.Errorf("%s: TwoNN %.3f, reference %.3f", c.name, r.TwoNN.Value, c.twoNN)
		}
		if r.Rounded || r.TiedShare != 0 {
			t.Errorf("%s: continuous data taken for rounded, share %v", c.name, r.TiedShare)
		}
		if r.BiasedLow != (r.Value > lowFrom) || c.d <= 3 && (math.Abs(r.Value-2) > 0.15 || r.Low > 2 || r.High < 2) {
			t.Errorf("%s: %+v", c.name, r)
		}
	}
}

// ideal draws distances whose ratios follow the law that the estimators assume: T_j^d is a sum of j exponentials.
func ideal(seed uint64, n, k int, d float64) *neighbors.Lists {
	r := rand.New(rand.NewPCG(seed, 31))
	l := &neighbors.Lists{N: n, K: k, Index: make([]int32, n*k), Dist: make([]float64, n*k)}
	for i := range n {
		var s float64
		for j := range k {
			s += r.ExpFloat64()
			l.Dist[i*k+j] = math.Pow(s, 1/d)
		}
	}
	return l
}

// On distances that follow the assumed law exactly the estimates are unbiased (the inverse is, for the likelihood) and
// their standard errors honest: over 200 draws the mean is within 4 standard errors of the truth and the spread within
// a quarter of the mean of the standard errors (200 draws know a spread to 5 per cent, the jackknife over 20 blocks
// its own to 16).
func TestEstimatesAreUnbiasedWithHonestErrors(t *testing.T) {
	for _, d := range []float64{1, 2.5, 12} {
		const draws = 200
		var values [3][]float64 // likelihood at 5, at 10, TwoNN
		var errs [3]float64
		for seed := range uint64(draws) {
			r, err := Estimate(ideal(seed, 400, 10, d), Options{})
			if err != nil {
				t.Fatal(err)
			}
			for j, f := range []Figure{r.Likelihood[0], r.Likelihood[1], r.TwoNN} {
				values[j] = append(values[j], f.Value)
				errs[j] += f.StdError / draws
			}
		}
		for j, name := range []string{"likelihood 5", "likelihood 10", "TwoNN"} {
			var m, s float64
			for _, v := range values[j] {
				m += v / draws
			}
			for _, v := range values[j] {
				s += (v - m) * (v - m) / (draws - 1)
			}
			s = math.Sqrt(s)
			// The estimate is a ratio whose inverse is unbiased: its own mean is high by d/(number of exponentials).
			if bias := math.Abs(m - d); bias > 4*s/math.Sqrt(draws)+d/400 {
				t.Errorf("d = %v, %s: mean %v", d, name, m)
			}
			if q := errs[j] / s; q < 0.75 || q > 1.25 {
				t.Errorf("d = %v, %s: standard errors %.4f, spread %.4f", d, name, errs[j], s)
			}
		}
	}
}

// The estimators against their formulas, written out for few points: the likelihood by its mean of logarithms, TwoNN by
// the line through the smallest nine tenths of the ratios.
func TestEstimatesByTheirFormulas(t *testing.T) {
	for seed := range uint64(30) {
		l := ideal(seed, 10+int(seed), 6, 3)
		r, err := Estimate(l, Options{Ks: []int{6, 3, 99}})
		if err != nil {
			t.Fatal(err)
		}
		if len(r.Likelihood) != 2 {
			t.Fatalf("estimates at %+v", r.Likelihood)
		}
		for j, k := range []int{3, 6} {
			var sum float64
			for i := range l.N {
				_, dist := l.Row(i)
				for _, d := range dist[:k-1] {
					sum += math.Log(dist[k-1]/d) / float64(k-1)
				}
			}
			if want := float64(l.N) / sum; r.Likelihood[j].K != k || math.Abs(r.Likelihood[j].Value-want) > 1e-12*want {
				t.Errorf("seed %d: likelihood %+v, want %v", seed, r.Likelihood[j], want)
			}
		}
		mu := make([]float64, l.N)
		for i := range mu {
			_, dist := l.Row(i)
			mu[i] = dist[1] / dist[0]
		}
		slices.Sort(mu)
		var xy, xx float64
		for i, m := range mu[:9*l.N/10] {
			x, y := math.Log(m), -math.Log(1-float64(i+1)/float64(l.N))
			xy += x * y
			xx += x * x
		}
		if want := xy / xx; math.Abs(r.TwoNN.Value-want) > 1e-12*want {
			t.Errorf("seed %d: TwoNN %v, want %v", seed, r.TwoNN.Value, want)
		}
	}
}

// Rounded coordinates: TwoNN is set aside and the shells find the dimension that the likelihood may miss.
func TestRoundedData(t *testing.T) {
	grid := func(d, side int) *points.Matrix {
		n := 1
		for range d {
			n *= side
		}
		m := points.NewMatrix(n, d)
		for i := range n {
			for j, v := 0, i; j < d; j, v = j+1, v/side {
				m.Row(i)[j] = float64(v%side) * 0.1
			}
		}
		return m
	}
	rounded := func(step float64) func(*rand.Rand, []float64) {
		return func(r *rand.Rand, x []float64) {
			uniform(r, x)
			for j := range x {
				x[j] = math.Round(x[j]/step) * step
			}
		}
	}
	for _, c := range []struct {
		name string
		m    *points.Matrix
		k    int
		d    float64
		off  float64
	}{
		{"line", grid(1, 500), 40, 1, 0.1},
		{"plane", grid(2, 60), 40, 2, 0.2},
		{"space", grid(3, 20), 60, 3, 0.4},
		{"half-full plane", sample(3, 3000, 2, rounded(0.02)), 40, 2, 0.2},
		{"sparse plane", sample(4, 3000, 2, rounded(0.005)), 40, 2, 0.2},
		{"half-full space", sample(5, 4000, 3, rounded(0.05)), 40, 3, 0.4},
	} {
		r, err := Estimate(lists(t, c.m, c.k), Options{Columns: c.m.D})
		if err != nil {
			t.Fatal(err)
		}
		t.Logf("%-16s tied %.2f shells %.3f (%.3f) likelihood %.2f .. %.2f TwoNN %.3g", c.name, r.TiedShare, r.Shells.Value,
			r.Shells.StdError, r.Likelihood[0].Value, r.Likelihood[len(r.Likelihood)-1].Value, r.TwoNN.Value)
		if !r.Rounded {
			t.Errorf("%s: rounding not seen, share %v", c.name, r.TiedShare)
		}
		if math.Abs(r.Shells.Value-c.d) > c.off || r.Value > float64(c.m.D) {
			t.Errorf("%s: shells %v, value %v", c.name, r.Shells.Value, r.Value)
		}
	}
}

func TestEstimateDoesNotDependOnWorkersOrScale(t *testing.T) {
	l := lists(t, sample(8, 700, 3, uniform), 20)
	a, _ := Estimate(l, Options{Workers: 1})
	b, _ := Estimate(l, Options{Workers: 5})
	if !slices.Equal(a.Likelihood, b.Likelihood) || a.TwoNN != b.TwoNN || a.Value != b.Value {
		t.Error("the estimate depends on the number of workers")
	}
	big := &neighbors.Lists{N: l.N, K: l.K, Index: l.Index, Dist: slices.Clone(l.Dist)}
	for i := range big.Dist {
		big.Dist[i] *= 1024
	}
	c, _ := Estimate(big, Options{})
	if math.Abs(c.Value-a.Value) > 1e-12*a.Value || math.Abs(c.TwoNN.Value-a.TwoNN.Value) > 1e-12 {
		t.Error("the estimate depends on the unit of length")
	}
}

func TestFewPoints(t *testing.T) {
	two := &neighbors.Lists{N: 2, K: 1, Index: []int32{1, 0}, Dist: []float64{1, 1}}
	if _, err := Estimate(two, Options{}); !errors.Is(err, ErrTooFew) {
		t.Errorf("two points: %v", err)
	}
	for n := 3; n < 30; n++ {
		r, err := Estimate(lists(t, sample(uint64(n), n, 2, uniform), 10), Options{Columns: 2})
		if err != nil {
			t.Fatal(err)
		}
		if !(r.Low <= r.Value && r.Value <= r.High) || r.Low < 1 || r.High > 2 {
			t.Errorf("%d points: %+v", n, r)
		}
	}
	// An equilateral triangle: all distances equal, nothing to go by, no panic and no number.
	even := &neighbors.Lists{N: 3, K: 2, Index: []int32{1, 2, 0, 2, 0, 1}, Dist: []float64{1, 1, 1, 1, 1, 1}}
	if r, err := Estimate(even, Options{}); err != nil || !math.IsNaN(r.Value) || !r.Rounded {
		t.Errorf("triangle: %+v, %v", r, err)
	}
}
