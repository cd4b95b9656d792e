package report

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestSample(t *testing.T) {
	keep := []int32{0, 17, 999}
	got := Sample(1000, 100, 5, keep)
	if len(got) != 100 || !slices.IsSorted(got) || len(slices.Compact(slices.Clone(got))) != 100 {
		t.Fatalf("%d picked, sorted %v", len(got), slices.IsSorted(got))
	}
	for _, k := range keep {
		if !slices.Contains(got, k) {
			t.Errorf("%d was not kept", k)
		}
	}
	if !slices.Equal(got, Sample(1000, 100, 5, keep)) || slices.Equal(got, Sample(1000, 100, 6, keep)) {
		t.Error("the seed does not decide the sample")
	}
	many := make([]int32, 500)
	for i := range many {
		many[i] = int32(2 * i)
	}
	if got := Sample(1000, 100, 5, many); len(got) != 100 {
		t.Errorf("%d picked of many to keep", len(got))
	}
	// Each is picked as often as the other: 400 samples of 10 of 40 pick each 100 times, give or take 4 sqrt(75).
	times := make([]int, 40)
	for seed := range uint64(400) {
		for _, k := range Sample(40, 10, seed, nil) {
			times[k]++
		}
	}
	for k, n := range times {
		if math.Abs(float64(n)-100) > 4*math.Sqrt(75) {
			t.Errorf("%d was picked %d times of 100 expected", k, n)
		}
	}
}

// TestDirections: points on a known plane, by both routes.
func TestDirections(t *testing.T) {
	for _, d := range []int{2, 5, principalDims + 30} {
		rng := rand.New(rand.NewPCG(1, uint64(d)))
		n := 600
		x := make([]float64, n*d)
		r := math.Sqrt(.5)
		for i := range n {
			a, b := 5*rng.NormFloat64(), 2*rng.NormFloat64()
			x[i*d] = 10 + r*a - r*b // first direction (1,1)/sqrt 2, second (-1,1)/sqrt 2
			x[i*d+1] = -3 + r*a + r*b
		}
		centre, axes, share, ok := Directions(x, d)
		if !ok {
			t.Fatalf("d=%d: no direction", d)
		}
		// 400 to 600 draws: the sample's axes lie within a few times 2/5/sqrt(n) of the true ones.
		for a, want := range [][2]float64{{r, r}, {r, -r}} {
			if s := math.Abs(axes[a][0]*want[0] + axes[a][1]*want[1]); s < .98 {
				t.Errorf("d=%d: axis %d is %v", d, a, axes[a][:2])
			}
			if m := slices.Max(axes[a]); m <= 0 || -slices.Min(axes[a]) > m*(1+1e-6) {
				t.Errorf("d=%d: axis %d points the other way", d, a)
			}
		}
		if math.Abs(share[0]+share[1]-1) > 1e-9 || share[0] < share[1] {
			t.Errorf("d=%d: shares %v", d, share)
		}
		var su, sv, suv float64
		for i := range n {
			u, v := Project(x[i*d:(i+1)*d], centre, axes)
			su, sv, suv = su+u*u, sv+v*v, suv+u*v
		}
		if d <= principalDims && math.Abs(suv) > 1e-9*math.Sqrt(su*sv) {
			t.Errorf("d=%d: places along the two directions are correlated: %g", d, suv/math.Sqrt(su*sv))
		}
	}
	if _, _, _, ok := Directions(make([]float64, 30), 3); ok {
		t.Error("equal points have a direction")
	}
}

func TestText(t *testing.T) {
	for got, want := range map[string]string{
		count(1234567): "1,234,567", count(-1234): "−1,234", count(999): "999", figure(0.000123): "1.2e−4", figure(1234.5): "1234",
		figure(.5): "0.5", figure(math.NaN()): "–", figure(math.Inf(1)): "inf", percent(1): "100%", percent(.9999): "over 99.9%",
		percent(.00001): "under 0.1%", percent(.05): "5%", percent(.123): "12%", power(math.Inf(1)): "inf", short("abcdef", 4): "abc…",
	} {
		if got != want {
			t.Errorf("%q, not %q", got, want)
		}
	}
}

func TestLeastSure(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	v := make([]float64, 500)
	for i := range v {
		v[i] = float64(rng.IntN(60)) // many equal
	}
	v[7] = math.NaN()
	got := leastSure(len(v), 12, func(r int) float64 { return v[r] })
	order := make([]int, 0, len(v))
	for i := range v {
		if i != 7 {
			order = append(order, i)
		}
	}
	slices.SortStableFunc(order, func(a, b int) int { return int(v[a] - v[b]) })
	if !slices.Equal(got, order[:12]) {
		t.Errorf("%v, not %v", got, order[:12])
	}
}

func TestHistogramCountsAll(t *testing.T) {
	v := []float64{-3, -1, 0, .5, 2, 7, math.NaN(), math.Inf(1)}
	h := binned(v, func(int) bool { return true }, 0, 0, 10)
	sum := 0
	for _, n := range h.bins {
		sum += n
	}
	if sum != 6 || h.total != 6 || h.endless != 1 || h.lo > -3 || h.lo+h.step*float64(len(h.bins)) < 7 {
		t.Errorf("%+v", h)
	}
}

func TestWilson(t *testing.T) {
	// At 0 of n the upper end is z^2/(n+z^2), by the formula of Wilson (1927).
	const z2 = 1.6448536269514722 * 1.6448536269514722
	if lo, hi := wilson(0, 10); lo > 1e-12 || math.Abs(hi-z2/(10+z2)) > 1e-12 {
		t.Errorf("%v %v", lo, hi)
	}
}
