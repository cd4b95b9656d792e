package trust

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"

	"pinfill/internal/laplace"
	"pinfill/internal/sparse"
)

// ring makes a connected random graph of n vertices with random conductances.
func ring(r *rand.Rand, n int) *sparse.CSR {
	w := make([][]float64, n)
	for i := range w {
		w[i] = make([]float64, n)
	}
	join := func(i, j int) {
		if i != j {
			w[i][j] = math.Exp(2 * r.NormFloat64())
			w[j][i] = w[i][j]
		}
	}
	for i := range n {
		join(i, (i+1)%n)
		join(i, r.IntN(n))
	}
	g := &sparse.CSR{N: n, RowPtr: []int{0}}
	for i := range n {
		for j, v := range w[i] {
			if v > 0 {
				g.Col, g.Val = append(g.Col, int32(j)), append(g.Val, v)
			}
		}
		g.RowPtr = append(g.RowPtr, len(g.Col))
	}
	return g
}

func field(t *testing.T, g *sparse.CSR, at []int32, y []float64) []float64 {
	t.Helper()
	s, err := laplace.New(context.Background(), g, at, laplace.Options{})
	if err != nil {
		t.Fatal(err)
	}
	f := make([]float64, g.N)
	if _, err := s.SolveDirichlet(context.Background(), [][]float64{y}, [][]float64{f}, 1e-12); err != nil {
		t.Fatal(err)
	}
	return f
}

