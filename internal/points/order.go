package points

import (
	"context"
	"math/bits"
	"slices"
	"sync"
)

// Leaf is the largest number of points in a leaf of the order.
const Leaf = 16

// Levels is the depth of the tree behind the order of n points: 2^Levels leaves of at most Leaf points each.
func Levels(n int) int {
	if n <= Leaf {
		return 0
	}
	return bits.Len(uint((n - 1) / Leaf))
}

// Bound is the first point of node i (0-based) on a level of the tree; the node ends where node i+1 starts.
func Bound(n, level, i int) int { return int(uint64(n) * uint64(i) >> level) }

// Order puts the rows of m, all finite, into the order of the leaves of a k-d tree and gives the row of the input
// that each row of the output was. Each node [Bound(i), Bound(i+1)) is cut across its widest column (the first of
// equals) so that what goes left is less in that column, or equal there and lexicographically less; leaves are sorted
// lexicographically. The order therefore depends on the points alone. Where rows are equal, no cut parts them, and the
// bounds may be others: equal rows stand side by side.
//
// Cost O(n log n) with no memory beside the answer; an order that is right already is found right in one pass a level.
// The context's error is the only one; the rows are then in no particular order.
func Order(ctx context.Context, m *Matrix, workers int) ([]int32, error) {
	perm := make([]int32, m.N)
	for i := range perm {
		perm[i] = int32(i)
	}
	o := orderer{ctx: ctx, m: m, perm: perm, levels: Levels(m.N), spare: make(chan struct{}, max(workers, 1))}
	for range max(workers, 1) - 1 {
		o.spare <- struct{}{}
	}
	o.cut(0, m.N, 0, 0)
	o.wg.Wait()
	return perm, ctx.Err()
}

// orderer sorts rows of m, and perm along with them.
type orderer struct {
	ctx    context.Context
	m      *Matrix
	perm   []int32
	levels int
	spare  chan struct{} // one token for each idle worker
	wg     sync.WaitGroup
}

// cut orders the rows [lo, hi), which are node i of a level.
func (o *orderer) cut(lo, hi, level, i int) {
	for hi-lo > 1 {
		axis, width := o.widest(lo, hi)
		if width == 0 || (hi-lo > 1<<14 && o.ctx.Err() != nil) {
			return
		}
		if level >= o.levels && hi-lo <= Leaf {
			o.sortLeaf(lo, hi)
			return
		}
		mid := lo + (hi-lo)/2
		if level < o.levels {
			if b := Bound(o.m.N, level+1, 2*i+1); b > lo && b < hi {
				mid = b
			}
		}
		mid = o.split(lo, hi, mid, axis)
		level, i = level+1, 2*i
		if hi-lo > 1<<14 {
			select {
			case <-o.spare:
				l, h, lev, node := mid, hi, level, i+1
				o.wg.Go(func() {
					o.cut(l, h, lev, node)
					o.spare <- struct{}{}
				})
				hi = mid
				continue
			default:
			}
		}
		o.cut(mid, hi, level, i+1)
		hi = mid
	}
}

// widest finds the column with the largest extent over the rows [lo, hi).
func (o *orderer) widest(lo, hi int) (axis int, width float64) {
	d, data := o.m.D, o.m.Data
	for j := range d {
		low := data[lo*d+j]
		high := low
		for k := (lo+1)*d + j; k < hi*d; k += d {
			v := data[k]
			if v < low {
				low = v
			} else if v > high {
				high = v
			}
		}
		if high-low > width {
			axis, width = j, high-low
		}
	}
	return axis, width
}

