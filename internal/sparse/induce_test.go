package sparse

import "testing"

func TestInduceKeepsTheEdgesAmongThose(t *testing.T) {
	// A path 0-1-2-3 with an edge 0-3; without vertex 1 the edges 2-3 and 0-3 are left.
	a := &CSR{N: 4, RowPtr: []int{0, 2, 4, 6, 8}, Col: []int32{1, 3, 0, 2, 1, 3, 0, 2}, Val: []float64{1, 4, 1, 2, 2, 3, 4, 3}}
	p := Induce(a, []bool{true, false, true, true})
	want := &CSR{N: 3, RowPtr: []int{0, 1, 2, 4}, Col: []int32{2, 2, 0, 1}, Val: []float64{4, 3, 4, 3}}
	if p.Graph.N != want.N || len(p.Graph.Col) != len(want.Col) {
		t.Fatalf("got %+v", p.Graph)
	}
	for i := range want.Col {
		if p.Graph.Col[i] != want.Col[i] || p.Graph.Val[i] != want.Val[i] {
			t.Fatalf("entry %d: got %d %v", i, p.Graph.Col[i], p.Graph.Val[i])
		}
	}
	for i, v := range []int32{0, 2, 3} {
		if p.Vertices[i] != v {
			t.Fatalf("vertices %v", p.Vertices)
		}
	}
}
