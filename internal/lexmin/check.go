package lexmin

import (
	"context"
	"fmt"
	"math"
	"slices"

	"pinfill/internal/sparse"
)

// Report says how far values are from the lexicographic minimiser. All figures are relative; 0 is perfect.
type Report struct {
	// Imbalance is the largest |steepest slope up - steepest slope down| over the free vertices, as a share of the
	// steepest slope of the whole.
	Imbalance float64
	// Shift is the largest distance, as a share of the label range, between a free vertex's value and the one that would
	// balance its slopes with its neighbours held. Unlike Imbalance it sees vertices whose weights are small.
	Shift float64
	// Path is the largest |s/t - 1| over the components, s the steepest slope between two held vertices along a path
	// through free ones and t the steepest slope of an edge with a free end: the two are equal at the minimiser, and s is
	// the least that any f can reach.
	Path float64
	// Worst is the vertex with the largest Shift, -1 where none is above 0.
	Worst int32
}

// rounding is what a difference of two normalised values, each stored to half a unit in the last place, may be wrong by.
const rounding = 0x1p-52

// Check measures f, one finite value a vertex, against what holds at the minimiser and nowhere else: the balance of
// slopes at every free vertex. Differences of values below what their storage can show count as nothing. The steepest
// paths are found by two searches of each component, independent of how f was found. Its errors are those of Solve.
func Check(ctx context.Context, g *sparse.CSR, fixed []int32, values, f []float64) (Report, error) {
	if err := validate(g, fixed, values); err != nil {
		return Report{}, err
	}
	if len(f) != g.N {
		return Report{}, fmt.Errorf("%d values for %d vertices", len(f), g.N)
	}
	for v, y := range f {
		if math.IsNaN(y) || math.IsInf(y, 0) {
			return Report{}, fmt.Errorf("value %v of vertex %d is not finite", y, v)
		}
	}
	low, scale := normalise(values)
	s := newSolver(g, fixed, values, low, scale, Options{Workers: 1})
	defer context.AfterFunc(ctx, func() { s.stop.Store(true) })()
	c := checker{solver: s, value: make([]float64, g.N), report: Report{Worst: -1}}
	var most float64
	for v, y := range f {
		c.value[v] = (y - low) * scale
		most = max(most, math.Abs(y*scale))
	}
	for i, v := range fixed {
		if f[v] != values[i] {
			return Report{}, fmt.Errorf("vertex %d is held at %v and has value %v", v, values[i], f[v])
		}
	}
	c.noise = 2 * rounding * max(most, 1)
	if err := c.run(); err != nil {
		return Report{}, err
	}
	return c.report, ctx.Err()
}

type checker struct {
	*solver
	value  []float64 // normalised values under test
	noise  float64   // of a difference of two of them
	report Report
	lens   []float64 // scratch
}

func (c *checker) run() error {
	w := c.spare.Get().(*worker)
	var all []int32
	for v := range c.set {
		if c.set[v] != held {
			all = append(all, int32(v))
		}
	}
	c.length = make([]float64, len(c.g.Col))
	steepest, gap := math.Inf(-1), math.Inf(-1) // logarithms, comparable across components
	for _, p := range w.split(all, 1) {
		if !slices.ContainsFunc(p.vertices, w.meetsHeld) {
			return fmt.Errorf("vertex %d lies in a component without a fixed vertex", slices.Min(p.vertices))
		}
		origin, _ := w.gauge(p)
		w.measure(p, origin)
		var most, sure, worst float64
		for _, v := range p.vertices {
			up, down := c.slopes(v)
			worst = max(worst, math.Abs(up-down))
			least, greatest := c.steepest(v)
			sure, most = max(sure, least), max(most, greatest)
			if s := c.shift(v); s > c.report.Shift {
				c.report.Shift, c.report.Worst = s, v
			}
		}
		// A length is e^(origin - ln w): slopes are in units of e^-origin.
		steepest, gap = max(steepest, math.Log(most)+origin), max(gap, math.Log(worst)+origin)
		c.report.Path = max(c.report.Path, c.path(w, p, sure, most))
	}
	if !math.IsInf(gap, -1) {
		c.report.Imbalance = math.Exp(gap - steepest)
	}
	return nil
}

// steepest gives bounds on the steepest slope at v, each difference lessened and increased by what rounding may have
// added or taken.
func (c *checker) steepest(v int32) (least, greatest float64) {
	for k := c.g.RowPtr[v]; k < c.g.RowPtr[v+1]; k++ {
		d := math.Abs(c.value[c.g.Col[k]] - c.value[v])
		least, greatest = max(least, (d-c.noise)/c.length[k]), max(greatest, (d+c.noise)/c.length[k])
	}
	return least, greatest
}

// slopes gives the steepest slope up and down at v, equal where they differ by no more than rounding explains.
func (c *checker) slopes(v int32) (up, down float64) {
	var unsure float64
	for k := c.g.RowPtr[v]; k < c.g.RowPtr[v+1]; k++ {
		d := c.value[c.g.Col[k]] - c.value[v]
		up, down = max(up, d/c.length[k]), max(down, -d/c.length[k])
		unsure = max(unsure, c.noise/c.length[k])
	}
	if math.Abs(up-down) <= unsure {
		m := min(up, down)
		return m, m
	}
	return up, down
}

// shift is the distance from v's value to the one that balances its slopes. Lengths are relative to the shortest at v,
// so that weights of any size count.
func (c *checker) shift(v int32) float64 {
	cols, vals := c.g.Row(int(v))
	top := slices.Max(vals)
	c.lens = c.lens[:0]
	for _, x := range vals {
		c.lens = append(c.lens, math.Exp(min(top-x, reach)))
	}
	return max(0, math.Abs(balance(cols, c.lens, c.value, 0)-c.value[v])-c.noise)
}

// path compares the steepest path of a component with the steepest slope met on an edge, which lies between sure and
// most. The search starts a little below that slope, where it must find a path, and follows to the steepest.
func (c *checker) path(w *worker, p part, sure, most float64) float64 {
	base := len(w.stack)
	defer func() { w.stack = w.stack[:base] }()
	if sure == 0 {
		// Flat as far as values can show; so must the component be.
		low, high := w.met(p.vertices)
		return max(0, high-low-c.noise)
	}
	w.loosen(p.vertices)
	slope := .9 * sure
	for {
		above := w.steeper(p.vertices, p.id, slope)
		if len(above) == 0 {
			break
		}
		for _, v := range above {
			slope = max(slope, w.slope[v])
		}
		w.loosen(p.vertices)
	}
	return max(0, 1-slope/sure, slope/most-1)
}
