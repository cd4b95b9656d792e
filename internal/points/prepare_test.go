package points

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func random(r *rand.Rand, n, d int, f func(i, j int) float64) *Matrix {
	m := NewMatrix(n, d)
	for i := range n {
		for j := range d {
			m.Data[i*d+j] = f(i, j)
		}
	}
	return m
}

func prepare(t *testing.T, m *Matrix, o Options) *Space {
	t.Helper()
	s, err := Prepare(context.Background(), m, o)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestStandardScaling(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	m := random(r, 3000, 3, func(_, j int) float64 { return math.Pow(10, float64(4*j-4))*r.NormFloat64() + 7 })
	s := prepare(t, m, Options{})
	for j := range 3 {
		var sum, sq float64
		for i := range m.N {
			y := s.Points.Row(int(s.Vertex[i]))[j]
			sum += y
			sq += y * y
		}
		n := float64(m.N)
		if sd := math.Sqrt(sq/n - sum/n*sum/n); math.Abs(sd-1) > 1e-9 {
			t.Errorf("column %d has standard deviation %v after scaling", j, sd)
		}
		if math.Abs(s.Share[j]-1./3) > 1e-12 {
			t.Errorf("column %d has share %v", j, s.Share[j])
		}
	}
	if s.RawShare[2] < 0.99 {
		t.Errorf("raw shares %v: the last column holds nearly all of the squared distance", s.RawShare)
	}
}

// Spreads by hand: 0..8 has median 4, quartiles 2 and 6, range 8, standard deviation sqrt(60/9).
func TestSpreads(t *testing.T) {
	m := random(nil, 9, 1, func(i, _ int) float64 { return float64((i * 5) % 9) })
	for scale, want := range map[Scale]float64{Standard: math.Sqrt(60. / 9), Robust: 4 / 1.349, Range: 8, None: 1} {
		s := prepare(t, m, Options{Scale: scale})
		got := s.Scaling.Spread[0] * math.Ldexp(1, -s.Scaling.Power[0])
		if math.Abs(got-want) > 1e-14*want {
			t.Errorf("%s: spread %v, want %v", scale, got, want)
		}
	}
}

func TestPermutedRowsGiveTheSameBits(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 1))
	for trial := range 200 {
		n, d := 2+r.IntN(400), 1+r.IntN(4)
		m := random(r, n, d, func(int, int) float64 {
			if trial%3 == 0 {
				return float64(r.IntN(5)) // duplicates and ties
			}
			return 1e9 + r.NormFloat64()
		})
		m.Data[0], m.Data[d] = 1, 2 // never all identical
		o := Options{Scale: []Scale{Standard, Robust, Range, None}[trial%4], Workers: 1}
		if trial%5 == 0 {
			o.Metric = Cosine
			m.Data[0] = 3
			for i := range m.Data {
				m.Data[i]++
			}
		}
		a, errA := Prepare(context.Background(), m, o)
		perm := r.Perm(n)
		q := random(r, n, d, func(i, j int) float64 { return m.Data[perm[i]*d+j] })
		o.Workers = 3
		b, errB := Prepare(context.Background(), q, o)
		if errA != nil || errB != nil {
			if (errA == nil) != (errB == nil) {
				t.Fatalf("trial %d: %v against %v", trial, errA, errB)
			}
			continue
		}
		if !slices.Equal(a.Points.Data, b.Points.Data) || !slices.Equal(a.Count, b.Count) {
			t.Fatalf("trial %d: permuted rows gave other points", trial)
		}
		for i, p := range perm {
			if b.Vertex[i] != a.Vertex[p] {
				t.Fatalf("trial %d: row %d went to vertex %d, as row %d to %d", trial, p, a.Vertex[p], i, b.Vertex[i])
			}
		}
	}
}

func TestPowersOfTwoGiveTheSameBits(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 1))
	m := random(r, 500, 3, func(int, int) float64 { return r.NormFloat64() })
	for _, scale := range []Scale{Standard, Robust, Range} {
		want := prepare(t, m, Options{Scale: scale})
		for _, k := range []int{-1000, -40, 1, 3, 900} {
			got := prepare(t, random(r, m.N, m.D, func(i, j int) float64 { return math.Ldexp(m.Data[i*m.D+j], k+j) }), Options{Scale: scale})
			if !slices.Equal(got.Points.Data, want.Points.Data) {
				t.Errorf("%s: features times 2^%d gave other points", scale, k)
			}
		}
	}
}

