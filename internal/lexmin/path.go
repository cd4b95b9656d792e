package lexmin

import "math"

// step is a vertex of a path and the value it gets.
type step struct {
	v     int32
	value float64
}

// trace gives the path behind the bounds of v, from the held vertex above to the one below, and the other vertices of q
// whose paths are as steep, with the value of each on its path: linear in the distance from a named end. Where the
// slope is the steepest of all, each such vertex has this value whichever path through it is taken, since its bounds
// at that level meet there; setting them together keeps lattices of equal weights, all ties, from being settled one
// path at a time.
func (w *worker) trace(v int32, q []int32) []step {
	path := w.path[:0]
	for u := v; w.set[u] != held; u = w.lower[u].parent {
		path = append(path, step{u, w.along(v, w.lower[u].dist, true)})
	}
	for u := w.upper[v].parent; w.set[u] != held; u = w.upper[u].parent {
		path = append(path, step{u, w.along(v, w.upper[u].dist, false)})
	}
	for _, u := range q {
		if w.slope[u] >= w.slope[v]*(1-slack) {
			fromHigh := w.lower[u].dist < w.upper[u].dist
			path = append(path, step{u, w.along(u, min(w.lower[u].dist, w.upper[u].dist), fromHigh)})
		}
	}
	w.path = path
	return path
}

// along gives the value at a distance from the upper or the lower end of the path behind the bounds of v.
func (w *worker) along(v int32, dist float64, fromHigh bool) float64 {
	high, low := -w.lower[v].value, w.upper[v].value
	if fromHigh {
		return max(high-float64(w.slope[v]*dist), low)
	}
	return min(low+float64(w.slope[v]*dist), high)
}

// fix holds the vertices of a path at their values. A vertex that stands there twice keeps the first value.
func (w *worker) fix(path []step) {
	count := 0
	for _, s := range path {
		if w.set[s.v] != held {
			w.f[s.v] = s.value
			w.set[s.v] = held
			count++
		}
	}
	w.paths.Add(1)
	w.settle(count)
}

// star settles a vertex all of whose neighbours within reach are held.
func (w *worker) star(v int32, alpha float64) {
	lo, hi := w.g.RowPtr[v], w.g.RowPtr[v+1]
	w.f[v] = balance(w.g.Col[lo:hi], w.length[lo:hi], w.f, alpha)
	w.set[v] = held
	w.paths.Add(1)
	w.settle(1)
}

// balance gives the value of a vertex at which the steepest slope up to its neighbours equals the steepest down;
// neighbours whose value is NaN do not count. A pair of neighbours decides, the one with the greatest slope across: the slope is
// raised from alpha, which is below it, to that of the pair found at the last one until it stays (Dinkelbach's method
// for a ratio).
func balance(cols []int32, lens, value []float64, alpha float64) float64 {
	for {
		above, below := 0, 0
		keyAbove, keyBelow := math.Inf(-1), math.Inf(1)
		for k, u := range cols {
			drop := float64(alpha * lens[k])
			if key := value[u] - drop; key > keyAbove {
				above, keyAbove = k, key
			}
			if key := value[u] + drop; key < keyBelow {
				below, keyBelow = k, key
			}
		}
		high, low := value[cols[above]], value[cols[below]]
		slope := (high - low) / (lens[above] + lens[below])
		if slope > alpha*(1+slack) {
			alpha = slope
			continue
		}
		// The nearer end gives the more exact value.
		t := low + float64(alpha*lens[below])
		if lens[above] < lens[below] {
			t = high - float64(alpha*lens[above])
		}
		return min(max(t, low), high)
	}
}
