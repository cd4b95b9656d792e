package extend

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/graph"
)

func extender(t *testing.T, m *Model) *Extender {
	t.Helper()
	x, err := NewExtender(t.Context(), m, 2)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// raw takes a point back to the features it was scaled from, to the last digits.
func raw(m *Model, point []float64) []float64 {
	out := make([]float64, m.Scaling.Inputs)
	for k, j := range m.Scaling.Columns {
		out[j] = math.Ldexp(point[k]*m.Scaling.Spread[k]+m.Scaling.Centre[k], -m.Scaling.Power[k])
	}
	return out
}

// A row on a vertex takes the vertex's values, whatever p and the energy.
func TestRowOnVertex(t *testing.T) {
	for _, energy := range []string{"slope", conductance} {
		for _, p := range []float64{1.5, 2, 3, 8, math.Inf(1)} {
			m := someModel(t, 40, 2)
			m.P, m.Energy = p, energy
			rng := rand.New(rand.NewPCG(5, 40)) // as someModel draws them
			x, scores := extender(t, m), make([]float64, 2)
			work := x.NewWork()
			for range m.Points.N {
				row := []float64{rng.Float64(), rng.Float64()}
				at, err := x.Row(row, scores, work)
				if err != nil || at.Distance != 0 {
					t.Fatalf("row %v is %v from a vertex: %v", row, at.Distance, err)
				}
				if scores[0] != m.Scores[0][at.Vertex] || scores[1] != m.Scores[1][at.Vertex] {
					t.Fatalf("p=%v %s: vertex %d has %v and %v, got %v", p, energy, at.Vertex, m.Scores[0][at.Vertex], m.Scores[1][at.Vertex], scores)
				}
			}
		}
	}
}

// by is a value found the slow way: all distances, sorted; weights from the kernel's formula; golden sections.
func by(m *Model, point []float64) (value float64, weight, f []float64) {
	type near struct {
		d float64
		v int
	}
	var all []near
	for v := range m.Points.N {
		q := m.Points.Row(v)
		all = append(all, near{math.Hypot(q[0]-point[0], q[1]-point[1]), v})
	}
	slices.SortFunc(all, func(a, b near) int {
		if a.d < b.d {
			return -1
		}
		return 1
	})
	own := all[m.Rank-1].d
	var logW []float64
	for j, a := range all {
		if m.Radius == 0 && j == m.K || m.Radius > 0 && a.d > m.Radius {
			break
		}
		h2 := m.Width.H * m.Width.H
		if m.Width.Local {
			h2 *= own * m.Local[a.v]
		}
		log := -a.d * a.d / h2 / 2 // gaussian
		if m.Energy == conductance {
			if math.IsInf(m.P, 1) {
				log = 0
			} else {
				log /= m.P
			}
		}
		logW, weight, f = append(logW, log), append(weight, math.Exp(log)), append(f, m.Scores[0][a.v])
	}
	if len(f) == 0 {
		return 0, nil, nil
	}
	lo, hi := slices.Min(f), slices.Max(f)
	return golden(func(t float64) float64 { return energy(logW, f, m.P, t) }, lo, hi), weight, f
}

func TestRowAgainstTheSlowWay(t *testing.T) {
	rng := rand.New(rand.NewPCG(81, 2))
	for _, width := range []graph.Bandwidth{{Local: true, H: 1}, {Local: true, H: 0.7}, {H: 0.4}} {
		for _, radius := range []float64{0, 0.5} {
			for _, energy := range []string{"slope", conductance} {
				for _, p := range []float64{1.5, 2, 3, 8, math.Inf(1)} {
					m := someModel(t, 60, 0)
					m.P, m.Energy, m.Width = p, energy, width
					if radius > 0 {
						m.K, m.Radius = 0, radius
					}
					x := extender(t, m)
					work, scores := x.NewWork(), make([]float64, 1)
					for range 20 {
						point := []float64{2 * rng.Float64(), 2*rng.Float64() - 1}
						row := raw(m, point)
						if _, err := x.Row(row, scores, work); err != nil {
							t.Fatal(err)
						}
						want, weight, f := by(m, work.point)
						if len(f) == 0 {
							continue // the nearest alone counts
						}
						// Golden sections end where energies agree to 16 digits, about the root of that apart in value.
						if d := math.Abs(scores[0] - want); d > 1e-5 {
							t.Fatalf("p=%v %s %+v radius %v: %v, want %v", p, energy, width, radius, scores[0], want)
						}
						if p == 2 { // the mean weighted by the conductances w^2
							var sum, total float64
							for j, w := range weight {
								sum, total = sum+w*w*f[j], total+w*w
							}
							if d := math.Abs(scores[0] - sum/total); d > 1e-12 {
								t.Fatalf("p=2 %s: %v is not the weighted mean %v", energy, scores[0], sum/total)
							}
						}
						if math.IsInf(p, 1) && energy == conductance { // weights of 1: the middle of the range
							if mid := (slices.Min(f) + slices.Max(f)) / 2; math.Abs(scores[0]-mid) > 1e-12 {
								t.Fatalf("p=inf: %v is not the midrange %v", scores[0], mid)
							}
						}
					}
				}
			}
		}
	}
}

// Where the kernel reaches nothing, the nearest vertex alone counts; where that has no value, neither has the row.
func TestRowFarAway(t *testing.T) {
	m := someModel(t, 30, 1)
	m.Kernel, m.Width = "epanechnikov", graph.Bandwidth{H: 0.01}
	x := extender(t, m)
	work, scores := x.NewWork(), make([]float64, 1)
	at, err := x.Row([]float64{40, 50}, scores, work)
	if err != nil || scores[0] != m.Scores[0][at.Vertex] {
		t.Errorf("far row: %v, want the nearest's %v: %v", scores[0], m.Scores[0][at.Vertex], err)
	}
	for v := range m.Scores[0] {
		m.Scores[0][v] = math.NaN()
	}
	if _, err := x.Row([]float64{40, 50}, scores, work); err != nil || !math.IsNaN(scores[0]) {
		t.Errorf("row among vertices without a value: %v, %v", scores[0], err)
	}
	if _, err := x.Row([]float64{1e308, -1e308}, scores, work); err == nil && math.IsNaN(work.point[0]) {
		t.Error("a point that is not a number was looked up")
	}
}

// Powers and weights past the range of float64 still give a minimiser between the neighbours' values.
func TestVertexExtremes(t *testing.T) {
	for _, c := range []struct {
		logW, f []float64
		p, want float64
	}{
		{[]float64{0, -500}, []float64{0, 1}, 300, 1 / (1 + math.Exp(500*300.0/299))}, // t/(1-t) = (w_1/w_0)^(p/(p-1))
		{[]float64{0, -40}, []float64{0, 1}, 60, 1 / (1 + math.Exp(40*60.0/59))},
		{[]float64{0, 0, 0}, []float64{0, 0, 1}, 1.001, 0}, // (1/2)^(1/0.001), about 1e-301
		{[]float64{0, 0}, []float64{-1e300, 1e300}, 4, 0},
	} {
		got := Vertex(c.logW, c.f, c.p)
		if d := math.Abs(got - c.want); !(d <= 1e-17*c.f[len(c.f)-1]) {
			t.Errorf("p=%v %v: %v, want %v", c.p, c.logW, got, c.want)
		}
	}
}

// A smooth function known everywhere: extension from a lattice errs by no more than the function changes between
// neighbours, and less on a finer lattice.
func TestRowOnSmoothFunction(t *testing.T) {
	smooth := func(x, y float64) float64 { return math.Sin(3*x) + math.Cos(2*y) }
	last := math.Inf(1)
	for _, n := range []int{400, 6400} {
		for _, p := range []float64{2, 3, math.Inf(1)} {
			m := someModel(t, n, 0)
			m.P = p
			rng := rand.New(rand.NewPCG(5, uint64(n)))
			x := extender(t, m)
			work, scores := x.NewWork(), make([]float64, 1)
			for range n {
				row := []float64{rng.Float64(), rng.Float64()}
				at, err := x.Row(row, scores, work)
				if err != nil {
					t.Fatal(err)
				}
				m.Scores[0][at.Vertex] = smooth(row[0], row[1])
			}
			var square float64
			for range 500 {
				row := []float64{0.1 + 0.8*rng.Float64(), 0.1 + 0.8*rng.Float64()}
				if _, err := x.Row(row, scores, work); err != nil {
					t.Fatal(err)
				}
				d := scores[0] - smooth(row[0], row[1])
				square += d * d
			}
			rms := math.Sqrt(square / 500)
			// Neighbours lie about 1/sqrt(n) apart and the slope is at most sqrt(13).
			if rms > 3.7/math.Sqrt(float64(n)) {
				t.Errorf("n=%d p=%v: error %v", n, p, rms)
			}
			if p == 2 {
				if rms > last/2 {
					t.Errorf("n=%d: error %v, %v with a sixteenth of the points", n, rms, last)
				}
				last = rms
			}
		}
	}
}

// BenchmarkRow labels one row of the plane from 20,000 vertices.
func BenchmarkRow(b *testing.B) {
	for _, p := range []float64{1.7, 2, 6, math.Inf(1)} {
		b.Run("p="+pText(p), func(b *testing.B) {
			m := someModel(b, 20000, 0)
			m.P, m.K = p, 10
			for v := range m.Scores[0] { // smooth, as solved values are
				q := m.Points.Row(v)
				m.Scores[0][v] = math.Sin(q[0]) + q[1]
			}
			x, err := NewExtender(b.Context(), m, 1)
			if err != nil {
				b.Fatal(err)
			}
			rng := rand.New(rand.NewPCG(1, 1))
			work, scores := x.NewWork(), make([]float64, 1)
			for b.Loop() {
				if _, err := x.Row([]float64{rng.Float64(), rng.Float64()}, scores, work); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
