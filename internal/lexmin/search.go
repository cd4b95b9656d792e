package lexmin

import (
	"math"
	"slices"
)

// slack is the relative difference of slopes below which two paths count as equally steep. It covers the rounding of
// lengths summed along a path; the values differ by no more than this share of the steepest slope.
const slack = 1e-14

// small is the set size from which on the steepest path itself is sought, not a level that halves the set.
const small = 16

// pivot gives the vertex of q with the greatest slope found so far (the first of those), and the next level to look at.
func (w *worker) pivot(q []int32) (best int32, beta float64) {
	best = q[0]
	for _, v := range q {
		if w.slope[v] > w.slope[best] {
			best = v
		}
	}
	if len(q) <= small {
		return best, w.slope[best]
	}
	var sample [64]float64
	stride := (len(q) + len(sample) - 1) / len(sample)
	count := 0
	for i := stride / 2; i < len(q); i += stride {
		sample[count] = w.slope[q[i]]
		count++
	}
	slices.Sort(sample[:count])
	return best, sample[int(quantile*float64(count))]
}

// quantile of the slopes found so far that is taken as the next level.
const quantile = .6

// steeper gives the vertices of q, a set with number id, through which a path steeper than beta may pass, with both
// bounds and the slope behind them. The lower keys on entry must bound those to come from below; both bounds are
// written wherever a search comes.
func (w *worker) steeper(q []int32, id int32, beta float64) []int32 {
	pass := w.ids.Add(1)
	w.search(sought{q, id, beta, 1, pass, false}, w.upper, w.lower)
	return w.search(sought{q, id, beta, -1, pass, true}, w.lower, w.upper)
}

// loosen sets the lower bounds of a set to the least that can be said: no value beyond the greatest met.
func (w *worker) loosen(q []int32) {
	_, high := w.met(q)
	for _, v := range q {
		w.lower[v].key = -high
	}
}

// met gives the least and the greatest held value next to a set, +Inf and -Inf where there is none.
func (s *solver) met(q []int32) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, v := range q {
		cols, _ := s.g.Row(int(v))
		for _, u := range cols {
			if s.set[u] == held {
				low, high = min(low, s.f[u]), max(high, s.f[u])
			}
		}
	}
	return low, high
}

// sought is what one search is told: the set, its number, the level, the sign of the values (1 for upper bounds, -1
// for lower), the number of the pass, and whether the other bound is from this pass or from an earlier, lower level.
type sought struct {
	q           []int32
	id          int32
	alpha, sign float64
	pass        int32
	second      bool
}

// search is Dijkstra's method from the held vertices around a set: own becomes the least sign*y_t + alpha d_t,
// wherever that and the other bound leave room for a path steeper than alpha. A vertex between one with room and the
// held vertex it hangs on has room too, so nothing is cut off by stopping where there is none. The second search gives
// the vertices it settles, with their slopes.
func (w *worker) search(s sought, own, other []bound) []int32 {
	q, id, alpha, sign, pass, second := s.q, s.id, s.alpha, s.sign, s.pass, s.second
	tight := alpha * (1 + slack)
	g, length, set, f := w.g, w.length, w.set, w.f
	h := w.heap[:0]
	for _, v := range q {
		if second && other[v].pass != pass {
			continue
		}
		b := bound{key: math.Inf(1), pass: pass}
		for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
			u := g.Col[k]
			if set[u] != held {
				continue
			}
			if key := float64(sign*f[u]) + float64(alpha*length[k]); key < b.key {
				b.key, b.value, b.dist, b.parent = key, sign*f[u], length[k], u
			}
		}
		if b.key < math.Inf(1) && room(&s, &b, &other[v], tight) {
			own[v] = b
			h = append(h, item{b.key, v})
		}
	}
	h.init()
	from := len(w.stack)
	pops := 0
	for len(h) > 0 {
		top := h.pop()
		pops++
		v := top.v
		b := own[v]
		if b.key != top.key {
			continue // an older, greater entry
		}
		if second {
			w.stack = append(w.stack, v)
			w.slope[v] = slopeBetween(&b, &other[v])
		}
		lo, hi := g.RowPtr[v], g.RowPtr[v+1]
		cols := g.Col[lo:hi]
		lens := length[lo:hi]
		lens = lens[:len(cols)]
		for k, u := range cols {
			if set[u] != id {
				continue
			}
			dist := b.dist + lens[k]
			key := b.value + float64(alpha*dist)
			o := &own[u]
			if o.pass == pass && o.key <= key {
				continue
			}
			next := bound{key, dist, b.value, v, pass}
			if !room(&s, &next, &other[u], tight) {
				continue
			}
			*o = next
			h.push(item{key, u})
		}
		if pops&0xffff == 0 && w.stop.Load() {
			break
		}
	}
	w.heap = h
	w.searches.Add(1)
	w.pops.Add(int64(pops))
	return w.stack[from:]
}

// room says whether a path steeper than the level may pass a vertex with these bounds.
func room(s *sought, own, other *bound, tight float64) bool {
	if s.second {
		return other.pass == s.pass && crosses(own, other, tight)
	}
	return own.key+other.key < 0
}

// crosses says whether the path behind two bounds of a vertex is steeper than a level. The slope itself is compared,
// not the sum of the keys, in which nearly equal values cancel.
func crosses(a, b *bound, level float64) bool {
	return -(a.value + b.value) > float64(level*(a.dist+b.dist))
}

// slopeBetween is the slope of the path behind two bounds of a vertex.
func slopeBetween(a, b *bound) float64 { return -(a.value + b.value) / (a.dist + b.dist) }

// distances is Dijkstra's method from the held vertices of one value: own becomes their distance.
func (w *worker) distances(q []int32, id int32, value, sign float64, own []bound, pass int32) {
	g := w.g
	h := w.heap[:0]
	for _, v := range q {
		b := bound{key: math.Inf(1), value: sign * value, pass: pass}
		for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
			if u := g.Col[k]; w.set[u] == held && w.f[u] == value && w.length[k] < b.key {
				b.key, b.dist, b.parent = w.length[k], w.length[k], u
			}
		}
		own[v] = b
		if b.key < math.Inf(1) {
			h = append(h, item{b.key, v})
		}
	}
	h.init()
	pops := 0
	for len(h) > 0 {
		top := h.pop()
		pops++
		if own[top.v].key != top.key {
			continue
		}
		for k := g.RowPtr[top.v]; k < g.RowPtr[top.v+1]; k++ {
			u := g.Col[k]
			if w.set[u] != id {
				continue
			}
			if d := top.key + w.length[k]; d < own[u].key {
				own[u].key, own[u].dist, own[u].parent = d, d, top.v
				h.push(item{d, u})
			}
		}
		if pops&0xffff == 0 && w.stop.Load() {
			break
		}
	}
	w.heap = h
	w.searches.Add(1)
	w.pops.Add(int64(pops))
}
