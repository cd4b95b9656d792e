package lexmin

// step is a vertex of a path and the value it gets.
type step struct {
	v     int32
	value float64
}

// trace gives the path behind the bounds of v, from the held vertex above to the one below, with the value of each
// free vertex on it: linear in the distance from the nearer named end.
func (w *worker) trace(v int32) []step {
	slope := w.slope[v]
	high, low := -w.lower[v].value, w.upper[v].value
	path := w.path[:0]
	for u := v; w.set[u] != held; u = w.lower[u].parent {
		path = append(path, step{u, max(high-float64(slope*w.lower[u].dist), low)})
	}
	for u := w.upper[v].parent; w.set[u] != held; u = w.upper[u].parent {
		path = append(path, step{u, min(low+float64(slope*w.upper[u].dist), high)})
	}
	w.path = path
	return path
}

// fix holds the vertices of a path at their values. A vertex that stands on both halves (possible only where
// lengths are lost in rounding) keeps the first value.
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

// star settles a vertex all of whose neighbours within reach are held: the steepest pair decides. The slope is raised
// from alpha to that of the pair found at the last one until it stays (Dinkelbach's method for a ratio).
func (w *worker) star(v int32, alpha float64) {
	g := w.g
	lo, hi := g.RowPtr[v], g.RowPtr[v+1]
	for {
		above, below := -1, -1
		var keyAbove, keyBelow float64
		for k := lo; k < hi; k++ {
			u := g.Col[k]
			if w.set[u] != held {
				continue
			}
			drop := float64(alpha * w.length[k])
			if key := w.f[u] - drop; above < 0 || key > keyAbove {
				above, keyAbove = k, key
			}
			if key := w.f[u] + drop; below < 0 || key < keyBelow {
				below, keyBelow = k, key
			}
		}
		high, low := w.f[g.Col[above]], w.f[g.Col[below]]
		slope := (high - low) / (w.length[above] + w.length[below])
		if slope > alpha*(1+slack) {
			alpha = slope
			continue
		}
		// The nearer end gives the more exact value.
		value := low + float64(alpha*w.length[below])
		if w.length[above] < w.length[below] {
			value = high - float64(alpha*w.length[above])
		}
		w.f[v] = min(max(value, low), high)
		w.set[v] = held
		break
	}
	w.paths.Add(1)
	w.settle(1)
}
