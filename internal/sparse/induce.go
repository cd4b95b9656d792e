package sparse

// Induce gives the part of a on the vertices that keep marks, with the edges among them.
func Induce(a *CSR, keep []bool) Part {
	local := make([]int32, a.N)
	p := Part{Graph: &CSR{RowPtr: []int{0}}}
	for v := range a.N {
		local[v] = -1
		if keep[v] {
			local[v] = int32(len(p.Vertices))
			p.Vertices = append(p.Vertices, int32(v))
		}
	}
	g := p.Graph
	g.N = len(p.Vertices)
	for _, v := range p.Vertices {
		col, val := a.Row(int(v))
		for t, u := range col {
			if local[u] >= 0 { // local numbers rise with the vertices, so rows stay sorted
				g.Col = append(g.Col, local[u])
				g.Val = append(g.Val, val[t])
			}
		}
		g.RowPtr = append(g.RowPtr, len(g.Col))
	}
	return p
}
