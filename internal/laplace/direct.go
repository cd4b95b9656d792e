package laplace

import (
	"context"
	"math"
)

const refinements = 3

// solveDirect solves the first used columns of k by elimination. Where the right-hand side comes from values in
// [-1, 1] at the fixed vertices, |b| <= e and A^-1 e = 1 bound the error of every entry by the roundings of the
// elimination, a small multiple of n units in the last place at worst, whatever the condition of A; the residual, in
// which large conductances multiply the rounding of x itself, would tell less. Other right-hand sides are refined
// until the correction is small.
func (s *System) solveDirect(ctx context.Context, k *block, used int, tol float64) (Stats, error) {
	if s.factor == nil {
		f, err := newFactor(ctx, k.a, s.plan)
		if err != nil {
			return Stats{}, err
		}
		s.factor = f
	}
	bb := k.norm2(k.b)
	s.factor.solve(k.width, k.b, k.x, k.p)
	rounding := 2 * float64(k.a.n) * 0x1p-53
	total := Stats{}
	for step := 0; ; step++ {
		if err := ctx.Err(); err != nil {
			return total, err
		}
		rr, _ := k.residual()
		s.factor.solve(k.width, k.r, k.z, k.p)
		total = Stats{Method: Direct, Converged: true}
		var refine scalars
		going := false
		for c := range used {
			st := Stats{Method: Direct, Converged: true}
			if bb[c] > 0 {
				largest := 0.0
				for at := c; at < len(k.z); at += k.width {
					largest = max(largest, math.Abs(k.z[at]))
				}
				st.Residual, st.Correction = math.Sqrt(rr[c]/bb[c]), largest/k.scale(c)
				st.Converged = st.Residual <= tol && st.Correction <= tol
				if k.unit[c] > 0 && !st.Converged {
					st.Correction = min(st.Correction, rounding)
					st.Converged = st.Correction <= tol
				}
				if !st.Converged && k.unit[c] == 0 {
					refine[c] = 1
					going = true
				}
			}
			total.merge(st)
		}
		if !going || step == refinements {
			return total, nil
		}
		for c := range used {
			if refine[c] != 0 {
				for at := c; at < len(k.x); at += k.width {
					k.x[at] += k.z[at]
				}
			}
		}
	}
}
