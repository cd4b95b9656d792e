package laplace

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
)

// liar is a preconditioner that claims that nothing is left to correct, or spoils the answer on the way.
type liar struct {
	jacobi
	spoil bool
}

func (m liar) apply(k *block, size *scalars) applied {
	z := m.jacobi.apply(k, size)
	if m.spoil {
		k.x[0] += 1e-3 // the recurrence does not see it
	}
	z.largest = scalars{}
	return z
}

func (liar) slack(*lanczos) float64 { return 0 }

// TestResidualRefusesPlantedAnswers: an answer that the recurrence calls solved, but is not, must not pass.
func TestResidualRefusesPlantedAnswers(t *testing.T) {
	r := rand.New(rand.NewPCG(41, 2))
	for _, spoil := range []bool{false, true} {
		c := randomNetwork(r, 300, 600, func() float64 { return r.Float64() + .1 })
		s, err := New(context.Background(), c, []int32{0, 9}, Options{Method: Jacobi})
		if err != nil {
			t.Fatal(err)
		}
		k := newBlock(&s.a.sddm, 1, 1)
		s.a.inject([]float64{-1, 1}, k.b)
		k.unit[0] = 1
		columns, _, err := pcg(context.Background(), k, 1e-10, liar{spoil: spoil}, nil)
		if err != nil {
			t.Fatal(err)
		}
		st := columns[0].stats
		rr, _ := k.residual()
		if got := math.Sqrt(rr[0] / columns[0].bb); !spoil && math.Abs(got-st.Residual) > 1e-12 {
			t.Errorf("reported residual %v, true %v", st.Residual, got)
		}
		if spoil && st.Converged {
			t.Errorf("a spoilt answer passed: %+v", st)
		}
		if !spoil && !st.Converged {
			t.Errorf("an honest residual was refused: %+v", st)
		}
	}
}
