package testproblems

import (
	_ "embed"
	"encoding/json"
	"fmt"
	"math"
)

// script is testdata/scipy.py, which wrote the values that SciPy gives.
//
//go:embed testdata/scipy.py
var script []byte

//go:embed testdata/scipy.json
var reference []byte

// Reference is what a general-purpose library found for one graph.
type Reference struct {
	Harmonic Problem // p = 2, Want by scipy.sparse.linalg.spsolve
	Inf      Problem // the same graph at p = inf, without Want
	Minimax  float64 // the least steepest slope at p = inf over edges with a free end, by scipy.optimize.linprog
}

// MinimaxTolerance is the relative error that linprog's answers may have: its default feasibility tolerance is 1e-7.
const MinimaxTolerance = 1e-6

type referenceFile struct {
	SciPy    string `json:"scipy"`
	Script   string `json:"script_sha256"`
	Problems []struct {
		N        int          `json:"n"`
		Edges    [][3]float64 `json:"edges"`
		Fixed    []int32      `json:"fixed"`
		Values   []float64    `json:"values"`
		Harmonic []float64    `json:"harmonic"`
		Minimax  float64      `json:"minimax"`
	} `json:"problems"`
}

func readReference() (referenceFile, error) {
	var file referenceFile
	err := json.Unmarshal(reference, &file)
	return file, err
}

// SciPy gives the 24 graphs of testdata/scipy.json, written by testdata/scipy.py with SciPy 1.10.1 (Debian 12).
func SciPy() []Reference {
	file, err := readReference()
	if err != nil {
		panic(err)
	}
	var all []Reference
	for i, p := range file.Problems {
		edges := make([]Edge, len(p.Edges))
		for k, e := range p.Edges {
			edges[k] = Edge{int(e[0]), int(e[1]), e[2]}
		}
		g := Graph(p.N, edges)
		all = append(all, Reference{
			Harmonic: Problem{fmt.Sprintf("scipy %d, p=2", i), g, p.Fixed, p.Values, 2, p.Harmonic},
			Inf:      Problem{fmt.Sprintf("scipy %d, p=inf", i), g, p.Fixed, p.Values, math.Inf(1), nil},
			Minimax:  p.Minimax,
		})
	}
	return all
}

// SteepestSlope is the largest w |f_i - f_j| over the edges with a free end.
func (p Problem) SteepestSlope(f []float64) float64 {
	var most float64
	for v, y := range p.Hold() {
		if !math.IsNaN(y) {
			continue
		}
		cols, logw := p.Graph.Row(v)
		for k, u := range cols {
			most = max(most, math.Exp(logw[k])*math.Abs(f[v]-f[u]))
		}
	}
	return most
}
