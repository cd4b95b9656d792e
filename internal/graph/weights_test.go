package graph

import (
	"errors"
	"math"
	"testing"

	"pinfill/internal/sparse"
)

// phi is each kernel as its definition reads.
var phi = map[Kernel]func(t float64) float64{
	Gaussian:     func(t float64) float64 { return math.Exp(-t * t / 2) },
	Exponential:  func(t float64) float64 { return math.Exp(-t) },
	Epanechnikov: func(t float64) float64 { return math.Max(0, 1-t*t) },
	Box: func(t float64) float64 {
		if t <= 1 {
			return 1
		}
		return 0
	},
	Inverse: func(t float64) float64 { return 1 / t },
}

func TestKernelsByName(t *testing.T) {
	for _, name := range Kernels() {
		k, err := ParseKernel(name)
		if err != nil || k.String() != name {
			t.Errorf("%s: %v, %v", name, k, err)
		}
	}
	if _, err := ParseKernel("gauss"); err == nil {
		t.Error("a kernel named gauss")
	}
	if len(phi) != len(Kernels()) {
		t.Errorf("%d kernels, %d tested", len(Kernels()), len(phi))
	}
}

func TestLogWeightsAreTheKernelOfTheDistance(t *testing.T) {
	for seed := range uint64(12) {
		pts := cloud(t, seed, 150, 1+int(seed)%3, []float64{0, 0.0625}[seed%2])
		l := nearest(t, pts, 9)
		g, err := FromLists(l, 8, 0)
		if err != nil {
			t.Fatal(err)
		}
		for k, f := range phi {
			for _, b := range []Bandwidth{{H: 0.02}, {H: 0.1}, {H: 3}, {Local: true, H: 1}, {Local: true, H: 0.7}, {Local: true, H: 5}} {
				w, err := g.LogWeights(k, b, 2)
				var under *UnderflowError
				if errors.As(err, &under) {
					w = &sparse.CSR{N: pts.N, RowPtr: make([]int, pts.N+1)}
				} else if err != nil {
					t.Fatal(err)
				}
				checkCSR(t, w)
				got := dense(w)
				for e, d := range dense(g.Skeleton) {
					h := b.H
					if b.Local {
						h *= math.Sqrt(g.Local[e[0]] * g.Local[e[1]])
					}
					want := f(d / h)
					v, ok := got[e]
					if math.Abs(d/h-1) < 1e-14 && k.Compact() {
						continue // on the rim of the support, where two ways of dividing round apart
					}
					if ok != (want > 0) {
						t.Fatalf("%v at %+v, distance %v: kept %v, weight %v", k, b, d, ok, want)
					}
					// t^2 is known to 1e-15; near the rim the Epanechnikov weight loses what 1-t^2 cancels.
					if ok && math.Abs(math.Exp(v)-want) > 1e-14*math.Max(1, -v)*want+4e-16 {
						t.Fatalf("%v at %+v, distance %v: weight %v, want %v", k, b, d, math.Exp(v), want)
					}
				}
				if under != nil && len(got) != 0 {
					t.Fatal("edges beside an error")
				}
			}
		}
	}
}

func TestLogWeightsKeepWhatAFloatCannot(t *testing.T) {
	g, err := FromLists(nearest(t, cloud(t, 5, 300, 2, 0), 8), 8, 0)
	if err != nil {
		t.Fatal(err)
	}
	least := math.Inf(1)
	for _, d := range g.Skeleton.Val {
		least = math.Min(least, d)
	}
	// At a thirtieth of the smallest distance its weight is exp(-450), all others less, most below a float64.
	w, err := g.LogWeights(Gaussian, Bandwidth{H: least / 30}, 0)
	if err != nil {
		t.Fatal(err)
	}
	if w.NNZ() != g.Skeleton.NNZ() {
		t.Fatalf("%d of %d entries are left", w.NNZ(), g.Skeleton.NNZ())
	}
	if h := Measure(w, 0); h.Underflowed == 0 || math.Abs(h.LogMax+450) > 1e-9 {
		t.Errorf("underflowed %d, largest ln w %v", h.Underflowed, h.LogMax)
	}
	// At a hundredth it is exp(-5000): nothing is left.
	for _, c := range []struct {
		k Kernel
		b Bandwidth
	}{
		{Gaussian, Bandwidth{H: least / 100}},
		{Exponential, Bandwidth{H: least / 1e4}},
		{Epanechnikov, Bandwidth{H: least / 2}},
		{Box, Bandwidth{H: least / 2}},
		{Gaussian, Bandwidth{Local: true, H: 1e-6}},
		{Box, Bandwidth{Local: true, H: 1e-3}},
	} {
		_, err = g.LogWeights(c.k, c.b, 0)
		var under *UnderflowError
		if !errors.As(err, &under) {
			t.Fatalf("%v at %+v: %v", c.k, c.b, err)
		}
		if under.Smallest != least {
			t.Errorf("smallest distance %v, want %v", under.Smallest, least)
		}
		w, err := g.LogWeights(c.k, Bandwidth{Local: c.b.Local, H: under.Usable}, 0)
		if err != nil {
			t.Fatalf("the usable bandwidth %v is not: %v", under.Usable, err)
		}
		_, whole := sparse.Components(g.Skeleton)
		if _, count := sparse.Components(w); count != whole {
			t.Errorf("%v at the usable bandwidth: %d components, the skeleton has %d", c.k, count, whole)
		}
	}
}

func TestBandwidthsRefused(t *testing.T) {
	g, _ := FromLists(nearest(t, cloud(t, 5, 30, 2, 0), 3), 3, 0)
	for _, h := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := g.LogWeights(Gaussian, Bandwidth{H: h}, 0); err == nil {
			t.Errorf("bandwidth %v accepted", h)
		}
	}
}

// Points and bandwidth times a power of two give the same bits, any kernel.
func TestWeightsDoNotDependOnTheUnit(t *testing.T) {
	pts := cloud(t, 8, 200, 3, 0)
	big := cloud(t, 8, 200, 3, 0)
	for i := range big.Data {
		big.Data[i] *= 0x1p40
	}
	a, _ := FromLists(nearest(t, pts, 9), 9, 0)
	b, _ := FromLists(nearest(t, big, 9), 9, 0)
	for k := range phi {
		for _, h := range []Bandwidth{{H: 0.1}, {Local: true, H: 1}} {
			wa, err := a.LogWeights(k, h, 0)
			if err != nil {
				t.Fatal(err)
			}
			if !h.Local {
				h.H *= 0x1p40
			}
			wb, err := b.LogWeights(k, h, 0)
			if err != nil {
				t.Fatal(err)
			}
			if !same(wa, wb) {
				t.Errorf("%v at %+v changes with the unit of length", k, h)
			}
		}
	}
}
