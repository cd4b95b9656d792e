// Package choose decides what a user did not say: p, the bandwidth, the number of neighbours and the balance of the
// classes, from the table's own structure and its labels, and says why.
//
// Auto makes the decision. Under it, and open to others: LeaveOut gives every label's answer with that label left out,
// exactly and at once for p = 2 (from the Schur complement on the labels), by warm restarts for other p; Weigh gives
// the class multipliers by which scores are compared; Measure gives the degeneracy numbers of a solution; Sweep solves
// one problem at many p with shared graphs and starts, for a comparison side by side.
//
// Everything works on one weighted graph (sparse.CSR with ln w in Val) and on Labels by vertex. Nothing here knows of
// files, flags or names.
package choose

import (
	"fmt"
	"math"
)

// Task says what the labels are.
type Task int

const (
	Classes Task = iota // one problem a class, targets in [0, 1]
	Numbers             // one problem
)

// Labels are the given labels by vertex.
type Labels struct {
	Task   Task
	Vertex []int32     // labelled vertices, strictly increasing
	Target [][]float64 // one slice a class (1 for its own labels, 0 for the others', a share where labels conflict), or one of numbers
	Group  []int32     // group of each label, or nil; labels of one group are left out together
}

// Count is the number of labels.
func (l Labels) Count() int { return len(l.Vertex) }

// Class is the class of label k, the one with the largest share; the first of equals.
func (l Labels) Class(k int) int {
	best := 0
	for c := range l.Target {
		if l.Target[c][k] > l.Target[best][k] {
			best = c
		}
	}
	return best
}

// PerClass counts the labels of each class.
func (l Labels) PerClass() []int {
	n := make([]int, len(l.Target))
	for k := range l.Vertex {
		n[l.Class(k)]++
	}
	return n
}

// Validate checks the labels against a graph of n vertices.
func (l Labels) Validate(n int) error {
	switch {
	case l.Task != Classes && l.Task != Numbers:
		return fmt.Errorf("unknown task %d", int(l.Task))
	case len(l.Target) == 0 || l.Task == Numbers && len(l.Target) != 1:
		return fmt.Errorf("%d sets of targets", len(l.Target))
	case l.Group != nil && len(l.Group) != len(l.Vertex):
		return fmt.Errorf("%d groups for %d labels", len(l.Group), len(l.Vertex))
	}
	for k, v := range l.Vertex {
		if v < 0 || int(v) >= n || k > 0 && l.Vertex[k-1] >= v {
			return fmt.Errorf("labelled vertices must be strictly increasing and below %d, found %d at position %d", n, v, k)
		}
	}
	for c, t := range l.Target {
		if len(t) != len(l.Vertex) {
			return fmt.Errorf("%d targets of class %d for %d labels", len(t), c, len(l.Vertex))
		}
		for k, y := range t {
			if math.IsNaN(y) || math.IsInf(y, 0) {
				return fmt.Errorf("target %v of class %d at vertex %d is not finite", y, c, l.Vertex[k])
			}
		}
	}
	return nil
}
