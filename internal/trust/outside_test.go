package trust

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// Values of scikit-learn 1.2.1, written by testdata/reference.py.
type reference struct {
	Prob                        [][]float64
	Right                       []int
	Accuracy, Brier, ECE, Kappa float64
	LogLoss                     float64 `json:"log_loss"`
	Answer, Value               []float64
	RMSE, MAE, R2               float64
}

func load(t *testing.T) reference {
	t.Helper()
	data, err := os.ReadFile("testdata/reference.json")
	if err != nil {
		t.Fatal(err)
	}
	var r reference
	if err := json.Unmarshal(data, &r); err != nil {
		t.Fatal(err)
	}
	return r
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s = %.15g, want %.15g within %g", what, got, want, tol)
	}
}

func TestFiguresAgainstScikitLearn(t *testing.T) {
	r := load(t)
	f := MeasureClasses(r.Prob, r.Right)
	// The same sums in another order.
	near(t, "accuracy", f.Accuracy, r.Accuracy, 1e-13)
	near(t, "Brier score", f.Brier, r.Brier, 1e-13)
	near(t, "log loss", f.LogLoss, r.LogLoss, 1e-12)
	near(t, "calibration error", f.ECE, r.ECE, 1e-13)
	if f.Count != len(r.Right) {
		t.Errorf("count %d", f.Count)
	}
	predicted := make([]int, len(r.Prob))
	for i, p := range r.Prob {
		for c, v := range p {
			if v > p[predicted[i]] {
				predicted[i] = c
			}
		}
	}
	a, err := EstimateAccuracy(Sample{Classes: 4, Predicted: predicted, Truth: r.Right})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "kappa", a.Kappa, r.Kappa, 1e-13)
	near(t, "overall", a.Overall.Value, r.Accuracy, 1e-13)
	g := MeasureNumbers(r.Answer, r.Value)
	near(t, "RMSE", g.RMSE, r.RMSE, 1e-13)
	near(t, "MAE", g.MAE, r.MAE, 1e-13)
	near(t, "R2", g.R2, r.R2, 1e-12)
	var bias float64
	for i, v := range r.Answer {
		bias += (v - r.Value[i]) / float64(len(r.Answer))
	}
	near(t, "bias", g.Bias, bias, 1e-13)
}

// The example of Olofsson et al. (2014), section 5: four strata of a change map, areas in shares of the map, counts
// from memory, the printed digits of the paper's results. Its estimates reproduce to every printed digit.
func TestOlofssonExample(t *testing.T) {
	counts := [][]int{{66, 0, 5, 4}, {0, 55, 8, 12}, {1, 0, 153, 11}, {2, 1, 9, 313}}
	s := Sample{Classes: 4, StratumSize: []float64{0.020, 0.015, 0.320, 0.645}}
	for i, row := range counts {
		for j, n := range row {
			for range n {
				s.Predicted, s.Truth, s.Stratum = append(s.Predicted, i), append(s.Truth, j), append(s.Stratum, i)
			}
		}
	}
	a, err := EstimateAccuracy(s)
	if err != nil {
		t.Fatal(err)
	}
	const z = 1.96
	near(t, "overall", a.Overall.Value, .9465, .00005)
	near(t, "+-", z*a.Overall.SE, .0185, .00005)
	for c, want := range []struct{ u, ue, p, pe float64 }{
		{.88, .07, .749, .213}, {.73, .10, .847, .254}, {.93, .04, .935, .034}, {.96, .02, .962, .018},
	} {
		near(t, "user's accuracy", a.User[c].Value, want.u, .005)
		near(t, "+-", z*a.User[c].SE, want.ue, .005)
		near(t, "producer's accuracy", a.Producer[c].Value, want.p, .0005)
		near(t, "+-", z*a.Producer[c].SE, want.pe, .0005)
	}
	// 10,000,000 pixels of 30 m: 235,086 pixels of class 1, 21,158 +- 6,158 ha.
	const pixels, hectares = 1e7, .09
	near(t, "pixels", pixels*a.Area[0].Value, 235086, .5)
	near(t, "hectares", pixels*hectares*a.Area[0].Value, 21158, .5)
	near(t, "+-", z*pixels*hectares*a.Area[0].SE, 6158, .5)
	// A count moved is seen.
	s.Truth[0] = 1
	b, err := EstimateAccuracy(s)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(b.Area[0].Value-a.Area[0].Value)*pixels < 100 {
		t.Error("a wrong count left the area as it was")
	}
}
