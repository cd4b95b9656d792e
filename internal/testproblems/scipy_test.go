package testproblems

import (
	"crypto/sha256"
	"encoding/hex"
	"math"
	"testing"
)

func TestReferenceBelongsToItsScript(t *testing.T) {
	file, err := readReference()
	if err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256(script)
	if got := hex.EncodeToString(sum[:]); got != file.Script {
		t.Errorf("scipy.py has SHA-256 %s, scipy.json was written by %s: run the script again", got, file.Script)
	}
	if file.SciPy != "1.10.1" || len(file.Problems) != 24 {
		t.Errorf("SciPy %s, %d problems", file.SciPy, len(file.Problems))
	}
}

// The oracles of this package against SciPy 1.10.1 (spsolve for p = 2, linprog for p = inf).
func TestOraclesMeetSciPy(t *testing.T) {
	for _, r := range SciPy() {
		if f, _ := Reweight(r.Harmonic); !(r.Harmonic.Error(f) <= 1e-12) {
			t.Errorf("%s: %g off", r.Harmonic.Name, r.Harmonic.Error(f))
		}
		got := r.Inf.SteepestSlope(SteepestPaths(r.Inf))
		if !(math.Abs(got/r.Minimax-1) <= MinimaxTolerance) {
			t.Errorf("%s: steepest slope %v, linprog %v", r.Inf.Name, got, r.Minimax)
		}
	}
}
