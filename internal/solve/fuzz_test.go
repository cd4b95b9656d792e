package solve

import (
	"context"
	"errors"
	"math"
	"testing"

	"pinfill/internal/sparse"
	"pinfill/internal/testproblems"
)

// FuzzRun reads any bytes as a graph of at most seven vertices and compares with the slow oracles. A certified answer
// that is farther off than its tolerance is a silent miss; so is an answer for a component without a label.
func FuzzRun(f *testing.F) {
	f.Add([]byte{4, 0, 0, 255, 1, 3, 128, 12, 0, 23, 16, 34, 240, 40, 8})
	f.Add([]byte{6, 5, 1, 10, 2, 20, 3, 30, 12, 127, 23, 127, 34, 127, 45, 129, 56, 0, 60, 0})
	f.Add([]byte{3, 9, 0, 0, 1, 0, 12, 1, 23, 1, 31, 1})
	f.Add([]byte{5, 2, 0, 0, 1, 200, 12, 1})
	f.Add([]byte{7, 11, 2, 7, 2, 9, 4, 200, 12, 1, 23, 90, 13, 34, 45, 200, 56, 3, 60, 255, 61, 4})
	f.Fuzz(func(t *testing.T, data []byte) {
		tp, energy := tinyProblem(data)
		if len(tp.Fixed) == 0 {
			return
		}
		p := problemOf(tp)
		p.Energy = energy
		r, err := Run(context.Background(), p, Settings{Workers: 1})
		if cut := unlabelled(tp); cut {
			var u *UnreachableError
			if !errors.As(err, &u) {
				t.Fatalf("a component without a label gives %v", err)
			}
			return
		}
		if err != nil {
			t.Fatal(err)
		}
		if energy == Conductance {
			tp.Graph = asSlopes(tp)
		}
		want, within := oracle(tp)
		if e := testproblems.Distance(r.Values, want) / tp.Range(); r.Status.Proven() && !(e <= 1e-9+within) {
			t.Fatalf("silent miss: %.3g from the oracle (itself within %.2g) at p=%v, %+v", e, within, tp.P, r.Certificate)
		}
		if !r.Status.Proven() {
			t.Fatalf("missed at p=%v: %v, %+v", tp.P, r.Status, r.Certificate)
		}
	})
}

// tinyProblem reads vertices, p and energy, labels, and edges with ln w from -4 to 4: a byte names two vertices by its
// tens and ones.
func tinyProblem(data []byte) (testproblems.Problem, Energy) {
	at := func(i int) int {
		if i < len(data) {
			return int(data[i])
		}
		return 0
	}
	powers := []float64{1.5, 2, 2.5, 3, 8, math.Inf(1)}
	n := 2 + at(0)%6
	tp := testproblems.Problem{P: powers[at(1)%len(powers)]}
	energy := Energy(at(1) / len(powers) % 2)
	held := map[int]float64{}
	for i := range 2 {
		held[at(2+2*i)%n] = float64(at(3+2*i)) / 255
	}
	for v := range n {
		if value, ok := held[v]; ok {
			tp.Fixed, tp.Values = append(tp.Fixed, int32(v)), append(tp.Values, value)
		}
	}
	var edges []testproblems.Edge
	seen := map[[2]int]bool{}
	for i := 6; i+1 < len(data); i += 2 {
		a, b := at(i)/10%n, at(i)%10%n
		pair := [2]int{min(a, b), max(a, b)}
		if a != b && !seen[pair] {
			seen[pair] = true
			edges = append(edges, testproblems.Edge{I: a, J: b, LogW: float64(int8(at(i+1))) / 32})
		}
	}
	tp.Graph = testproblems.Graph(n, edges)
	return tp, energy
}

// asSlopes gives the slope weights of a conductance energy, whose logarithms the oracles take: w^p = c, and all 1 at infinity.
func asSlopes(tp testproblems.Problem) *sparse.CSR {
	g := *tp.Graph
	g.Val = make([]float64, len(tp.Graph.Val))
	for k, v := range tp.Graph.Val {
		if !math.IsInf(tp.P, 1) {
			g.Val[k] = v / tp.P
		}
	}
	return &g
}

// unlabelled reports whether a vertex cannot be reached from any label.
func unlabelled(tp testproblems.Problem) bool {
	reached := make([]bool, tp.Graph.N)
	queue := append([]int32(nil), tp.Fixed...)
	for _, v := range queue {
		reached[v] = true
	}
	for len(queue) > 0 {
		v := queue[0]
		queue = queue[1:]
		for k := tp.Graph.RowPtr[v]; k < tp.Graph.RowPtr[v+1]; k++ {
			if u := tp.Graph.Col[k]; !reached[u] {
				reached[u] = true
				queue = append(queue, u)
			}
		}
	}
	for _, r := range reached {
		if !r {
			return true
		}
	}
	return false
}
