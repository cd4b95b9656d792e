package sparse

// Components numbers the connected components of the graph of a: label[v] is the component of vertex v, from 0, and
// count is how many there are. Components are numbered by their smallest vertex, so the numbering is a function of
// the graph alone. Values are not looked at: a stored entry is an edge.
//
// The time is O(n + entries), the workspace one int32 a vertex.
func Components(a *CSR) (label []int32, count int) {
	label = make([]int32, a.N)
	for v := range label {
		label[v] = -1
	}
	var stack []int32 // depth first: the stack stays short on graphs whose vertices follow the space
	for s := range a.N {
		if label[s] >= 0 {
			continue
		}
		c := int32(count)
		count++
		label[s] = c
		stack = append(stack[:0], int32(s))
		for len(stack) > 0 {
			v := stack[len(stack)-1]
			stack = stack[:len(stack)-1]
			for _, u := range a.Col[a.RowPtr[v]:a.RowPtr[v+1]] {
				if label[u] < 0 {
					label[u] = c
					stack = append(stack, u)
				}
			}
		}
	}
	return label, count
}

// Sizes counts the vertices of each component numbered by label.
func Sizes(label []int32, count int) []int {
	size := make([]int, count)
	for _, c := range label {
		size[c]++
	}
	return size
}

// Part is one connected component as a graph of its own.
type Part struct {
	Graph    *CSR
	Vertices []int32 // Vertices[v] is the vertex of the whole graph that is vertex v of Graph; strictly increasing
}

// Split cuts a into its connected components, in the order of Components. The vertices of a part keep their relative
// order, so that a part is entry by entry the graph that its vertices alone would give: whatever is computed on it is
// bit-equal to the same computation on that component alone.
func Split(a *CSR) []Part {
	label, count := Components(a)
	if count == 1 {
		all := make([]int32, a.N)
		for v := range all {
			all[v] = int32(v)
		}
		return []Part{{Graph: a, Vertices: all}}
	}
	parts := make([]Part, count)
	size := Sizes(label, count)
	entries := make([]int, count)
	for v, c := range label {
		entries[c] += a.RowPtr[v+1] - a.RowPtr[v]
	}
	// One block of memory serves all parts: there may be as many parts as vertices.
	vertices := make([]int32, 0, a.N)
	rowPtr := make([]int, 0, a.N+count)
	col := make([]int32, 0, a.NNZ())
	val := make([]float64, 0, len(a.Val))
	graphs := make([]CSR, count)
	var v0, r0, e0 int
	for c := range parts {
		v1, r1, e1 := v0+size[c], r0+size[c]+1, e0+entries[c]
		g := &graphs[c]
		g.N, g.RowPtr, g.Col = size[c], append(rowPtr[r0:r0:r1], 0), col[e0:e0:e1]
		if a.Val != nil {
			g.Val = val[e0:e0:e1]
		}
		parts[c] = Part{Graph: g, Vertices: vertices[v0:v0:v1]}
		v0, r0, e0 = v1, r1, e1
	}
	local := make([]int32, a.N)
	for v, c := range label {
		local[v] = int32(len(parts[c].Vertices))
		parts[c].Vertices = append(parts[c].Vertices, int32(v))
	}
	for v, c := range label {
		g := parts[c].Graph
		lo, hi := a.RowPtr[v], a.RowPtr[v+1]
		for _, u := range a.Col[lo:hi] {
			g.Col = append(g.Col, local[u])
		}
		if a.Val != nil {
			g.Val = append(g.Val, a.Val[lo:hi]...)
		}
		g.RowPtr = append(g.RowPtr, len(g.Col))
	}
	return parts
}
