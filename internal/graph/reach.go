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

// SmallestK is the smallest number of neighbours k for which every component of the K-nearest-neighbour graph holds a
// label, or 0 if the lists are too short to say; labelled[v] marks the vertices with a label.
//
// An edge stands from the k on that is the smaller of its two ranks, so adding lists rank by rank to a union of sets
// meets each k in turn: time O(n K).
func smallestK(l lists, labelled []bool) int {
	parent := make([]int32, l.n)
	holds := make([]bool, l.n) // of each root: its set holds a label
	waiting := 0               // sets without a label
	for v := range parent {
		parent[v] = int32(v)
		holds[v] = labelled[v]
		if !labelled[v] {
			waiting++
		}
	}
	find := func(v int32) int32 {
		for parent[v] != v {
			parent[v] = parent[parent[v]]
			v = parent[v]
		}
		return v
	}
	if waiting == l.n {
		return 0
	}
	for k := 1; k <= l.stride; k++ {
		for v := range l.n {
			a, b := find(int32(v)), find(l.index[v*l.stride+k-1])
			if a == b {
				continue
			}
			if !holds[a] || !holds[b] {
				waiting--
			}
			if b < a {
				a, b = b, a
			}
			parent[b] = a
			holds[a] = holds[a] || holds[b]
		}
		if waiting == 0 {
			return k
		}
	}
	return 0
}
