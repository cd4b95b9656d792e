package laplace

import (
	"context"
	"math/rand/v2"
	"testing"
)

// TestKernelsAgreeToTheBit: assembly and Go, one vector and four.
func TestKernelsAgreeToTheBit(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for range 50 {
		n := 2 + r.IntN(100)
		c := randomNetwork(r, n, r.IntN(6*n), r.Float64)
		s, err := New(context.Background(), c, []int32{0}, Options{})
		if err != nil {
			t.Fatal(err)
		}
		l := newLevel(&s.a.sddm, 1)
		n = l.n
		x := make([]float32, 4*n)
		for i := range x {
			x[i] = float32(r.NormFloat64())
		}
		lo := r.IntN(n)
		y4, z4 := make([]float32, 4*n), make([]float32, 4*n)
		l.apply(4, x, y4, lo, n)
		quads := at(&l.quads[0], int(l.start[lo]))
		rows4Go(quads, &l.start[lo], &l.tie[lo], &x[0], &x[4*lo], &z4[4*lo], n-lo)
		for c := range 4 {
			x1, y1, z1 := make([]float32, n), make([]float32, n), make([]float32, n)
			for i := range n {
				x1[i] = x[4*i+c]
			}
			l.apply(1, x1, y1, lo, n)
			rows1Go(quads, &l.start[lo], &l.tie[lo], &x1[0], &x1[lo], &z1[lo], n-lo)
			for i := range n {
				if y1[i] != z1[i] || y1[i] != y4[4*i+c] || y1[i] != z4[4*i+c] {
					t.Fatalf("row %d: one vector %v in Go %v, four %v in Go %v", i, y1[i], z1[i], y4[4*i+c], z4[4*i+c])
				}
			}
		}
	}
}
