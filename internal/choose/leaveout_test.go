package choose

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// bySolving is the oracle: every fold solved from nothing, without its labels.
func bySolving(t *testing.T, p solve.Problem, l Labels, fold []int32) (score [][]float64, mass [][]float64, fields [][][]float64) {
	t.Helper()
	score = make([][]float64, l.Count())
	folds := int(slices.Max(fold)) + 1
	for f := range folds {
		var ks []int
		for k := range fold {
			if int(fold[k]) == f {
				ks = append(ks, k)
			}
		}
		rest := l.without(ks)
		field, _, err := Solve(context.Background(), p, rest, nil, solve.Settings{Tolerance: 1e-10})
		if err != nil {
			t.Fatal(err)
		}
		m := make([]float64, len(l.Target))
		for c := range l.Target {
			for v, y := range field[c] {
				if !slices.Contains(rest.Vertex, int32(v)) && !math.IsNaN(y) {
					m[c] += y
				}
			}
		}
		for _, k := range ks {
			for c := range l.Target {
				score[k] = append(score[k], field[c][l.Vertex[k]])
			}
		}
		mass, fields = append(mass, m), append(fields, field)
	}
	return score, mass, fields
}

// The oracle is a solve without the labels of each fold. At p = 2 the closed form is compared at 1e-10 of the range,
// which is 10 x what either side is asked for; elsewhere both are certified to 1e-9.
func TestLeaveOutAgainstSolvingAgain(t *testing.T) {
	r := rand.New(rand.NewPCG(71, 5))
	for _, p := range []float64{2, 1.5, 3, 8} {
		for trial := range 8 {
			n, classes := 12+r.IntN(40), r.IntN(4)
			if classes == 1 {
				classes = 2
			}
			g := randomGraph(r, n, 2*n)
			l := randomLabels(r, n, 5+r.IntN(5), classes)
			prob := solve.Problem{Graph: g, P: p, Energy: solve.Energy(trial % 2)}
			folds := FoldsOf(l, l.Count(), 0)
			if trial%4 == 3 {
				folds = FoldsOf(l, 3, uint64(trial))
			}
			want, mass, fields := bySolving(t, prob, l, folds)
			tol := 1e-10
			if p != 2 {
				tol = 3e-9
			}
			spread := 0.0
			for _, target := range l.Target {
				spread = max(spread, slices.Max(target)-slices.Min(target))
			}
			tol *= max(spread, 1)
			start, _, err := Solve(context.Background(), prob, l, nil, solve.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			o := LeaveOptions{Fold: folds, Tolerance: 1e-11, Start: start, Field: func(f, c int, got []float64) error {
				for v := range got {
					if !near(got[v], fields[f][c][v], tol) {
						return fmt.Errorf("p %v trial %d: fold %d class %d vertex %d: %v, by solving %v", p, trial, f, c, v, got[v], fields[f][c][v])
					}
				}
				return nil
			}}
			if p != 2 {
				o.Tolerance = 1e-10
			}
			got, err := LeaveOut(context.Background(), prob, l, o)
			if err != nil {
				t.Fatal(err)
			}
			for k := range want {
				for c := range want[k] {
					if !near(got.Score[k][c], want[k][c], tol) {
						t.Errorf("p %v trial %d: label %d class %d: %v, by solving %v", p, trial, k, c, got.Score[k][c], want[k][c])
					}
				}
			}
			for f := range mass {
				for c := range mass[f] {
					if !near(got.Mass[f][c], mass[f][c], float64(n)*tol) {
						t.Errorf("p %v trial %d: fold %d class %d: mass %v, by solving %v", p, trial, f, c, got.Mass[f][c], mass[f][c])
					}
				}
			}
			if got.Exact != (p == 2) {
				t.Errorf("p %v: Exact = %v", p, got.Exact)
			}
		}
	}
}

// Labels in a component of their own have nothing to be left out against; the other component does not notice.
func TestLeaveOutAlone(t *testing.T) {
	g := network(7, []edge{{0, 1, 1}, {1, 2, 2}, {2, 3, 1}, {4, 5, 1}, {5, 6, 1}})
	l := Labels{Vertex: []int32{0, 3, 5}, Target: [][]float64{{1, 0, 1}, {0, 1, 0}}}
	for _, p := range []float64{2, 3} {
		got, err := LeaveOut(context.Background(), solve.Problem{Graph: g, P: p}, l, LeaveOptions{})
		if err != nil {
			t.Fatal(err)
		}
		for c := range 2 {
			if !math.IsNaN(got.Score[2][c]) {
				t.Errorf("p %v: a label alone in its component is answered %v", p, got.Score[2][c])
			}
		}
		// Left out, an end of the chain takes the other end's value all along.
		if got.Score[0][0] != 0 || got.Score[0][1] != 1 || got.Score[1][0] != 1 || got.Score[1][1] != 0 {
			t.Errorf("p %v: scores %v", p, got.Score)
		}
		// Left out at vertex 5, the component gives no mass; vertices 1, 2, 3 give theirs.
		if math.IsNaN(got.Mass[2][0]) || math.Abs(got.Mass[2][0]+got.Mass[2][1]-2) > 1e-9 && p == 2 {
			t.Errorf("p %v: mass %v", p, got.Mass[2])
		}
	}
}

// A label with its own left-out answer changes nothing when it is put back (any p).
func TestLeaveOutIsConsistent(t *testing.T) {
	r := rand.New(rand.NewPCG(72, 5))
	g := randomGraph(r, 30, 60)
	l := randomLabels(r, 30, 6, 0)
	for _, p := range []float64{2, 4} {
		prob := solve.Problem{Graph: g, P: p}
		got, err := LeaveOut(context.Background(), prob, l, LeaveOptions{})
		if err != nil {
			t.Fatal(err)
		}
		for k := range l.Vertex {
			with := Labels{Task: Numbers, Vertex: l.Vertex, Target: [][]float64{slices.Clone(l.Target[0])}}
			with.Target[0][k] = got.Score[k][0]
			a, _, err := Solve(context.Background(), prob, with, nil, solve.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			b, _, err := Solve(context.Background(), prob, l.without([]int{k}), nil, solve.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			for v := range a[0] {
				if !near(a[0][v], b[0][v], 1e-7) {
					t.Fatalf("p %v label %d vertex %d: %v with its answer, %v without it", p, k, v, a[0][v], b[0][v])
				}
			}
		}
	}
}

func TestFoldsKeepGroupsAndSpreadClasses(t *testing.T) {
	r := rand.New(rand.NewPCG(73, 5))
	for range 50 {
		l := randomLabels(r, 200, 40, 4)
		for _, count := range []int{3, 5, 8} {
			fold := FoldsOf(l, count, 11)
			per := make([][]int, 4)
			size := make([]int, count)
			for c := range per {
				per[c] = make([]int, count)
			}
			for k, f := range fold {
				per[l.Class(k)][f]++
				size[f]++
			}
			if slices.Max(size)-slices.Min(size) > 1 {
				t.Fatalf("fold sizes %v", size)
			}
			for c := range per {
				if slices.Max(per[c])-slices.Min(per[c]) > 1 {
					t.Fatalf("class %d over folds: %v", c, per[c])
				}
			}
		}
		l.Group = make([]int32, 40)
		for k := range l.Group {
			l.Group[k] = int32(r.IntN(9))
		}
		for _, count := range []int{3, 40} {
			fold := FoldsOf(l, count, 11)
			of := map[int32]int32{}
			for k, f := range fold {
				if seen, ok := of[l.Group[k]]; ok && seen != f {
					t.Fatalf("group %d in folds %d and %d", l.Group[k], seen, f)
				}
				of[l.Group[k]] = f
			}
			if count == 40 && len(of) != int(slices.Max(fold))+1 {
				t.Fatalf("%d groups in %d folds", len(of), slices.Max(fold)+1)
			}
		}
	}
}

// Renumbering vertices renumbers the answer.
func TestLeaveOutFollowsPermutation(t *testing.T) {
	r := rand.New(rand.NewPCG(74, 5))
	g := randomGraph(r, 40, 80)
	l := randomLabels(r, 40, 8, 3)
	a, err := LeaveOut(context.Background(), solve.Problem{Graph: g, P: 2}, l, LeaveOptions{})
	if err != nil {
		t.Fatal(err)
	}
	order := make([]int32, 40)
	for v, x := range r.Perm(40) {
		order[v] = int32(x)
	}
	inverse := sparse.Inverse(order)
	type pair struct {
		v int32
		k int
	}
	var ps []pair
	for k, v := range l.Vertex {
		ps = append(ps, pair{inverse[v], k})
	}
	slices.SortFunc(ps, func(a, b pair) int { return int(a.v - b.v) })
	m := Labels{Target: make([][]float64, 3)}
	for _, q := range ps {
		m.Vertex = append(m.Vertex, q.v)
		for c := range m.Target {
			m.Target[c] = append(m.Target[c], l.Target[c][q.k])
		}
	}
	b, err := LeaveOut(context.Background(), solve.Problem{Graph: sparse.Permute(g, order, 1), P: 2}, m, LeaveOptions{})
	if err != nil {
		t.Fatal(err)
	}
	for i, q := range ps {
		for c := range m.Target {
			if !near(b.Score[i][c], a.Score[q.k][c], 1e-10) {
				t.Errorf("label %d class %d: %v, renumbered %v", q.k, c, a.Score[q.k][c], b.Score[i][c])
			}
		}
	}
}
