package study

import (
	"context"
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/advise"
	"pinfill/internal/choose"
)

// grow labels from ten random rows up to most, batch rows at a time as Next names them, and gives the accuracy at
// every count of labels reached.
func grow(t *testing.T, l *lab, at []int32, most, batch int, doubtful bool) map[int]float64 {
	t.Helper()
	reached := map[int]float64{}
	for {
		a := l.solveClasses(t, l.labels(at, func(k int) int { return l.class[at[k]] }), 2, choose.AutoBalance)
		reached[len(at)] = l.accuracy(a)
		if len(at) >= most {
			return reached
		}
		var doubt []float64
		if doubtful {
			doubt = make([]float64, l.n)
			var s []float64
			for v := range l.n {
				s = a.shares(s, v)
				slices.Sort(s)
				if top := s[len(s)-1]; top > 0 {
					doubt[v] = 1 - (top-s[len(s)-2])/top
				}
			}
		}
		picks, err := advise.Next(context.Background(), advise.NextProblem{
			Conductance: l.conduct, Labelled: at, Doubt: doubt, Count: min(batch, most-len(at)),
		})
		if err != nil {
			t.Fatal(err)
		}
		for _, p := range picks {
			at = append(at, p.Vertex)
		}
		at = slices.Clone(at)
		slices.Sort(at)
	}
}

// TestNext prints how many labels chosen by Next do the work of 60 drawn at random, from the same ten to start with.
func TestNext(t *testing.T) {
	if *drawings == 0 {
		t.Skip("a study: make coverage")
	}
	batches, names := []int{13, 5, 26}, []string{"digits", "clips", "seabed"}
	if quick() {
		batches, names = batches[:1], names[:1]
	}
	fmt.Printf("%-8s %5s %9s | %s\n", "table", "batch", "random 60", "accuracy by number of labels")
	for _, name := range names {
		l := get(t, name)
		for _, batch := range batches {
			var random mean
			at := map[int]*mean{}
			draws := min(max(fewer(name, 2)/2, 2), 20)
			for d := range draws {
				r := rand.New(rand.NewPCG(uint64(d), 99))
				all := r.Perm(l.n)
				start := func(count int) []int32 {
					var s []int32
					for _, v := range all[:count] {
						s = append(s, int32(v))
					}
					slices.Sort(s)
					return s
				}
				sixty := start(60)
				random.add(l.accuracy(l.solveClasses(t, l.labels(sixty, func(k int) int { return l.class[sixty[k]] }), 2, choose.AutoBalance)))
				for n, v := range grow(t, l, start(10), 36, batch, true) {
					if at[n] == nil {
						at[n] = &mean{}
					}
					at[n].add(v)
				}
			}
			fmt.Printf("%-8s %5d %9.3f |", name, batch, random.value())
			counts := []int{}
			for n := range at {
				counts = append(counts, n)
			}
			slices.Sort(counts)
			for _, n := range counts {
				fmt.Printf(" %d: %.3f", n, at[n].value())
			}
			fmt.Println()
			if at[36].value() < random.value() {
				t.Errorf("%s in batches of %d: %.3f with 36 chosen labels, %.3f with 60 random ones", name, batch, at[36].value(), random.value())
			}
		}
	}
}