func TestVertexAndCount(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 1))
	m := random(r, 5000, 2, func(int, int) float64 { return float64(r.IntN(40)) })
	m.Data[17] = math.Copysign(0, -1) // the same number as 0
	s := prepare(t, m, Options{Scale: None})
	seen := map[[2]float64]int32{}
	for i := range m.N {
		row := [2]float64{m.Row(i)[0], m.Row(i)[1]}
		if !slices.Equal(s.Points.Row(int(s.Vertex[i])), row[:]) {
			t.Fatalf("row %d is %v, its vertex %v", i, row, s.Points.Row(int(s.Vertex[i])))
		}
		seen[row]++
	}
	if len(seen) != s.Points.N {
		t.Fatalf("%d vertices for %d distinct rows", s.Points.N, len(seen))
	}
	for v := range s.Points.N {
		if n := seen[[2]float64(s.Points.Row(v))]; n != s.Count[v] {
			t.Fatalf("vertex %d stands for %d rows, counted %d", v, n, s.Count[v])
		}
	}
}

func TestExtremeUnits(t *testing.T) {
	for _, unit := range []float64{1e300, 1e-300, 5e-324, 1} {
		for _, scale := range []Scale{Standard, Robust, Range, None} {
			m := random(nil, 64, 2, func(i, j int) float64 { return unit * float64((i*(j+3))%17) })
			s := prepare(t, m, Options{Scale: scale})
			if s.Points.N != 17 {
				t.Fatalf("unit %v, %s: %d distinct points, want 17", unit, scale, s.Points.N)
			}
			for i := range s.Points.N - 1 {
				var c float64
				for j := range 2 {
					c += math.Pow(s.Points.Row(i)[j]-s.Points.Row(i + 1)[j], 2)
				}
				if !(c > 0) || math.IsInf(c, 0) {
					t.Fatalf("unit %v, %s: squared distance %v", unit, scale, c)
				}
			}
		}
	}
}

func TestOffsetKeepsDifferences(t *testing.T) {
	a := random(nil, 100, 1, func(i, _ int) float64 { return float64(i*i%101) / 64 })
	b := random(nil, 100, 1, func(i, _ int) float64 { return 1e9 + float64(i*i%101)/64 })
	sa, sb := prepare(t, a, Options{}), prepare(t, b, Options{})
	for i := range sa.Points.N {
		if d := math.Abs(sa.Points.Data[i] - sb.Points.Data[i]); d > 1e-14 {
			t.Fatalf("point %d moved by %v under an offset that float64 holds exactly", i, d)
		}
	}
}

func TestApplyTakesRowsToTheirPoints(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 1))
	m := random(r, 300, 3, func(i, j int) float64 {
		if j == 1 {
			return 4
		}
		return r.NormFloat64() * 1e5
	})
	for _, metric := range []Metric{Euclidean, Manhattan, Cosine} {
		s := prepare(t, m, Options{Metric: metric})
		if !slices.Equal(s.Constant, []int{1}) || !slices.Equal(s.Scaling.Columns, []int{0, 2}) {
			t.Fatalf("constant %v, kept %v", s.Constant, s.Scaling.Columns)
		}
		if err := s.Scaling.Validate(); err != nil {
			t.Fatal(err)
		}
		dst := make([]float64, 2)
		for i := range m.N {
			if err := s.Scaling.Apply(dst, m.Row(i)); err != nil || !slices.Equal(dst, s.Points.Row(int(s.Vertex[i]))) {
				t.Fatalf("%s: row %d maps to %v, its point is %v (%v)", metric, i, dst, s.Points.Row(int(s.Vertex[i])), err)
			}
		}
	}
}

func TestRefusals(t *testing.T) {
	same := random(nil, 5, 2, func(_, j int) float64 { return float64(j) })
	if _, err := Prepare(context.Background(), same, Options{}); !errors.Is(err, ErrIdentical) {
		t.Errorf("identical points: %v", err)
	}
	nan := random(nil, 5, 2, func(i, j int) float64 { return math.Log(float64(3 - i)) })
	var nf *NotFiniteError
	if _, err := Prepare(context.Background(), nan, Options{}); !errors.As(err, &nf) || nf.Row != 3 || nf.Column != 0 {
		t.Errorf("minus infinity in row 3: %v", err)
	}
	zero := random(nil, 5, 2, func(i, j int) float64 { return float64(i * (j + 1) % 4) })
	var re *RowError
	if _, err := Prepare(context.Background(), zero, Options{Metric: Cosine}); !errors.As(err, &re) || re.Row != 0 || !errors.Is(err, ErrZeroVector) {
		t.Errorf("zero vector: %v", err)
	}
	if _, err := Prepare(context.Background(), NewMatrix(0, 2), Options{}); err == nil {
		t.Error("no rows: no error")
	}
}

