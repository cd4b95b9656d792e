package advise

import (
	"context"
	"errors"
	"fmt"
	"math"

	"pinfill/internal/laplace"
	"pinfill/internal/sparse"
)

// NextProblem asks which vertices to label next.
type NextProblem struct {
	Conductance *sparse.CSR // Val holds conductances c > 0
	Labelled    []int32     // vertices that carry a label, strictly increasing; may be empty
	Rows        []float64   // table rows at each vertex, > 0; nil means one each
	// Doubt is how little is known of each vertex, in [0, 1]: for classes 1 - (p1 - p2)/p1 of the two leading scores,
	// for numbers the spread over the largest spread. nil means the same everywhere.
	Doubt   []float64
	Cost    []float64 // cost of labelling each vertex, > 0; nil means 1
	Exclude []bool    // vertices that must not be named; nil means none
	Count   int       // how many to name
	Workers int       // 0 means GOMAXPROCS; the answer does not depend on it
}

// Reason says why a vertex is named.
type Reason int

const (
	Unreached Reason = iota // its component holds no label
	Boundary                // classes nearly tie there
	Remote                  // it is far from every label
	Central                 // many doubtful rows follow it
)

var reasonWords = [...]string{
	Unreached: "no label in its part of the data",
	Boundary:  "the labels around it disagree",
	Remote:    "far from every label",
	Central:   "in the middle of rows that follow it",
}

func (r Reason) String() string {
	if r < 0 || int(r) >= len(reasonWords) {
		return fmt.Sprintf("Reason(%d)", int(r))
	}
	return reasonWords[r]
}

// Pick is a vertex to label.
type Pick struct {
	Vertex  int32
	Reason  Reason
	Gain    float64 // share of the doubt left before this pick that its label is expected to settle, in [0, 1]; NaN for Unreached
	Follows float64 // rows that would follow it: sum over rows of the probability that a walk ends here before any label
}

// Sentence says why in words.
func (p Pick) Sentence() string {
	return fmt.Sprintf("%s; about %.0f rows follow its label", p.Reason, p.Follows)
}

const (
	doubtFloor  = 0.1 // weight of a row without doubt: a confident error is found only by looking
	boundaryMin = 0.5 // doubt from which a pick is called a boundary
	remoteRatio = 2.0 // variance over the median variance from which a pick is called remote
	columnBlock = 4   // columns solved for at a time
	columnTries = 3   // blocks solved for one pick at most
	// doubtfulDiagonal is what an estimated G_kk is multiplied by: those that lead have mostly been estimated too low.
	doubtfulDiagonal = 1.25
	solveTol         = 1e-6 // of columns: far below what the ranking can notice
)

// Next names Count vertices, best first; fewer where there are not so many. Components that hold no label come first,
// the one with most rows per cost first, each by its vertex of largest total conductance.
//
// Elsewhere, with G the inverse of the grounded Laplacian (the covariance of the field given the labels) and r_x =
// rows times doubt, labelling k removes (r'G)_k^2 / G_kk of the variance r'Gr of the doubt-weighted survey of all
// rows, and leaves G - G_k G_k' / G_kk. Taken one by one, best first, this is Sigma-optimality (Ma, Garnett and
// Schneider 2013, equation 6) with rows weighted by doubt; r = 1 gives theirs. The V-optimal score of Ji and Han (2012)
// needs all columns of G and did worse here. Divided by cost where costs are given.
//
// r'G is exact, from one solve, and so is every down-date, from one solve a pick. G_kk is exact for the vertices
// compared last: it is estimated for all (16 random probes, or exactly where the graph is small) and solved for those
// that lead until an exact one leads.
func Next(ctx context.Context, p NextProblem) ([]Pick, error) {
	if err := p.validate(); err != nil {
		return nil, err
	}
	fixed, picks := p.unreached()
	if len(picks) >= p.Count {
		return picks[:p.Count], nil
	}
	if len(fixed) == p.Conductance.N {
		return picks, nil
	}
	system, err := laplace.New(ctx, p.Conductance, fixed, laplace.Options{Workers: p.Workers})
	if err != nil {
		return nil, err
	}
	g := &greedy{p: &p, system: system, column: map[int32][]float64{}}
	if err := g.start(ctx, fixed); err != nil {
		return nil, err
	}
	for len(picks) < p.Count {
		pick, err := g.next(ctx)
		if err != nil {
			return nil, err
		}
		if pick == nil {
			break
		}
		picks = append(picks, *pick)
	}
	return picks, nil
}

func (p *NextProblem) validate() error {
	if p.Conductance == nil {
		return errors.New("there is no graph")
	}
	n := p.Conductance.N
	for _, c := range []struct {
		name string
		size int
	}{{"rows", len(p.Rows)}, {"doubt", len(p.Doubt)}, {"cost", len(p.Cost)}, {"exclude", len(p.Exclude)}} {
		if c.size != 0 && c.size != n {
			return fmt.Errorf("%s has %d entries for %d vertices", c.name, c.size, n)
		}
	}
	for v := range n {
		if !(p.rows(v) > 0) || !(p.cost(v) > 0) || math.IsInf(p.rows(v)/p.cost(v), 1) {
			return fmt.Errorf("vertex %d: %v rows and cost %v, both must be positive and finite", v, p.rows(v), p.cost(v))
		}
	}
	for k, v := range p.Labelled {
		if v < 0 || int(v) >= n || k > 0 && p.Labelled[k-1] >= v {
			return fmt.Errorf("labelled vertices must be strictly increasing and below %d, found %d at position %d", n, v, k)
		}
	}
	return nil
}

func (p *NextProblem) rows(v int) float64 {
	if p.Rows == nil {
		return 1
	}
	return p.Rows[v]
}

func (p *NextProblem) cost(v int) float64 {
	if p.Cost == nil {
		return 1
	}
	return p.Cost[v]
}

func (p *NextProblem) doubt(v int) float64 {
	if p.Doubt == nil || math.IsNaN(p.Doubt[v]) {
		return 1
	}
	return min(max(p.Doubt[v], 0), 1)
}

func (p *NextProblem) excluded(v int) bool { return p.Exclude != nil && p.Exclude[v] }
