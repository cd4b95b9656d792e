package choose

import (
	"cmp"
	"math/rand/v2"
	"slices"
)

// FoldsOf spreads the labels over at most count folds of like size, classes evenly over folds, groups whole. With
// count at least the number of labels (or groups) each is a fold of its own. The draw behind equal choices is seeded
// and follows the order of vertices, which is a function of the points.
func FoldsOf(l Labels, count int, seed uint64) []int32 {
	n := l.Count()
	fold := make([]int32, n)
	unit := make([]int, n) // of each label: its group's number in order of first label, or its own
	var units [][]int
	if l.Group == nil {
		units = make([][]int, n)
		for k := range n {
			unit[k], units[k] = k, []int{k}
		}
	} else {
		at := map[int32]int{}
		for k, g := range l.Group {
			u, ok := at[g]
			if !ok {
				u = len(units)
				at[g] = u
				units = append(units, nil)
			}
			unit[k] = u
			units[u] = append(units[u], k)
		}
	}
	if count >= len(units) {
		for k := range n {
			fold[k] = int32(unit[k])
		}
		return fold
	}
	count = max(count, 2)
	order := rand.New(rand.NewPCG(seed, 0x70696e66696c6c)).Perm(len(units))
	// Dealing class by class, largest groups first, keeps folds alike in size and in classes.
	slices.SortStableFunc(order, func(a, b int) int {
		if c := cmp.Compare(len(units[b]), len(units[a])); c != 0 {
			return c
		}
		if l.Task == Numbers {
			return 0
		}
		return cmp.Compare(l.Class(units[a][0]), l.Class(units[b][0]))
	})
	size := make([]int, count)
	for turn, u := range order {
		best := turn % count
		for f := range count {
			if size[f] < size[best] {
				best = f
			}
		}
		for _, k := range units[u] {
			fold[k] = int32(best)
		}
		size[best] += len(units[u])
	}
	return fold
}
