package choose

import (
	"math"
	"slices"

	"pinfill/internal/solve"
	"pinfill/internal/sparse"
)

// Degeneracy says how far a solution hangs on its labels as spikes above a flat field, as happens when p is too small
// for the intrinsic dimension. All figures are invariant to f -> a + b f and to the scale of the weights; NaN where a
// figure does not apply.
type Degeneracy struct {
	// Spike is the median over labels of (y - median of f at its free neighbours) / (y - median of f): the share of
	// the way from the field's middle to the label that is climbed on the label's own edges. 0 is smooth, 1 a spike.
	// Classes count their own labels only. Labels whose denominator is below a twentieth of the range are passed over.
	Spike float64
	// Bulk is the spread of the free values over that of the labels: (q90 - q10 of f)/(range of labels) for numbers;
	// for classes, the mean over classes of f_c averaged over its own top share of vertices less f_c over the rest,
	// the shares being the labels'. 1 is crisp, 0 flat.
	Bulk float64
	// Kappa is the share of the energy on edges that touch a label.
	Kappa float64
}

// Measure finds the degeneracy of a solution: fields is one slice a class by vertex, as Solve gives it.
func Measure(p solve.Problem, l Labels, fields [][]float64) Degeneracy {
	held := make([]bool, p.Graph.N)
	for _, v := range l.Vertex {
		held[v] = true
	}
	var spikes, bulks []float64
	counts := l.PerClass()
	for c, f := range fields {
		free := make([]float64, 0, len(f))
		for v, t := range f {
			if !held[v] && !math.IsNaN(t) {
				free = append(free, t)
			}
		}
		if len(free) == 0 {
			continue
		}
		slices.Sort(free)
		lo, hi := slices.Min(l.Target[c]), slices.Max(l.Target[c])
		if !(hi > lo) {
			continue
		}
		middle := free[len(free)/2]
		for k, v := range l.Vertex {
			y := l.Target[c][k]
			if math.Abs(y-middle) < 0.05*(hi-lo) || l.Task == Classes && l.Class(k) != c {
				continue
			}
			if m, ok := medianAround(p.Graph, f, held, v); ok {
				spikes = append(spikes, (y-m)/(y-middle))
			}
		}
		if l.Task == Numbers {
			bulks = append(bulks, (quantile(free, .9)-quantile(free, .1))/(hi-lo))
			continue
		}
		top := min(max(int(math.Round(float64(counts[c])/float64(l.Count())*float64(len(free)))), 1), len(free))
		if top < len(free) {
			bulks = append(bulks, mean(free[len(free)-top:])-mean(free[:len(free)-top]))
		}
	}
	return Degeneracy{Spike: medianOf(spikes), Bulk: mean(bulks), Kappa: kappa(p, fields, held)}
}

// medianAround is the median of f over the free neighbours of v.
func medianAround(g *sparse.CSR, f []float64, held []bool, v int32) (float64, bool) {
	cols, _ := g.Row(int(v))
	var near []float64
	for _, u := range cols {
		if !held[u] && !math.IsNaN(f[u]) {
			near = append(near, f[u])
		}
	}
	if len(near) == 0 {
		return 0, false
	}
	return medianOf(near), true
}

// kappa is the share of the energy, over all fields, on edges that touch a label; at p = inf, 1 if the steepest edge
// touches one.
func kappa(p solve.Problem, fields [][]float64, held []bool) float64 {
	// |slope|^p relative to the largest slope, so that no power overflows.
	power, weight := p.P, 1.0
	if p.Energy == solve.Conductance {
		weight = 1 / p.P // w |d|^p = (w^(1/p) |d|)^p
	}
	var top, at, all float64
	visit := func(do func(slope float64, touches bool)) {
		for _, f := range fields {
			for v := range p.Graph.N {
				cols, logs := p.Graph.Row(v)
				for k, u := range cols {
					if int(u) > v && !math.IsNaN(f[v]) && !(held[u] && held[v]) && f[v] != f[u] {
						do(math.Exp(weight*logs[k]+math.Log(math.Abs(f[v]-f[u]))), held[u] || held[v])
					}
				}
			}
		}
	}
	visit(func(s float64, _ bool) { top = max(top, s) })
	if !(top > 0) {
		return math.NaN()
	}
	visit(func(s float64, touches bool) {
		e := math.Pow(s/top, min(power, 1e6))
		all += e
		if touches {
			at += e
		}
	})
	return at / all
}

// quantile of sorted values, linear between order statistics.
func quantile(sorted []float64, q float64) float64 {
	if len(sorted) == 0 {
		return math.NaN()
	}
	at := q * float64(len(sorted)-1)
	i := int(at)
	if i+1 >= len(sorted) {
		return sorted[len(sorted)-1]
	}
	return sorted[i] + float64((at-float64(i))*(sorted[i+1]-sorted[i]))
}

func medianOf(v []float64) float64 {
	s := slices.Clone(v)
	slices.Sort(s)
	return quantile(s, .5)
}

// mean of no values is NaN.
func mean(v []float64) float64 {
	var t float64
	for _, x := range v {
		t += x
	}
	return t / float64(len(v))
}