// split reorders the rows [lo, hi) around the row that belongs at mid, and gives the place of the cut: mid, or the
// nearest place before it (after it, where there is none) that does not part equal rows.
func (o *orderer) split(lo, hi, mid, axis int) int {
	o.selectRow(lo, hi-1, mid, func(i int, p []float64) int { return cmpFloat(o.m.Data[i*o.m.D+axis], p[axis]) }, axis)
	// Rows that tie with row mid in the column are brought together: [l, r).
	d, data := o.m.D, o.m.Data
	p := data[mid*d+axis]
	l, r := mid, mid+1
	for i := mid - 1; i >= lo; i-- {
		if data[i*d+axis] == p {
			l--
			o.swap(i, l)
		}
	}
	for i := mid + 1; i < hi; i++ {
		if data[i*d+axis] == p {
			o.swap(i, r)
			r++
		}
	}
	if r-l == 1 || l == mid {
		return mid
	}
	o.selectRow(l, r-1, mid, func(i int, p []float64) int { return slices.Compare(o.m.Row(i), p) }, -1)
	// Rows equal to row mid as a whole: [el, er).
	row := slices.Clone(o.m.Row(mid))
	el, er := mid, mid+1
	for i := mid - 1; i >= l; i-- {
		if slices.Equal(o.m.Row(i), row) {
			el--
			o.swap(i, el)
		}
	}
	if el == mid {
		return mid
	}
	if el > lo {
		return el
	}
	for i := mid + 1; i < r; i++ {
		if slices.Equal(o.m.Row(i), row) {
			o.swap(i, er)
			er++
		}
	}
	return er
}

// selectRow brings to place k of the rows [lo, hi] the row that belongs there by cmp, smaller ones before it.
func (o *orderer) selectRow(lo, hi, k int, cmp func(i int, p []float64) int, axis int) {
	p := make([]float64, o.m.D)
	for round := 0; hi > lo; round++ {
		if round > 64 || hi-lo < Leaf {
			o.heapSort(lo, hi+1, cmp)
			return
		}
		copy(p, o.m.Row(o.pivot(lo, hi, cmp)))
		i, j := lo, hi
		if axis >= 0 {
			d, data, key := o.m.D, o.m.Data, p[axis]
			for i <= j {
				for data[i*d+axis] < key {
					i++
				}
				for data[j*d+axis] > key {
					j--
				}
				if i <= j {
					o.swap(i, j)
					i++
					j--
				}
			}
		} else {
			for i <= j {
				for cmp(i, p) < 0 {
					i++
				}
				for cmp(j, p) > 0 {
					j--
				}
				if i <= j {
					o.swap(i, j)
					i++
					j--
				}
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return
		}
	}
}

// pivot is the place of the median of nine rows of [lo, hi] by cmp.
func (o *orderer) pivot(lo, hi int, cmp func(i int, p []float64) int) int {
	middle := func(a, b, c int) int {
		if cmp(a, o.m.Row(b)) > 0 {
			a, b = b, a
		}
		if cmp(b, o.m.Row(c)) <= 0 {
			return b
		}
		if cmp(a, o.m.Row(c)) > 0 {
			return a
		}
		return c
	}
	mid, step := lo+(hi-lo)/2, (hi-lo)/8
	return middle(middle(lo, lo+step, lo+2*step), middle(mid-step, mid, mid+step), middle(hi-2*step, hi-step, hi))
}

// heapSort sorts the rows [lo, hi) by cmp without memory, for short stretches and for input that defeats the pivots.
func (o *orderer) heapSort(lo, hi int, cmp func(i int, p []float64) int) {
	n := hi - lo
	sift := func(root, n int) {
		for {
			child := 2*root + 1
			if child >= n {
				return
			}
			if child+1 < n && cmp(lo+child, o.m.Row(lo+child+1)) < 0 {
				child++
			}
			if cmp(lo+root, o.m.Row(lo+child)) >= 0 {
				return
			}
			o.swap(lo+root, lo+child)
			root = child
		}
	}
	for i := n/2 - 1; i >= 0; i-- {
		sift(i, n)
	}
	for i := n - 1; i > 0; i-- {
		o.swap(lo, lo+i)
		sift(0, i)
	}
}

// sortLeaf sorts the few rows [lo, hi) lexicographically.
func (o *orderer) sortLeaf(lo, hi int) {
	for i := lo + 1; i < hi; i++ {
		for j := i; j > lo && slices.Compare(o.m.Row(j), o.m.Row(j-1)) < 0; j-- {
			o.swap(j, j-1)
		}
	}
}

// swap exchanges two rows.
func (o *orderer) swap(i, j int) {
	if i == j {
		return
	}
	a, b := o.m.Row(i), o.m.Row(j)
	for k := range a {
		a[k], b[k] = b[k], a[k]
	}
	o.perm[i], o.perm[j] = o.perm[j], o.perm[i]
}

func cmpFloat(a, b float64) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}
