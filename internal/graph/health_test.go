package graph

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"

	"pinfill/internal/sparse"
)

// A star of six leaves beside a pair and two lone vertices, every figure by hand.
func TestMeasureByHand(t *testing.T) {
	var edges []Edge
	for v := int32(1); v <= 6; v++ {
		edges = append(edges, Edge{0, v, math.Exp(-float64(v))})
	}
	edges = append(edges, Edge{7, 8, 1e-320})
	a, _, err := FromEdges(11, edges, 0)
	if err != nil {
		t.Fatal(err)
	}
	a.Val[a.RowPtr[7]], a.Val[a.RowPtr[8]] = -800, -800 // below any float64
	h := Measure(a, 2)
	var s1, s2 float64
	for v := 1.0; v <= 6; v++ {
		s1 += math.Exp(-v)
		s2 += math.Exp(-2 * v)
	}
	mean, m2, m3 := 14.0/11, 0.0, 0.0
	for _, d := range []float64{6, 1, 1, 1, 1, 1, 1, 1, 1, 0, 0} {
		m2 += (d - mean) * (d - mean) / 11
		m3 += (d - mean) * (d - mean) * (d - mean) / 11
	}
	near := func(name string, got, want float64) {
		if math.Abs(got-want) > 1e-12*math.Abs(want) {
			t.Errorf("%s is %v, want %v", name, got, want)
		}
	}
	near("skewness", h.DegreeSkew, m3/math.Pow(m2, 1.5))
	near("least effective degree", h.EffectiveMin, 1)
	near("largest ln w", h.LogMax, -1)
	near("median ln w", h.LogMedian, -4)
	near("smallest ln w", h.LogMin, -800)
	near("largest share", h.LargestShare, 7.0/11)
	_, centre := a.Row(0)
	near("effective degree of the centre", EffectiveDegree(centre), s1*s1/s2)
	if h.Vertices != 11 || h.Edges != 7 || h.DegreeMin != 0 || h.DegreeMedian != 1 || h.DegreeMax != 6 ||
		!slices.Equal(h.Hubs, []Hub{{0, 6}}) || h.HubCount != 1 || !slices.Equal(h.Isolated, []int32{9, 10}) || h.IsolatedCount != 2 ||
		h.Underflowed != 1 || h.Hanging != 0 || h.Components != 4 || !slices.Equal(h.ComponentSizes, []int{7, 2, 1, 1}) || h.Singletons != 2 {
		t.Errorf("%+v", h)
	}
}

func TestMeasureHangingAndEmpty(t *testing.T) {
	a, _, _ := FromEdges(3, []Edge{{0, 1, 1}, {1, 2, 1e-9}}, 0)
	if h := Measure(a, 0); h.Hanging != 1 || h.DegreeSkew <= 0 || h.HubCount != 0 {
		t.Errorf("%+v", h)
	}
	for n := range 3 {
		h := Measure(&sparse.CSR{N: n, RowPtr: make([]int, n+1)}, 0)
		if h.Edges != 0 || h.IsolatedCount != n || !math.IsNaN(h.LogMax) || !math.IsNaN(h.EffectiveMedian) || h.Components != n {
			t.Errorf("%d vertices: %+v", n, h)
		}
	}
}

func exported(t *testing.T, seed uint64, n int) *sparse.CSR {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 2))
	var edges []Edge
	for i := range int32(n) {
		for range 3 {
			if j := rng.Int32N(int32(n)); j > i {
				edges = append(edges, Edge{i, j, math.Exp(3 * rng.NormFloat64())})
			}
		}
	}
	slices.SortFunc(edges, func(x, y Edge) int { return int(x.I-y.I)*n + int(x.J-y.J) })
	edges = slices.CompactFunc(edges, func(x, y Edge) bool { return x.I == y.I && x.J == y.J })
	a, _, err := FromEdges(n, edges, 0)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// What is written reads back: by a line reader of the test's own, the edges are those of the graph, in order, and the
// bytes do not depend on the number of workers.
func TestExportsReadBack(t *testing.T) {
	for _, n := range []int{1, 2, 50, 4096, 15000} {
		a := exported(t, uint64(n), n)
		var list, again, market bytes.Buffer
		name := func(dst []byte, v int32) []byte { return fmt.Appendf(dst, "cell %d", v) }
		if raised, err := WriteEdgeList(&list, a, name, ',', 3); err != nil || raised != 0 {
			t.Fatal(raised, err)
		}
		if _, err := WriteEdgeList(&again, a, name, ',', 1); err != nil || !bytes.Equal(list.Bytes(), again.Bytes()) {
			t.Fatal("the list depends on the number of workers")
		}
		if _, err := WriteMatrixMarket(&market, a, []string{"invented"}, 2); err != nil {
			t.Fatal(err)
		}
		lines := bufio.NewScanner(&list)
		entries := bufio.NewScanner(&market)
		next := func() string {
			if !entries.Scan() {
				t.Fatal("the matrix ends early")
			}
			return entries.Text()
		}
		if b, c, d := next(), next(), next(); b != "%%MatrixMarket matrix coordinate real symmetric" || c != "% invented" || d != fmt.Sprintf("%d %d %d", n, n, a.NNZ()/2) {
			t.Fatalf("head %q, %q, %q", b, c, d)
		}
		for i := range n {
			col, val := a.Row(i)
			for k, j := range col {
				if int(j) < i {
					continue
				}
				if !lines.Scan() {
					t.Fatal("the list ends early")
				}
				weight := strconv.FormatFloat(math.Exp(val[k]), 'g', -1, 64)
				if want := fmt.Sprintf("cell %d,cell %d,%s", i, j, weight); lines.Text() != want {
					t.Fatalf("line %q, want %q", lines.Text(), want)
				}
				if got, want := next(), fmt.Sprintf("%d %d %s", j+1, i+1, weight); got != want {
					t.Fatalf("entry %q, want %q", got, want)
				}
			}
		}
		if lines.Scan() || entries.Scan() {
			t.Fatal("more lines than edges")
		}
	}
}

func TestExportRaisesWeightsThatUnderflow(t *testing.T) {
	a := &sparse.CSR{N: 2, RowPtr: []int{0, 1, 2}, Col: []int32{1, 0}, Val: []float64{-800, -800}}
	var b bytes.Buffer
	raised, err := WriteEdgeList(&b, a, func(dst []byte, v int32) []byte { return strconv.AppendInt(dst, int64(v), 10) }, '\t', 0)
	if err != nil || raised != 1 || b.String() != "0\t1\t5e-324\n" {
		t.Errorf("%q, %d, %v", b.String(), raised, err)
	}
}

// full refuses to take more than so many bytes.
type full struct{ room int }

var errFull = errors.New("no room")

func (f *full) Write(p []byte) (int, error) {
	if f.room -= len(p); f.room < 0 {
		return 0, errFull
	}
	return len(p), nil
}

func TestExportPassesWriteErrorsOn(t *testing.T) {
	a := exported(t, 3, 500)
	name := func(dst []byte, v int32) []byte { return strconv.AppendInt(dst, int64(v), 10) }
	for _, room := range []int{0, 10, 1000} {
		if _, err := WriteEdgeList(&full{room}, a, name, ',', 0); !errors.Is(err, errFull) {
			t.Errorf("list with room for %d: %v", room, err)
		}
		if _, err := WriteMatrixMarket(&full{room}, a, []string{strings.Repeat("c", 20)}, 0); !errors.Is(err, errFull) {
			t.Errorf("matrix with room for %d: %v", room, err)
		}
	}
}
