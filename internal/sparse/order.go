package sparse

// BreadthFirstOrder lists the vertices so that neighbours stand near each other, for graphs that come without
// coordinates: component by component, breadth first from a vertex far from the middle (two sweeps from the smallest
// vertex, each ending at a vertex of least degree in the last level; George and Liu 1979, the pseudo-peripheral
// vertex, from memory). order[v] is the old number of the vertex that becomes v; pass it to Permute.
//
// The order is a function of the graph and its numbering alone. The time is O(n + entries).
func BreadthFirstOrder(a *CSR) []int32 {
	order := make([]int32, 0, a.N)
	done := make([]bool, a.N)    // placed in order
	mark := make([]int32, a.N)   // last sweep that saw the vertex
	queue := make([]int32, 0, 1) // of a trial sweep
	var sweep int32
	for s := range a.N {
		if done[s] {
			continue
		}
		start := int32(s)
		for range 2 {
			sweep++
			queue, start = farthest(a, start, sweep, mark, queue[:0])
		}
		done[start] = true
		head := len(order)
		order = append(order, start)
		for ; head < len(order); head++ {
			v := order[head]
			for _, u := range a.Col[a.RowPtr[v]:a.RowPtr[v+1]] {
				if !done[u] {
					done[u] = true
					order = append(order, u)
				}
			}
		}
	}
	return order
}

// farthest sweeps breadth first from start and gives the vertex of least degree in the last level.
func farthest(a *CSR, start, sweep int32, mark, queue []int32) (seen []int32, last int32) {
	mark[start] = sweep
	queue = append(queue, start)
	level := 0 // where the current level begins in queue
	for {
		end := len(queue)
		for head := level; head < end; head++ {
			v := queue[head]
			for _, u := range a.Col[a.RowPtr[v]:a.RowPtr[v+1]] {
				if mark[u] != sweep {
					mark[u] = sweep
					queue = append(queue, u)
				}
			}
		}
		if len(queue) == end {
			break
		}
		level = end
	}
	last = queue[level]
	for _, v := range queue[level:] {
		if a.RowPtr[v+1]-a.RowPtr[v] < a.RowPtr[last+1]-a.RowPtr[last] {
			last = v
		}
	}
	return queue, last
}