// The closed form of left-out fields (f - e_i h_i) through Plus, against solving again without each label and the
// definition of jackknife+ read literally: a value y is inside if it is neither below nor above too many.
func TestPlusAgainstSolvingAgain(t *testing.T) {
	r := rand.New(rand.NewPCG(31, 0))
	const n, l = 60, 14
	for range 5 {
		g := ring(r, n)
		var at []int32
		for _, v := range r.Perm(n)[:l] {
			at = append(at, int32(v))
		}
		slices.Sort(at)
		y := make([]float64, l)
		for k := range y {
			y[k] = r.NormFloat64() + 5
		}
		system, err := laplace.New(context.Background(), g, at, laplace.Options{})
		if err != nil {
			t.Fatal(err)
		}
		var h [][]float64
		schur, _, err := system.Harmonic(context.Background(), 1e-12, func(_ int, block [][]float64) error {
			for _, c := range block {
				h = append(h, slices.Clone(c))
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		leftSpread, err := LeftOutSpread(schur, y)
		if err != nil {
			t.Fatal(err)
		}
		f, square := field(t, g, at, y), make([]float64, l)
		for k := range y {
			square[k] = y[k] * y[k]
		}
		spread, err := Spread(f, field(t, g, at, square))
		if err != nil {
			t.Fatal(err)
		}
		e := NumberEvidence{Given: y, Spread: leftSpread}
		again := make([][]float64, l)
		for i := range l {
			var residual float64
			for j := range l {
				residual += schur.At(i, j) * y[j] / schur.At(i, i)
			}
			e.LeftOut = append(e.LeftOut, y[i]-residual)
			rest := slices.Delete(slices.Clone(at), i, i+1)
			values := slices.Delete(slices.Clone(y), i, i+1)
			again[i] = field(t, g, rest, values)
			near(t, "left-out answer", e.LeftOut[i], again[i][at[i]], 1e-8)
			sq := slices.Delete(slices.Clone(square), i, i+1)
			s, err := Spread(again[i], field(t, g, rest, sq))
			if err != nil {
				t.Fatal(err)
			}
			near(t, "left-out spread", leftSpread[i], s[at[i]], 1e-5) // a root of a difference of squares
		}
		const coverage = .8
		iv, err := NewIntervals(e, IntervalSettings{Coverage: coverage})
		if err != nil {
			t.Fatal(err)
		}
		var base float64
		for _, s := range leftSpread {
			base += s * s / (2 * l)
		}
		for x := range n {
			if slices.Contains(at, int32(x)) {
				continue
			}
			without := make([]float64, l)
			for i := range l {
				without[i] = f[x] - (y[i]-e.LeftOut[i])*h[i][x]
				near(t, "left-out field", without[i], again[i][x], 1e-8)
			}
			low, high := iv.Plus(without, spread[x], nil)
			sigma := math.Sqrt(spread[x]*spread[x] + base)
			inside := func(v float64) bool {
				below, above := 0, 0
				for i := range l {
					d := math.Abs(y[i]-e.LeftOut[i]) / math.Sqrt(leftSpread[i]*leftSpread[i]+base) * sigma
					if again[i][x]-d <= v {
						below++
					}
					if again[i][x]+d >= v {
						above++
					}
				}
				need := int(math.Floor((1-coverage)*(l+1) + 1e-9))
				return below >= need && above >= need
			}
			step := 1e-5 * (high - low)
			for _, c := range []struct {
				v    float64
				want bool
			}{{low + step, true}, {low - step, false}, {high - step, true}, {high + step, false}} {
				if inside(c.v) != c.want {
					t.Fatalf("vertex %d: interval [%v, %v], but %v inside: %v", x, low, high, c.v, !c.want)
				}
			}
		}
	}
}

func TestAtCoversAndAdapts(t *testing.T) {
	r := rand.New(rand.NewPCG(32, 0))
	const draws, l, fresh = 400, 40, 100
	var covered, tight, wide float64
	for range draws {
		pred, given, spread := make([]float64, l+fresh), make([]float64, l+fresh), make([]float64, l+fresh)
		for i := range pred {
			pred[i] = r.NormFloat64()
			spread[i] = .2 + 2*r.Float64()
			given[i] = pred[i] + spread[i]*r.NormFloat64()
		}
		iv, err := NewIntervals(NumberEvidence{Given: given[:l], LeftOut: pred[:l], Spread: spread[:l]}, IntervalSettings{Coverage: .9})
		if err != nil {
			t.Fatal(err)
		}
		for i := l; i < l+fresh; i++ {
			low, high := iv.At(pred[i], spread[i])
			if low <= given[i] && given[i] <= high {
				covered++
			}
		}
		low, high := iv.At(0, .2)
		tight += high - low
		low, high = iv.At(0, 2.2)
		wide += high - low
	}
	covered /= draws * fresh
	if covered < .89 || covered > .9+1./(l+1)+.01 {
		t.Errorf("coverage %.4f", covered)
	}
	if wide < 2*tight {
		t.Errorf("width %.2f where labels agree, %.2f where they do not", tight/draws, wide/draws)
	}
}

func TestIntervalEdges(t *testing.T) {
	nan := math.NaN()
	y := []float64{1, 2, 3, 4}
	if _, err := NewIntervals(NumberEvidence{Given: y, LeftOut: []float64{nan, nan, nan, nan}}, IntervalSettings{Coverage: .9}); err != ErrNoEvidence {
		t.Errorf("error %v", err)
	}
	if _, err := NewIntervals(NumberEvidence{Given: y}, IntervalSettings{Coverage: .9}); err == nil {
		t.Error("missing answers accepted")
	}
	iv, err := NewIntervals(NumberEvidence{Given: y, LeftOut: []float64{2, 2, 3, nan}}, IntervalSettings{Coverage: .9, Drawn: Chosen})
	if err != nil {
		t.Fatal(err)
	}
	if low, high := iv.At(7, 0); !math.IsInf(low, -1) || !math.IsInf(high, 1) {
		t.Errorf("three labels promise .9 with [%v, %v]", low, high)
	}
	if low, high := iv.Plus(y, 0, nil); !math.IsInf(low, -1) || !math.IsInf(high, 1) {
		t.Errorf("three labels promise .9 with [%v, %v]", low, high)
	}
	if p := iv.Promise(); !p.Void || p.Unbounded != 1 || p.Labels != 3 {
		t.Errorf("%+v", p)
	}
	// Half: the second smallest of residuals 1, 0, 0, without spread.
	iv, err = NewIntervals(NumberEvidence{Given: y, LeftOut: []float64{2, 2, 3, nan}}, IntervalSettings{Coverage: .75})
	if err != nil {
		t.Fatal(err)
	}
	if low, high := iv.At(7, 3); low != 6 || high != 8 {
		t.Errorf("[%v, %v]", low, high)
	}
	if _, err := Spread([]float64{1}, nil); err == nil {
		t.Error("sizes")
	}
	if _, err := LeftOutSpread(mat.NewSymDense(2, nil), y); err == nil {
		t.Error("sizes")
	}
	if v, _ := LeftOutSpread(mat.NewSymDense(4, nil), y); !math.IsNaN(v[0]) {
		t.Error("a label without others has a spread")
	}
}
