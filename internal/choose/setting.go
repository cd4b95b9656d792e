package choose

import (
	"context"
	"fmt"
	"math"
	"strconv"

	"pinfill/internal/graph"
	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// Setting is everything that Auto may choose.
type Setting struct {
	P         float64
	Neighbors int
	Kernel    graph.Kernel
	Bandwidth graph.Bandwidth
	Balance   Balance
}

// Source gives the weighted graph (ln w) of a setting, components joined as the caller wants them. Auto calls it once
// for each different graph; P and Balance do not matter to it.
type Source func(ctx context.Context, s Setting) (*sparse.CSR, error)

// Asked holds what the user said. An empty list leaves the choice to Auto; one entry fixes it; of several the labels
// choose, and the first is the one to fall back on.
type Asked struct {
	P         []float64
	Neighbors []int
	Kernel    []graph.Kernel
	Bandwidth []graph.Bandwidth
	Balance   Balance
}

// Defaults of what Auto falls back on; docs/choosing-p.md shows the study behind them.
const (
	// DefaultNeighbors: between 7 and 15 neighbours the mean accuracy over the study's tables moves by half a point.
	DefaultNeighbors = 10
	// DefaultClassP is below 2 because classes part where rows are few: towards p = 1 the solution becomes a least cut,
	// flat within and steep in the gaps. Nearer 1 the steps span too many decades to be certified.
	DefaultClassP = 1.7
	// DefaultNumberP is large because numbers are smooth along the table: small p sinks into spikes at the labels.
	DefaultNumberP = 6
	// localClass is the factor on local scales for classes, a conductance exp(-2 d^2/(s_i s_j)) at p = 2: narrower than usual, so
	// that long edges, among them the shortcuts across a bend, carry little.
	localClass = 0.7
	// localNumber is the same for numbers.
	localNumber = 1
)

// Candidates of p beside the default.
var (
	classPs  = []float64{DefaultClassP, 2, 3}
	numberPs = []float64{DefaultNumberP, 2, 3}
)

// Settings lists the settings to compare, the one to fall back on first.
func (a Asked) Settings(task Task) []Setting {
	ps, ks, kernels, bands := a.P, a.Neighbors, a.Kernel, a.Bandwidth
	if len(ps) == 0 {
		ps = classPs
		if task == Numbers {
			ps = numberPs
		}
	}
	if len(ks) == 0 {
		ks = []int{DefaultNeighbors}
	}
	if len(kernels) == 0 {
		kernels = []graph.Kernel{graph.Gaussian}
	}
	if len(bands) == 0 {
		bands = []graph.Bandwidth{{Local: true, H: localClass}}
		if task == Numbers {
			bands[0].H = localNumber
		}
	}
	var all []Setting
	for _, k := range ks {
		for _, kernel := range kernels {
			for _, b := range bands {
				for _, p := range ps {
					all = append(all, Setting{P: p, Neighbors: k, Kernel: kernel, Bandwidth: b, Balance: a.Balance})
				}
			}
		}
	}
	return all
}

// sameGraph says whether two settings have one graph.
func (s Setting) sameGraph(t Setting) bool {
	return s.Neighbors == t.Neighbors && s.Kernel == t.Kernel && s.Bandwidth == t.Bandwidth
}

// describe names what sets one setting apart from others: p, and whatever differs among all.
func (s Setting) describe(all []Setting) string {
	text := "p=" + pText(s.P)
	var k, kernel, band bool
	for _, t := range all {
		k = k || t.Neighbors != s.Neighbors
		kernel = kernel || t.Kernel != s.Kernel
		band = band || t.Bandwidth != s.Bandwidth
	}
	if k {
		text += fmt.Sprintf(", %d neighbours", s.Neighbors)
	}
	if kernel {
		text += ", kernel " + s.Kernel.String()
	}
	if band {
		text += ", bandwidth " + bandText(s.Bandwidth)
	}
	return text
}

func bandText(b graph.Bandwidth) string {
	h := strconv.FormatFloat(b.H, 'g', -1, 64)
	switch {
	case b.Local && b.H == 1:
		return "local"
	case b.Local:
		return "local times " + h
	}
	return h
}

func pText(p float64) string {
	if math.IsInf(p, 1) {
		return "inf"
	}
	return strconv.FormatFloat(p, 'g', -1, 64)
}

// worse joins two certificates: the larger of each figure that applies.
func worse(a, b solve.Certificate) solve.Certificate {
	pick := func(x, y float64) float64 {
		if math.IsNaN(x) || y > x {
			return y
		}
		return x
	}
	return solve.Certificate{
		Gap: pick(a.Gap, b.Gap), Imbalance: pick(a.Imbalance, b.Imbalance),
		Width: pick(a.Width, b.Width), SlopeImbalance: pick(a.SlopeImbalance, b.SlopeImbalance),
	}
}
