package choose

import (
	"fmt"
	"math"

	"pinfill/internal/solve"
)

// Weigh finds the class weights for a solution. Every mode but AutoBalance is class-mass normalisation to its shares
// (none leaves the scores alone). AutoBalance finds two: mass normalisation, and the weights under which the decisions
// themselves fall to the classes in the labels' shares, and takes the one whose partition cuts the graph less
// (normalised cut); where the two agree within a tenth, their geometric mean.
//
// scores is class by vertex, NaN out of reach; workers = 0 means GOMAXPROCS.
func (b Balance) Weigh(p solve.Problem, scores [][]float64, l Labels, workers int) (Weights, error) {
	w, err := b.Mass(scores, l)
	if err != nil || b.Mode != AutoBalance || len(scores) < 2 {
		return w, err
	}
	if len(scores[0]) != p.Graph.N {
		return nil, fmt.Errorf("scores of %d vertices for a graph of %d", len(scores[0]), p.Graph.N)
	}
	share := Balance{Mode: FromLabels}.shares(l.PerClass())
	byMass := massWeights(masses(scores, l), share)
	byCount := matchWeights(scores, freeOf(scores, l), share, workers)
	mixed := between(byMass, byCount, .5)
	conductance := Conductances(p.Graph, p.Energy)
	mass := math.Log(normalisedCut(conductance, scores, byMass, l, workers) + cutFloor)
	count := math.Log(normalisedCut(conductance, scores, byCount, l, workers) + cutFloor)
	switch {
	case mass < count-cutMargin:
		return byMass, nil
	case count < mass-cutMargin:
		return byCount, nil
	}
	return mixed, nil
}

const (
	cutFloor  = 1e-4
	cutMargin = 0.1 // cuts whose logarithms differ by less say nothing
)

// between takes the share t of the way from v to w, in logarithms.
func between(v, w Weights, t float64) Weights {
	a, b := v.logs(), w.logs()
	for c := range a {
		a[c] += float64(t * (b[c] - a[c]))
	}
	return fromLogs(a)
}

// freeOf lists the vertices that have scores and no label.
func freeOf(scores [][]float64, l Labels) []int32 {
	held := make([]bool, len(scores[0]))
	for _, v := range l.Vertex {
		held[v] = true
	}
	var free []int32
	for v, t := range scores[0] {
		if !held[v] && !math.IsNaN(t) {
			free = append(free, int32(v))
		}
	}
	return free
}
