package advise

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"pinfill/internal/sparse"
)

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s = %.15g, want %.15g within %g", what, got, want, tol)
	}
}

// network makes a CSR from a dense symmetric matrix, zero meaning no edge.
func network(w [][]float64) *sparse.CSR {
	g := &sparse.CSR{N: len(w), RowPtr: []int{0}}
	for i := range w {
		for j, v := range w[i] {
			if v != 0 {
				g.Col, g.Val = append(g.Col, int32(j)), append(g.Val, v)
			}
		}
		g.RowPtr = append(g.RowPtr, len(g.Col))
	}
	return g
}

// random makes a connected random network with conductances spread over a few powers of e.
func random(r *rand.Rand, n, extra int) [][]float64 {
	w := make([][]float64, n)
	for i := range w {
		w[i] = make([]float64, n)
	}
	join := func(i, j int) {
		if i != j {
			w[i][j] = math.Exp(r.NormFloat64())
			w[j][i] = w[i][j]
		}
	}
	for i := 1; i < n; i++ {
		join(i, r.IntN(i))
	}
	for range extra {
		join(r.IntN(n), r.IntN(n))
	}
	return w
}

// All labels joined to each other with equal weight: the others say their mean, and the studentised residual is the
// textbook one of a sample, (y_i - ybar) / (s_(i) sqrt(1 - 1/l)), s_(i) the standard deviation of the others.
func TestAuditNumbersOnACompleteGraph(t *testing.T) {
	r := rand.New(rand.NewPCG(51, 0))
	const l = 9
	y := make([]float64, l)
	for i := range y {
		y[i] = 100 + r.NormFloat64()
	}
	y[4] += 12
	s := mat.NewSymDense(l, nil)
	for i := range l {
		for j := range i {
			s.SetSym(i, j, -2.5)
		}
		s.SetSym(i, i, 2.5*(l-1))
	}
	d, err := AuditNumbers(y, s)
	if err != nil {
		t.Fatal(err)
	}
	if d[0].Label != 4 || d[0].Adjusted > .01 || d[1].Adjusted < d[0].Adjusted {
		t.Errorf("the planted label: %+v", d[0])
	}
	for _, q := range d {
		others := slices.Delete(slices.Clone(y), q.Label, q.Label+1)
		near(t, "what the others say", q.Says, stat.Mean(others, nil), 1e-10)
		want := (y[q.Label] - stat.Mean(y, nil)) / (stat.StdDev(others, nil) * math.Sqrt(1-1./l))
		near(t, "studentised residual", q.Support, want, 1e-9)
		near(t, "p", q.P, 2*distuv.StudentsT{Sigma: 1, Nu: l - 2}.CDF(-math.Abs(want)), 1e-12)
		if len(q.Voices) != mostVoices {
			t.Errorf("%d voices", len(q.Voices))
		}
		near(t, "voice", q.Voices[0].Weight, 1./(l-1), 1e-12)
	}
	// Two labels, or no agreement of sizes.
	if d, err := AuditNumbers([]float64{1, 2}, mat.NewSymDense(2, []float64{1, -1, -1, 1})); err != nil || !math.IsNaN(d[0].P) {
		t.Errorf("two labels: %+v, %v", d, err)
	}
	if _, err := AuditNumbers(y, nil); err == nil {
		t.Error("no Schur complement accepted")
	}
	// All others agree exactly: certain doubt, and no panic.
	flat := make([]float64, l)
	flat[3] = 1
	if d, err = AuditNumbers(flat, s); err != nil || d[0].Label != 3 || !math.IsInf(d[0].Support, 1) || d[0].P != 0 {
		t.Errorf("%+v, %v", d[0], err)
	}
}

