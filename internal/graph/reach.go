package graph

import (
	"fmt"

	"pinfill/internal/sparse"
)

// Reach says which components of a graph hold a label.
type Reach struct {
	Component []int32 // of each vertex; numbered by smallest vertex
	Size      []int   // vertices of each component
	Labels    []int   // labelled vertices of each component
}

// FindReach takes the components of a and counts the labelled vertices of each; a vertex named twice counts twice. The
// error says that a labelled vertex is out of range.
func FindReach(a *sparse.CSR, labelled []int32) (*Reach, error) {
	label, count := sparse.Components(a)
	r := &Reach{Component: label, Size: sparse.Sizes(label, count), Labels: make([]int, count)}
	for _, v := range labelled {
		if v < 0 || int(v) >= a.N {
			return nil, fmt.Errorf("labelled vertex %d of a graph of %d vertices", v, a.N)
		}
		r.Labels[label[v]]++
	}
	return r, nil
}

// Unlabelled lists the components without a label, ascending.
func (r *Reach) Unlabelled() []int32 {
	var u []int32
	for c, l := range r.Labels {
		if l == 0 {
			u = append(u, int32(c))
		}
	}
	return u
}

// Blank marks the vertices that no label reaches; nil if every vertex is reached.
func (r *Reach) Blank() []bool {
	if len(r.Unlabelled()) == 0 {
		return nil
	}
	blank := make([]bool, len(r.Component))
	for v, c := range r.Component {
		blank[v] = r.Labels[c] == 0
	}
	return blank
}
