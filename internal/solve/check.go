package solve

import (
	"fmt"
	"math"
)

// ProblemError reports a problem that is not well posed.
type ProblemError struct {
	Vertex int // the vertex concerned, or -1
	Reason string
}

func (e *ProblemError) Error() string {
	if e.Vertex < 0 {
		return e.Reason
	}
	return fmt.Sprintf("vertex %d: %s", e.Vertex, e.Reason)
}

// UnreachableError reports a component without a fixed vertex: its values are undetermined.
type UnreachableError struct {
	Vertex int // a vertex of the component, the smallest
}

func (e *UnreachableError) Error() string {
	return fmt.Sprintf("the component of vertex %d holds no fixed vertex", e.Vertex)
}

// RangeError reports given values whose range is not a finite float64.
type RangeError struct {
	Least, Largest float64
}

func (e *RangeError) Error() string {
	return fmt.Sprintf("the range of the given values, from %v to %v, overflows", e.Least, e.Largest)
}

// checkGraph looks at everything but the values.
func checkGraph(p Problem) error {
	g := p.Graph
	if g == nil {
		return &ProblemError{Vertex: -1, Reason: "there is no graph"}
	}
	if !(p.P > 1) {
		return &ProblemError{Vertex: -1, Reason: fmt.Sprintf("p is %v, not above 1", p.P)}
	}
	if p.Energy != Slope && p.Energy != Conductance {
		return &ProblemError{Vertex: -1, Reason: fmt.Sprintf("unknown energy %d", int(p.Energy))}
	}
	for k, v := range p.Fixed {
		if v < 0 || int(v) >= g.N {
			return &ProblemError{Vertex: -1, Reason: fmt.Sprintf("fixed vertex %d is outside the graph of %d", v, g.N)}
		}
		if k > 0 && p.Fixed[k-1] >= v {
			return &ProblemError{Vertex: int(v), Reason: "fixed vertices are not strictly increasing"}
		}
	}
	for v := range g.N {
		cols, vals := g.Row(v)
		for k, a := range vals {
			if math.IsNaN(a) || math.IsInf(a, 0) {
				return &ProblemError{Vertex: v, Reason: fmt.Sprintf("the logarithm of the weight to vertex %d is %v", cols[k], a)}
			}
		}
	}
	return nil
}

// checkValues looks at one set of given values.
func checkValues(fixed []int32, values []float64) error {
	if len(values) != len(fixed) {
		return &ProblemError{Vertex: -1, Reason: fmt.Sprintf("%d values for %d fixed vertices", len(values), len(fixed))}
	}
	if len(values) == 0 {
		return nil
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for k, y := range values {
		if math.IsNaN(y) || math.IsInf(y, 0) {
			return &ProblemError{Vertex: int(fixed[k]), Reason: fmt.Sprintf("the given value is %v", y)}
		}
		lo, hi = min(lo, y), max(hi, y)
	}
	if math.IsInf(hi-lo, 0) {
		return &RangeError{Least: lo, Largest: hi}
	}
	return nil
}
