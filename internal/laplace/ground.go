package laplace

import "slices"

const (
	groundSweeps = 4  // sweeps before the search for what is left
	deepNetwork  = 5  // edges from the ground beyond which Jacobi is not tried: it needs more iterations than that
	deepSamples  = 16 // vertices from which the depth is measured
)

// ungrounded gives the smallest free row from which no positive conductances lead to a fixed vertex, or -1. Sweeps
// in the order of rows reach nearly everything where that order follows the network; a search does the rest.
func (a *sddm) ungrounded() int {
	seen := make([]bool, a.n)
	left := a.n
	for i := range a.n {
		if a.excess[i] > 0 {
			seen[i] = true
			left--
		}
	}
	look := func(i int) {
		if seen[i] {
			return
		}
		for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
			if seen[a.col[k]] && a.w[k] > 0 {
				seen[i] = true
				left--
				return
			}
		}
	}
	for sweep := 0; sweep < groundSweeps && left > 0 && left < a.n; sweep++ {
		for i := range a.n {
			if sweep%2 == 1 {
				i = a.n - 1 - i
			}
			look(i)
		}
	}
	if left == 0 {
		return -1
	}
	var stack []int32
	for i := range a.n {
		if was := seen[i]; !was {
			if look(i); seen[i] {
				stack = append(stack, int32(i))
			}
		}
	}
	for len(stack) > 0 {
		i := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
			if j := a.col[k]; !seen[j] && a.w[k] > 0 {
				seen[j] = true
				stack = append(stack, j)
			}
		}
	}
	return slices.Index(seen, false)
}

// deep says whether one of a few vertices, evenly chosen, is more than deepNetwork edges from the ground.
func (a *sddm) deep() bool {
	mark := make([]int32, a.n)
	var queue []int32
	for sample := range int32(deepSamples) {
		start := int32((2*int(sample) + 1) * a.n / (2 * deepSamples))
		queue = append(queue[:0], start)
		mark[start] = sample + 1
		found := false
		for depth, from := 0, 0; from < len(queue) && !found; depth++ {
			if depth > deepNetwork {
				return true
			}
			for end := len(queue); from < end && !found; from++ {
				i := queue[from]
				found = a.excess[i] > 0
				for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
					if j := a.col[k]; mark[j] != sample+1 {
						mark[j] = sample + 1
						queue = append(queue, j)
					}
				}
			}
		}
	}
	return false
}