func TestAuditClassesByHand(t *testing.T) {
	nan := math.NaN()
	given := []int{0, 1, 2, 0}
	prob := [][]float64{{.5, .3, .2}, {.90, .02, .08}, {nan, nan, nan}, {.02, .18, .80}}
	s := mat.NewSymDense(4, []float64{3, -2, 0, -1, -2, 4, -1, -1, 0, -1, 1, 0, -1, -1, 0, 2})
	d, err := AuditClasses(given, prob, s)
	if err != nil {
		t.Fatal(err)
	}
	var order []int
	for _, q := range d {
		order = append(order, q.Label)
	}
	if !slices.Equal(order, []int{1, 3, 0, 2}) {
		t.Fatalf("order %v", order)
	}
	near(t, "strength", d[0].Strength, math.Log(45), 1e-12)
	near(t, "p", d[0].P, .02, 1e-15)
	near(t, "p", d[2].P, 1, 1e-15)
	near(t, "adjusted", d[0].Adjusted, .06, 1e-15)
	near(t, "adjusted", d[1].Adjusted, .06, 1e-15)
	near(t, "adjusted", d[2].Adjusted, 1, 1e-15)
	if d[0].Says != 0 || !slices.Equal(d[0].Voices, []Voice{{0, .5}, {3, .25}}) {
		t.Errorf("what they say: %+v", d[0])
	}
	if !math.IsNaN(d[3].P) || !math.IsNaN(d[3].Adjusted) {
		t.Errorf("a label without an answer: %+v", d[3])
	}
	if _, err := AuditClasses([]int{3}, prob[:1], nil); err == nil {
		t.Error("class 3 of 3 accepted")
	}
	if _, err := AuditClasses(given, prob[:1], nil); err == nil {
		t.Error("sizes")
	}
}

func TestConflicts(t *testing.T) {
	got := Conflicts([]int32{5, 2, 5, 7, 2, 5}, []int{1, 0, 1, 1, 1, 0})
	if len(got) != 2 || !slices.Equal(got[0], []int{1, 4}) || !slices.Equal(got[1], []int{0, 2, 5}) {
		t.Errorf("%v", got)
	}
}

// Against all pairs of labels, distances by Floyd and Warshall.
func TestSteepestPairAgainstAllPairs(t *testing.T) {
	for seed := range uint64(300) {
		r := rand.New(rand.NewPCG(52, seed))
		n := 4 + r.IntN(30)
		w := random(r, n, r.IntN(2*n))
		dist, logs := make([][]float64, n), make([][]float64, n)
		for i := range w {
			dist[i], logs[i] = make([]float64, n), make([]float64, n)
			for j, v := range w[i] {
				dist[i][j] = math.Inf(1)
				if v > 0 {
					dist[i][j], logs[i][j] = 1/v, math.Log(v)
				}
			}
			dist[i][i] = 0
		}
		for k := range n {
			for i := range n {
				for j := range n {
					dist[i][j] = min(dist[i][j], dist[i][k]+dist[k][j])
				}
			}
		}
		var at []int32
		var y []float64
		for v := range n {
			if r.IntN(3) == 0 {
				at, y = append(at, int32(v)), append(y, float64(r.IntN(4)))
			}
		}
		want := 0.0
		for i := range at {
			for j := range at {
				if i != j {
					want = max(want, (y[j]-y[i])/dist[at[i]][at[j]])
				}
			}
		}
		p, ok, err := SteepestPair(network(logs), at, y)
		if err != nil {
			t.Fatal(err)
		}
		if ok != (want > 0) {
			t.Fatalf("graph %d: a pair found: %v, largest slope %v", seed, ok, want)
		}
		if !ok {
			continue
		}
		near(t, "slope", p.Slope, want, 1e-9*want)
		near(t, "length", p.Length, dist[at[p.Low]][at[p.High]], 1e-9*p.Length)
		near(t, "slope of the pair", (y[p.High]-y[p.Low])/p.Length, want, 1e-9*want)
	}
	if _, _, err := SteepestPair(network([][]float64{{0}}), []int32{3}, []float64{1}); err == nil {
		t.Error("a vertex that is not there accepted")
	}
	if _, _, err := SteepestPair(network([][]float64{{0}}), []int32{0}, nil); err == nil {
		t.Error("sizes")
	}
}
