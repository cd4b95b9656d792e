package choose

import (
	"math"
	"math/rand/v2"
	"testing"

	"pinfill/internal/solve"
)

// The decisions under matchWeights fall to the classes in the shares asked, up to ties and the last temperature.
func TestMatchWeightsHitsTheShares(t *testing.T) {
	r := rand.New(rand.NewPCG(91, 5))
	for range 20 {
		n, classes := 2000, 2+r.IntN(4)
		scores := make([][]float64, classes)
		free := make([]int32, n)
		for v := range n {
			free[v] = int32(v)
		}
		share := make([]float64, classes)
		for c := range classes {
			scores[c] = make([]float64, n)
			lift := math.Exp(2 * r.NormFloat64())
			for v := range n {
				scores[c][v] = lift * math.Exp(r.NormFloat64())
			}
			share[c] = 1 + 2*r.Float64()
		}
		normalise(share)
		w := matchWeights(scores, free, share, 2)
		got := decidedShares(scores, w, Labels{})
		for c := range share {
			if math.Abs(got[c]-share[c]) > 0.02 {
				t.Errorf("shares %v, asked %v", got, share)
			}
		}
	}
}

// Two cliques joined by one weak edge, by hand: cutting there costs the weak edge over each volume.
func TestNormalisedCutByHand(t *testing.T) {
	g := network(6, []edge{{0, 1, 1}, {0, 2, 1}, {1, 2, 1}, {3, 4, 1}, {3, 5, 1}, {4, 5, 1}, {2, 3, .1}})
	for e := range g.Val {
		g.Val[e] = math.Exp(g.Val[e])
	}
	scores := [][]float64{{1, 1, 1, 0, 0, 0}, {0, 0, 0, 1, 1, 1}}
	l := Labels{Vertex: []int32{0, 5}, Target: [][]float64{{1, 0}, {0, 1}}}
	got := normalisedCut(g, scores, equalWeights(2), l, 1)
	if want := 2 * .1 / 6.1; math.Abs(got-want) > 1e-12 {
		t.Errorf("cut %v, want %v", got, want)
	}
	scores[0][2], scores[1][2] = 0, 1 // vertex 2 goes over: cuts 2 edges of weight 1
	got = normalisedCut(g, scores, equalWeights(2), l, 1)
	if want := 2./4 + 2./8.2; math.Abs(got-want) > 1e-12 {
		t.Errorf("cut %v, want %v", got, want)
	}
}

// Where the field leans to one class, the balance that cuts at the gap is taken.
func TestAutoBalanceTakesTheGap(t *testing.T) {
	var edges []edge
	for u := range 10 {
		for v := range u {
			edges = append(edges, edge{u, v, 1}, edge{u + 10, v + 10, 1})
		}
	}
	edges = append(edges, edge{9, 10, .01})
	g := network(20, edges)
	scores := make([][]float64, 2)
	for c := range scores {
		scores[c] = make([]float64, 20)
	}
	for v := range 20 {
		f := .95
		if v >= 10 {
			f = .6 // the second clique sees little of its own label
		}
		scores[0][v], scores[1][v] = f, 1-f
	}
	scores[0][0], scores[1][0], scores[0][19], scores[1][19] = 1, 0, 0, 1
	l := Labels{Vertex: []int32{0, 19}, Target: [][]float64{{1, 0}, {0, 1}}}
	w, err := Balance{}.Weigh(solve.Problem{Graph: g, P: 2}, scores, l, 1)
	if err != nil {
		t.Fatal(err)
	}
	for v := range 20 {
		want := 0
		if v >= 10 {
			want = 1
		}
		if got := w.Decide(func(c int) float64 { return scores[c][v] }); got != want {
			t.Errorf("vertex %d is class %d", v, got)
		}
	}
}

func TestWeighOneClass(t *testing.T) {
	g := network(3, []edge{{0, 1, 1}, {1, 2, 1}})
	l := Labels{Vertex: []int32{0}, Target: [][]float64{{1}}}
	w, err := Balance{}.Weigh(solve.Problem{Graph: g, P: 2}, [][]float64{{1, 1, 1}}, l, 1)
	if err != nil || len(w) != 1 || w[0] != 1 {
		t.Errorf("%v, %v", w, err)
	}
}

// A path with one label held away from a flat field is all spike; a straight line is none.
func TestMeasureByHand(t *testing.T) {
	var edges []edge
	for v := range 10 {
		edges = append(edges, edge{v, v + 1, 1})
	}
	g := network(11, edges)
	l := Labels{Task: Numbers, Vertex: []int32{0, 10}, Target: [][]float64{{0, 1}}}
	line := make([]float64, 11)
	for v := range line {
		line[v] = float64(v) / 10
	}
	d := Measure(solve.Problem{Graph: g, P: 2}, l, [][]float64{line})
	// (0 - .1)/(0 - .5) = .2 at either end; q90 - q10 of .1 .. .9 is .64; 2 of 10 edges touch a label.
	if math.Abs(d.Spike-.2) > 1e-12 || math.Abs(d.Bulk-.64) > 1e-12 || math.Abs(d.Kappa-.2) > 1e-12 {
		t.Errorf("line: %+v", d)
	}
	flat := make([]float64, 11)
	for v := range flat {
		flat[v] = .5
	}
	flat[0], flat[10] = 0, 1
	d = Measure(solve.Problem{Graph: g, P: 2}, l, [][]float64{flat})
	if d.Spike != 1 || d.Bulk != 0 || d.Kappa != 1 {
		t.Errorf("spikes: %+v", d)
	}
}
