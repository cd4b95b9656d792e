package job

import (
	"encoding/json"
	"math"
	"testing"
)

// JSON has no word for infinities and not-a-number; the record has.
func TestNumbersAlwaysEncode(t *testing.T) {
	for _, v := range []float64{0, 1.5, -2e-300, 1e21, math.Inf(1), math.Inf(-1), math.NaN()} {
		b, err := json.Marshal(Number(v))
		if err != nil {
			t.Fatal(err)
		}
		var back Number
		if err := json.Unmarshal(b, &back); err != nil {
			t.Fatal(err)
		}
		if got := float64(back); got != v && !(math.IsNaN(got) && math.IsNaN(v)) {
			t.Errorf("%v came back as %v by way of %s", v, got, b)
		}
	}
	if _, err := encodeRecord(&Record{Solves: []SolveFigures{{Gap: Number(math.NaN()), Width: Number(math.Inf(1))}}}); err != nil {
		t.Error(err)
	}
}
