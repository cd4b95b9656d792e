package solve

import (
	"context"
	"math"

	"pinfill/internal/plaplace"
)

// plan is a problem made ready for any values: its regions and, once used, their engines.
type plan struct {
	problem  Problem
	settings Settings
	regions  []region
	anchor   []int32            // vertex whose value each pendant vertex takes, or -1
	engines  []*plaplace.Solver // one a region, made when first used; finite p
	guesses  [][]plaplace.Guess // by region, then by set of values; nil where there are none
	progress func(share float64)
}

func newPlan(ctx context.Context, p Problem, s Settings) (*plan, error) {
	if err := checkGraph(p); err != nil {
		return nil, err
	}
	rs, anchor, err := regions(p)
	if err != nil {
		return nil, err
	}
	return &plan{problem: p, settings: s, regions: rs, anchor: anchor, engines: make([]*plaplace.Solver, len(rs))}, ctx.Err()
}

// scale maps given values to shares of their range and back, by differences, so that an offset far larger than the
// range costs no digits and a factor 2^k changes no bit.
type scale struct{ least, size float64 }

func scaleOf(values []float64) scale {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, y := range values {
		lo, hi = min(lo, y), max(hi, y)
	}
	if len(values) == 0 {
		return scale{}
	}
	return scale{lo, hi - lo}
}

func (c scale) share(y float64) float64 { return (y - c.least) / c.size }

// value is the inverse of share, kept within the range.
func (c scale) value(t float64) float64 {
	return min(max(c.least+float64(t*c.size), c.least), c.least+c.size)
}

// prepare finds starting points for several sets of values at once in the large regions, for finite p.
func (pl *plan) prepare(ctx context.Context, values [][]float64) error {
	pl.guesses = make([][]plaplace.Guess, len(pl.regions))
	if math.IsInf(pl.problem.P, 1) {
		return nil
	}
	for c := range pl.regions {
		r := &pl.regions[c]
		var shares [][]float64
		var which []int
		for set := range values {
			y := r.pick(values[set])
			own := scaleOf(y)
			if own.size == 0 {
				continue
			}
			for k := range y {
				y[k] = own.share(y[k])
			}
			shares = append(shares, y)
			which = append(which, set)
		}
		if len(shares) < 2 || r.free < largeRegion {
			continue
		}
		s, err := pl.engine(ctx, c)
		if err != nil {
			return err
		}
		got, err := s.Quadratics(ctx, shares)
		if err != nil {
			return err
		}
		if got == nil {
			continue
		}
		pl.guesses[c] = make([]plaplace.Guess, len(values))
		for k, set := range which {
			pl.guesses[c][set] = got[k]
		}
	}
	return nil
}

// pick gives the values at the region's fixed vertices.
func (r *region) pick(values []float64) []float64 {
	y := make([]float64, len(r.given))
	for k, g := range r.given {
		y[k] = values[g]
	}
	return y
}

const (
	together    = 8    // sets of values whose starting points are held at a time
	largeRegion = 1000 // free vertices from which that pays
)

// run solves for one set of values, number set of those that have guesses.
func (pl *plan) run(ctx context.Context, set int, values, start []float64) (Result, error) {
	n := pl.problem.Graph.N
	res := Result{Values: make([]float64, n), Status: Trivial}
	for k, v := range pl.problem.Fixed {
		res.Values[v] = values[k]
	}
	whole := scaleOf(values)
	done, total := 0, n-len(pl.problem.Fixed)
	for c := range pl.regions {
		if err := ctx.Err(); err != nil {
			return Result{Status: Stopped}, err
		}
		r := &pl.regions[c]
		y := r.pick(values)
		own := scaleOf(y)
		if own.size == 0 {
			for _, v := range r.vertices {
				res.Values[v] = own.least
			}
		} else if err := pl.runRegion(ctx, c, set, y, own, whole, start, &res); err != nil {
			return Result{Status: Stopped}, err
		}
		done += r.free
		if pl.progress != nil && r.free > 1000 {
			pl.progress(float64(done) / float64(total))
		}
	}
	for k, v := range pl.problem.Fixed {
		res.Values[v] = values[k]
	}
	for v, a := range pl.anchor {
		if a >= 0 {
			res.Values[v] = res.Values[a]
		}
	}
	if math.IsInf(pl.problem.P, 1) {
		res.Certificate.Gap, res.Certificate.Imbalance, res.Certificate.Width = math.NaN(), math.NaN(), math.NaN()
	} else {
		res.Certificate.SlopeImbalance = math.NaN()
	}
	switch {
	case res.Status == Trivial:
	case pl.settings.Rough && !math.IsInf(pl.problem.P, 1):
		res.Status = Rough
	default:
		res.Status = res.Certificate.status(pl.settings.tolerance())
	}
	return res, nil
}

// status compares the figures with their tolerances. A figure that does not apply passes, except that finite p needs a
// width.
func (c Certificate) status(tolerance float64) Status {
	within := func(x, t float64) bool { return math.IsNaN(x) || x <= t }
	switch {
	case math.IsNaN(c.SlopeImbalance) && !(c.Width <= tolerance):
		return Missed
	case within(c.Width, tolerance) && within(c.Gap, max(tolerance, gapTolerance)) && within(c.SlopeImbalance, slopeTolerance):
		return Certified
	}
	return Missed
}

