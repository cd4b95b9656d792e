package laplace

import (
	"context"
	"math/rand/v2"
	"testing"
	"unsafe"
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
		a := &s.a.sddm
		d4, e4, f4 := make([]float64, 4*n), make([]float64, 4*n), make([]float64, 4*n)
		for i := range d4 {
			d4[i] = r.NormFloat64()
		}
		col, w := unsafe.SliceData(a.col[a.ptr[lo]:]), unsafe.SliceData(a.w[a.ptr[lo]:])
		a.apply(4, d4, e4, lo, n)
		csr4Go(col, w, &a.ptr[lo], &a.excess[lo], &d4[0], &d4[4*lo], &f4[4*lo], n-lo)
		for c := range 4 {
			d1, e1, f1 := make([]float64, n), make([]float64, n), make([]float64, n)
			for i := range n {
				d1[i] = d4[4*i+c]
			}
			a.apply(1, d1, e1, lo, n)
			csr1Go(col, w, &a.ptr[lo], &a.excess[lo], &d1[0], &d1[lo], &f1[lo], n-lo)
			for i := range n {
				if e1[i] != f1[i] || e1[i] != e4[4*i+c] || e1[i] != f4[4*i+c] {
					t.Fatalf("row %d: one vector %v in Go %v, four %v in Go %v", i, e1[i], f1[i], e4[4*i+c], f4[4*i+c])
				}
			}
		}
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
