package graph

import (
	"fmt"
	"math"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// Bandwidth is the length h that distances are measured in before the kernel.
type Bandwidth struct {
	// Local makes h a function of the edge, h_ij = H sqrt(s_i s_j) with s_i the graph's Local (Zelnik-Manor and
	// Perona 2004); without it h = H everywhere.
	Local bool
	// H is in scaled units, or a plain factor where Local is set; > 0 and finite. Local with H = 1 is the usual rule.
	H float64
}

// Validate refuses a bandwidth that is not positive and finite.
func (b Bandwidth) Validate() error {
	if !(b.H > 0) || math.IsInf(b.H, 0) {
		return fmt.Errorf("bandwidth %v is not a positive finite number", b.H)
	}
	return nil
}

// t2 is (d/h)^2 for a distance between vertices of own scales si and sj. The two factors commute, so both entries of
// an edge get the same bits.
func (b Bandwidth) t2(d, si, sj float64) float64 {
	if b.Local {
		return (d / si) * (d / sj) / (b.H * b.H)
	}
	t := d / b.H
	return t * t
}

// lowestLog is the smallest ln w whose weight is a positive float64: ln 2^-1074.
const lowestLog = -1074 * math.Ln2

// UnderflowError says that a bandwidth is so small that no edge of the graph has a weight above zero.
type UnderflowError struct {
	Kernel    Kernel
	Bandwidth Bandwidth
	Smallest  float64 // smallest distance on an edge, scaled units
	Usable    float64 // a bandwidth of the same kind that keeps every edge that the graph needs to hang together
}

func (e *UnderflowError) Error() string {
	return fmt.Sprintf("every weight is zero: kernel %s at bandwidth %v, where the smallest distance is %v; bandwidth %.3g would do",
		e.Kernel, e.Bandwidth.H, e.Smallest, e.Usable)
}

// LogWeights gives ln phi(distance/h) for each edge. Edges where phi is zero (beyond the support of Epanechnikov and
// box, or ln w below the range of float64) are left out and the pattern rebuilt; otherwise the answer shares the
// skeleton's pattern. A weight that a float64 could not hold still stands, by its logarithm.
//
// The error is an *UnderflowError where no edge has a weight above zero, or says that the bandwidth is not positive
// and finite. workers = 0 means GOMAXPROCS.
func (g *Graph) LogWeights(k Kernel, b Bandwidth, workers int) (*sparse.CSR, error) {
	if err := b.Validate(); err != nil {
		return nil, err
	}
	a := g.Skeleton
	val := make([]float64, len(a.Val))
	chunks := (a.N + rowGrain - 1) / rowGrain
	cut := make([]int, chunks)   // edges with weight zero
	alive := make([]int, chunks) // edges with a weight that a float64 can hold
	parallel.ForChunk(workers, a.N, rowGrain, func(_, c, lo, hi int) {
		for i := lo; i < hi; i++ {
			si := g.Local[i]
			for t := a.RowPtr[i]; t < a.RowPtr[i+1]; t++ {
				v := k.Log(b.t2(a.Val[t], si, g.Local[a.Col[t]]))
				val[t] = v
				if v >= lowestLog {
					alive[c]++
				} else if math.IsInf(v, -1) {
					cut[c]++
				}
			}
		}
	})
	var cuts, alives int
	for c := range chunks {
		cuts += cut[c]
		alives += alive[c]
	}
	if alives == 0 && len(a.Col) > 0 {
		return nil, g.underflow(k, b, workers)
	}
	w := a.WithValues(val)
	if cuts > 0 {
		w = dropInfinite(w, workers)
	}
	return w, nil
}

// underflow measures what a bandwidth would have to be.
func (g *Graph) underflow(k Kernel, b Bandwidth, workers int) *UnderflowError {
	e := &UnderflowError{Kernel: k, Bandwidth: b, Smallest: math.Inf(1)}
	for _, d := range g.Skeleton.Val {
		e.Smallest = min(e.Smallest, d)
	}
	tree := g.forest(b.Local, workers)
	// Epanechnikov is zero at t = 1 itself, so the longest edge needs a little more than its own length.
	e.Usable = 1.25 * tree[len(tree)-1].W
	return e
}

// lengths gives the skeleton with each distance in units of a bandwidth with H = 1: the distance itself, or
// d/sqrt(s_i s_j).
func (g *Graph) lengths(local bool, workers int) *sparse.CSR {
	if !local {
		return g.Skeleton
	}
	a := g.Skeleton
	val := make([]float64, len(a.Val))
	unit := Bandwidth{Local: true, H: 1}
	parallel.For(workers, a.N, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			for t := a.RowPtr[i]; t < a.RowPtr[i+1]; t++ {
				val[t] = math.Sqrt(unit.t2(a.Val[t], g.Local[i], g.Local[a.Col[t]]))
			}
		}
	})
	return a.WithValues(val)
}

// dropInfinite leaves out the entries whose value is -Inf.
func dropInfinite(a *sparse.CSR, workers int) *sparse.CSR {
	k := &sparse.CSR{N: a.N, RowPtr: make([]int, a.N+1)}
	parallel.For(workers, a.N, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			_, val := a.Row(i)
			for _, v := range val {
				if !math.IsInf(v, -1) {
					k.RowPtr[i+1]++
				}
			}
		}
	})
	for i := range a.N {
		k.RowPtr[i+1] += k.RowPtr[i]
	}
	k.Col = make([]int32, k.RowPtr[a.N])
	k.Val = make([]float64, k.RowPtr[a.N])
	parallel.For(workers, a.N, rowGrain, func(lo, hi int) {
		for i := lo; i < hi; i++ {
			at := k.RowPtr[i]
			col, val := a.Row(i)
			for t, v := range val {
				if !math.IsInf(v, -1) {
					k.Col[at], k.Val[at] = col[t], v
					at++
				}
			}
		}
	})
	return k
}