// TestOrderIsATree checks what Order promises: each node cut across its widest column, leaves sorted.
func TestOrderIsATree(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 1))
	for trial := range 100 {
		n, d := 1+r.IntN(3000), 1+r.IntN(4)
		m := random(r, n, d, func(i, j int) float64 { return float64(r.IntN(1000*(1+trial%2))) + float64(i*min(d-1, 1)-j*j)/4096 })
		before := slices.Clone(m.Data)
		perm, err := Order(context.Background(), m, 2)
		if err != nil {
			t.Fatal(err)
		}
		for i, p := range perm {
			if !slices.Equal(m.Row(i), before[int(p)*d:int(p+1)*d]) {
				t.Fatal("rows and permutation disagree")
			}
		}
		for level := range Levels(n) {
			for i := range 1 << level {
				lo, mid, hi := Bound(n, level, i), Bound(n, level+1, 2*i+1), Bound(n, level, i+1)
				o := orderer{m: m}
				axis, _ := o.widest(lo, hi)
				for a := lo; a < hi; a++ {
					if (a < mid && m.Row(a)[axis] > m.Row(mid)[axis]) || (a >= mid && m.Row(a)[axis] < m.Row(mid - 1)[axis]) {
						if d > 1 {
							t.Fatalf("n=%d level %d node %d: row %d stands on the wrong side", n, level, i, a)
						}
					}
				}
			}
		}
	}
}

// TestManyRows takes the paths that only many rows take: several chunks and goroutines, and input that has few values.
func TestManyRows(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 1))
	for _, values := range []int{2, 50, 1 << 40} {
		m := random(r, 60_000, 2, func(int, int) float64 { return float64(r.IntN(values)) })
		a := prepare(t, m, Options{Workers: 1})
		b := prepare(t, m, Options{Workers: 4})
		if !slices.Equal(a.Points.Data, b.Points.Data) || !slices.Equal(a.Vertex, b.Vertex) {
			t.Errorf("%d values: one worker and four gave different points", values)
		}
		if want := min(values*values, m.N); values < 100 && a.Points.N != want {
			t.Errorf("%d distinct points, want %d", a.Points.N, want)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Prepare(ctx, random(r, 40_000, 2, func(int, int) float64 { return r.Float64() }), Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func TestSelectNthMatchesSorting(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 1))
	for trial := range 2000 {
		x := make([]float64, 1+r.IntN(300))
		for i := range x {
			x[i] = float64(r.IntN(1 + trial%97))
			if trial%3 == 0 {
				x[i] = float64(min(i, len(x)-i)) // up and down
			}
		}
		sorted := slices.Sorted(slices.Values(x))
		k := r.IntN(len(x))
		if got := selectNth(x, k); got != sorted[k] {
			t.Fatalf("%d-th of %d is %v, got %v", k, len(x), sorted[k], got)
		}
	}
}

func TestValidateRefuses(t *testing.T) {
	good := func() *Scaling {
		return &Scaling{Inputs: 3, Columns: []int{0, 2}, Power: []int{1, 2}, Centre: []float64{0, 1}, Spread: []float64{1, 2}}
	}
	if err := good().Validate(); err != nil {
		t.Fatal(err)
	}
	for name, spoil := range map[string]func(s *Scaling){
		"columns":   func(s *Scaling) { s.Columns = []int{2, 2} },
		"beyond":    func(s *Scaling) { s.Columns = []int{0, 3} },
		"lengths":   func(s *Scaling) { s.Power = s.Power[:1] },
		"spread":    func(s *Scaling) { s.Spread[1] = 0 },
		"centre":    func(s *Scaling) { s.Centre[1] = math.NaN() },
		"power":     func(s *Scaling) { s.Power[0] = 1 << 20 },
		"no column": func(s *Scaling) { *s = Scaling{Inputs: 3} },
	} {
		s := good()
		spoil(s)
		if s.Validate() == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func TestApplyRefusesWhatOverflows(t *testing.T) {
	s := prepare(t, random(nil, 9, 1, func(i, _ int) float64 { return 1e-300 * float64(i) }), Options{})
	if err := s.Scaling.Apply(make([]float64, 1), []float64{1e300}); !errors.Is(err, ErrOutOfRange) {
		t.Errorf("error %v", err)
	}
}
