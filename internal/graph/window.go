package graph

import (
	"math"
	"slices"

	"pinfill/internal/parallel"
)

// Window is the range of bandwidths that theory allows: above the connectivity of the points, below n^(-1/p). All
// lengths are in the units of Bandwidth.H: scaled units, or factors of sqrt(s_i s_j) where Local is set.
type Window struct {
	Local   bool
	Connect float64 // longest edge of the minimum spanning forest of the skeleton: at smaller h a compact kernel disconnects
	Typical float64 // median edge of that forest
	Longest float64 // longest edge of the skeleton: at h far above, all weights are alike and h no longer matters
	High    float64 // where n^(-1/p) falls: above, p is too small for labels to reach far; +Inf at p = inf, NaN if dim is
	// Candidates are log-spaced, ascending: from Connect to High where the window is open, kept within
	// [Typical/2, 2 Longest], the range in which h changes the weights of this graph. Empty for a graph without edges.
	Candidates []float64
}

// Open says whether some bandwidth is above Connect and below High.
func (w Window) Open() bool { return w.Connect < w.High }

// BandwidthWindow finds the window for n = N vertices of intrinsic dimension dim at exponent p, with count candidates.
//
// Connectivity: a graph of radius h holds together when h is at least the longest edge of the minimum spanning tree.
// Upper end: Slepcev and Thorpe (2019) ask for h << n^(-1/p) on a domain of unit size. A ball of radius h then holds
// about n h^dim points, so the bound is n^(1-dim/p) neighbours; the skeleton says how far that many reach: a vertex's
// own scale s reaches Rank neighbours, hence High = s (n^(1-dim/p)/Rank)^(1/dim), with the median s, or 1 in local
// units. Constants are taken as 1, as in any use of the theorem: the ends are guides, not edges.
func (g *Graph) BandwidthWindow(dim, p float64, local bool, count, workers int) Window {
	w := Window{Local: local}
	a := g.lengths(local, workers)
	tree := g.forest(local, workers)
	if len(tree) == 0 {
		return w
	}
	w.Connect, w.Typical = tree[len(tree)-1].W, tree[len(tree)/2].W
	w.Longest = parallel.Max(workers, a.N, rowGrain, func(lo, hi int) float64 {
		var m float64
		for _, v := range a.Val[a.RowPtr[lo]:a.RowPtr[hi]] {
			m = max(m, v)
		}
		return m
	})
	scale := 1.0
	if !local {
		scale = median(g.Local)
	}
	within := math.Pow(float64(a.N), 1-dim/p) / float64(g.Rank)
	w.High = scale * math.Pow(within, 1/dim)
	if math.IsInf(p, 1) {
		w.High = math.Inf(1)
	}
	least, most := w.Typical/2, 2*w.Longest
	high := w.High
	if math.IsNaN(high) {
		high = most
	}
	from, to := clamp(w.Connect, least, most), clamp(high, least, most)
	if from > to {
		from, to = to, from
	}
	w.Candidates = logSpaced(from, to, count)
	return w
}

func clamp(x, lo, hi float64) float64 { return min(max(x, lo), hi) }

// logSpaced gives count values from lo to hi in equal ratios, one if the two are equal.
func logSpaced(lo, hi float64, count int) []float64 {
	if count < 2 || !(lo < hi) {
		return []float64{lo}
	}
	v := make([]float64, count)
	ratio := math.Log(hi / lo)
	for t := range v {
		v[t] = lo * math.Exp(float64(t)/float64(count-1)*ratio)
	}
	v[count-1] = hi
	return v
}

// median is the lower middle of the values that are numbers; NaN if there are none.
func median(v []float64) float64 {
	s := make([]float64, 0, len(v))
	for _, x := range v {
		if !math.IsNaN(x) {
			s = append(s, x)
		}
	}
	if len(s) == 0 {
		return math.NaN()
	}
	return selectValue(s, (len(s)-1)/2)
}

// selectValue gives what would stand at place k if v, numbers, were sorted, and reorders v: Hoare's selection (1961),
// with a sort for what is left after so many rounds that the pivots must be bad.
func selectValue(v []float64, k int) float64 {
	for range 50 {
		if len(v) < 64 {
			break
		}
		a, b, c := v[0], v[len(v)/2], v[len(v)-1]
		pivot := max(min(a, b), min(max(a, b), c))
		i, j := 0, len(v)-1
		for i <= j {
			for v[i] < pivot {
				i++
			}
			for v[j] > pivot {
				j--
			}
			if i <= j {
				v[i], v[j] = v[j], v[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			v = v[:j+1]
		case k >= i:
			v, k = v[i:], k-i
		default:
			return pivot
		}
	}
	slices.Sort(v)
	return v[k]
}
