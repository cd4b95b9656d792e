package sparse

import (
	"math/rand/v2"
	"slices"
	"testing"
)

// randomGraph has n vertices and about m edges with distinct random values; with few edges it falls into components.
func randomGraph(rng *rand.Rand, n, m int) *CSR {
	value := map[[2]int32]float64{}
	for range m {
		i, j := rng.Int32N(int32(n)), rng.Int32N(int32(n))
		if i != j {
			v := rng.Float64()
			value[[2]int32{i, j}], value[[2]int32{j, i}] = v, v
		}
	}
	a := &CSR{N: n, RowPtr: make([]int, n+1)}
	for i := range int32(n) {
		for j := range int32(n) {
			if v, ok := value[[2]int32{i, j}]; ok {
				a.Col = append(a.Col, j)
				a.Val = append(a.Val, v)
			}
		}
		a.RowPtr[i+1] = len(a.Col)
	}
	return a
}

// at is entry (i, j), 0 where there is none.
func at(a *CSR, i, j int) float64 {
	col, val := a.Row(i)
	if k, ok := slices.BinarySearch(col, int32(j)); ok {
		return val[k]
	}
	return 0
}

func TestComponentsAgainstClosure(t *testing.T) {
	for seed := range uint64(300) {
		rng := rand.New(rand.NewPCG(seed, 1))
		n := 1 + rng.IntN(30)
		a := randomGraph(rng, n, rng.IntN(2*n))
		reach := make([][]bool, n) // Warshall's closure
		for i := range reach {
			reach[i] = make([]bool, n)
			reach[i][i] = true
			col, _ := a.Row(i)
			for _, j := range col {
				reach[i][j] = true
			}
		}
		for k := range n {
			for i := range n {
				for j := range n {
					reach[i][j] = reach[i][j] || reach[i][k] && reach[k][j]
				}
			}
		}
		label, count := Components(a)
		next := int32(0)
		for i := range n {
			first := slices.Index(reach[i], true)
			if first == i {
				if label[i] != next {
					t.Fatalf("seed %d: component of %d is %d, want %d", seed, i, label[i], next)
				}
				next++
			} else if label[i] != label[first] {
				t.Fatalf("seed %d: %d and %d are connected, components %v", seed, i, first, label)
			}
		}
		if int(next) != count {
			t.Fatalf("seed %d: %d components, want %d", seed, count, next)
		}
		sum := 0
		for _, s := range Sizes(label, count) {
			sum += s
		}
		if sum != n {
			t.Fatalf("seed %d: sizes add to %d of %d", seed, sum, n)
		}
	}
}

func TestSplitGivesEachComponentAlone(t *testing.T) {
	for seed := range uint64(300) {
		rng := rand.New(rand.NewPCG(seed, 2))
		n := 1 + rng.IntN(40)
		a := randomGraph(rng, n, rng.IntN(2*n))
		label, count := Components(a)
		parts := Split(a)
		if len(parts) != count {
			t.Fatalf("%d parts for %d components", len(parts), count)
		}
		for c, p := range parts {
			g := p.Graph
			if g.N != len(p.Vertices) || len(g.RowPtr) != g.N+1 || g.RowPtr[g.N] != len(g.Col) || len(g.Col) != len(g.Val) {
				t.Fatalf("part %d: sizes", c)
			}
			if !slices.IsSorted(p.Vertices) {
				t.Fatalf("part %d: vertices %v", c, p.Vertices)
			}
			for i, v := range p.Vertices {
				if int(label[v]) != c {
					t.Fatalf("vertex %d of component %d in part %d", v, label[v], c)
				}
				wantCol, wantVal := a.Row(int(v))
				col, val := g.Row(i)
				if !slices.Equal(val, wantVal) {
					t.Fatalf("part %d row %d: values %v, want %v", c, i, val, wantVal)
				}
				for k := range col {
					if p.Vertices[col[k]] != wantCol[k] {
						t.Fatalf("part %d row %d: columns", c, i)
					}
				}
			}
		}
		// Appending to one part must not write into the next.
		if count > 1 {
			g := parts[0].Graph
			next := slices.Clone(parts[1].Graph.RowPtr)
			_ = append(g.RowPtr, 99)
			_ = append(parts[0].Vertices, 99)
			if !slices.Equal(next, parts[1].Graph.RowPtr) || parts[1].Vertices[0] == 99 {
				t.Fatal("parts overlap")
			}
		}
	}
}

func TestPermute(t *testing.T) {
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 3))
		n := 1 + rng.IntN(120)
		a := randomGraph(rng, n, rng.IntN(20*n)) // rows shorter and longer than shortRow
		order := make([]int32, n)
		for i, v := range rng.Perm(n) {
			order[i] = int32(v)
		}
		p := Permute(a, order, 2)
		if p.NNZ() != a.NNZ() {
			t.Fatalf("%d entries, want %d", p.NNZ(), a.NNZ())
		}
		for i := range n {
			if col, _ := p.Row(i); !slices.IsSorted(col) {
				t.Fatalf("row %d has columns %v", i, col)
			}
			for j := range n {
				if at(p, i, j) != at(a, int(order[i]), int(order[j])) {
					t.Fatalf("seed %d: entry %d %d", seed, i, j)
				}
			}
		}
		back := Permute(p, Inverse(order), 1)
		if !slices.Equal(back.RowPtr, a.RowPtr) || !slices.Equal(back.Col, a.Col) || !slices.Equal(back.Val, a.Val) {
			t.Fatal("permuting back does not give the matrix back")
		}
	}
}

func TestBreadthFirstOrder(t *testing.T) {
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 4))
		n := 1 + rng.IntN(60)
		a := randomGraph(rng, n, rng.IntN(2*n))
		order := BreadthFirstOrder(a)
		sorted := slices.Clone(order)
		slices.Sort(sorted)
		for v := range n {
			if int(sorted[v]) != v {
				t.Fatalf("not a permutation: %v", order)
			}
		}
	}
	// A path whose vertices are numbered at random comes back in its own order, from one end to the other.
	rng := rand.New(rand.NewPCG(9, 9))
	const n = 200
	number := rng.Perm(n)
	path := &CSR{N: n, RowPtr: make([]int, n+1), Col: make([]int32, 0, 2*n), Val: make([]float64, 2*n-2)}
	place := make([]int, n)
	for i, v := range number {
		place[v] = i
	}
	for v := range n {
		from := len(path.Col)
		if i := place[v]; i > 0 {
			path.Col = append(path.Col, int32(number[i-1]))
		}
		if i := place[v]; i < n-1 {
			path.Col = append(path.Col, int32(number[i+1]))
		}
		slices.Sort(path.Col[from:])
		path.RowPtr[v+1] = len(path.Col)
	}
	order := BreadthFirstOrder(path)
	for i := 1; i < n; i++ {
		if d := place[order[i]] - place[order[i-1]]; d != 1 && d != -1 {
			t.Fatalf("vertices %d and %d of the order are %d apart on the path", i-1, i, d)
		}
	}
}