const (
	gapTolerance   = 1e-9
	slopeTolerance = 1e-9
)

// engine gives the solver of a region, made when first asked for.
func (pl *plan) engine(ctx context.Context, c int) (*plaplace.Solver, error) {
	if pl.engines[c] == nil {
		r := &pl.regions[c]
		s, err := plaplace.New(ctx, r.graph, r.fixed, pl.problem.P, plaplace.Options{Workers: pl.settings.Workers, Rough: pl.settings.Rough})
		if err != nil {
			return nil, err
		}
		pl.engines[c] = s
	}
	return pl.engines[c], nil
}

// runRegion solves region c for the values y at its fixed vertices, number set of those that have guesses, and adds
// what it finds to res.
func (pl *plan) runRegion(ctx context.Context, c, set int, y []float64, own, whole scale, start []float64, res *Result) error {
	r := &pl.regions[c]
	shares := make([]float64, len(y))
	for k := range y {
		shares[k] = own.share(y[k])
	}
	if math.IsInf(pl.problem.P, 1) {
		f, cert, paths, err := pl.runInfinite(ctx, c, shares)
		if err != nil {
			return err
		}
		for k, v := range r.vertices {
			res.Values[v] = own.value(f[k])
		}
		res.Status = Certified
		res.Certificate.SlopeImbalance = math.Max(res.Certificate.SlopeImbalance, cert.imbalance)
		res.Counts.Paths += paths
		return nil
	}
	var guess plaplace.Guess
	if start != nil {
		guess.Values = make([]float64, len(r.vertices))
		for k, v := range r.vertices {
			guess.Values[k] = own.share(start[v])
		}
	} else if pl.guesses != nil && pl.guesses[c] != nil {
		guess = pl.guesses[c][set]
		pl.guesses[c][set] = plaplace.Guess{}
	}
	s, err := pl.engine(ctx, c)
	if err != nil {
		return err
	}
	ratio := own.size / whole.size
	got, err := s.Solve(ctx, shares, guess, pl.settings.tolerance()/ratio)
	if err != nil {
		return err
	}
	for k, v := range r.vertices {
		res.Values[v] = own.value(got.Values[k])
	}
	res.Status = Certified
	res.Certificate.add(got.Certificate, ratio)
	res.Counts.LinearSolves += got.Counts.LinearSolves
	res.Counts.Iterations += got.Counts.Iterations
	res.Counts.Newton += got.Counts.Newton
	return nil
}

// add joins the certificate of a region whose range is ratio of the whole. NaN stays NaN.
func (c *Certificate) add(r plaplace.Certificate, ratio float64) {
	c.Gap = math.Max(c.Gap, r.Gap)
	c.Imbalance = math.Max(c.Imbalance, r.Imbalance)
	c.Width = math.Max(c.Width, r.Width*ratio)
}

// verify certifies a vector for one set of values.
func (pl *plan) verify(ctx context.Context, values, f []float64) (Certificate, error) {
	var cert Certificate
	off := 0.0 // how far pendant vertices are from the vertex they hang from
	whole := scaleOf(values)
	for k, v := range pl.problem.Fixed {
		if d := math.Abs(f[v] - values[k]); d > 0 {
			cert.Width = math.Max(cert.Width, d/whole.size)
		}
	}
	for v, a := range pl.anchor {
		if a >= 0 {
			off = math.Max(off, math.Abs(f[v]-f[a])/whole.size)
		}
	}
	infinite := math.IsInf(pl.problem.P, 1)
	if infinite {
		cert.Gap, cert.Imbalance = math.NaN(), math.NaN()
	} else {
		cert.SlopeImbalance = math.NaN()
	}
	for c := range pl.regions {
		r := &pl.regions[c]
		y := r.pick(values)
		own := scaleOf(y)
		if own.size == 0 {
			for _, v := range r.vertices {
				if d := math.Abs(f[v] - own.least); !(d <= 0) {
					cert.Width = math.Max(cert.Width, d/whole.size)
				}
			}
			continue
		}
		shares := make([]float64, len(r.vertices))
		for k, v := range r.vertices {
			shares[k] = own.share(f[v])
		}
		for k, v := range r.fixed {
			shares[v] = own.share(y[k])
		}
		if infinite {
			for k := range y {
				y[k] = own.share(y[k])
			}
			cert.SlopeImbalance = math.Max(cert.SlopeImbalance, certifyInfinite(r, y, shares).imbalance)
			continue
		}
		s, err := pl.engine(ctx, c)
		if err != nil {
			return cert, err
		}
		got, err := s.Certify(ctx, shares, pl.settings.tolerance()*whole.size/own.size)
		if err != nil {
			return cert, err
		}
		cert.add(got, own.size/whole.size)
	}
	cert.Width += off
	if infinite && cert.Width == 0 {
		cert.Width = math.NaN() // no bound is derived
	}
	return cert, nil
}
