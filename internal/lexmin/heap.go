package lexmin

// item is a vertex with its key at the time it was pushed.
type item struct {
	key float64
	v   int32
}

// less orders by key and settles ties by vertex, so that searches do not depend on the order of pushing.
func (a item) less(b item) bool { return a.key < b.key || (a.key == b.key && a.v < b.v) }

// heap is a min-heap in which every entry has four children: shallower than the binary one, and the four share
// a cache line.
type heap []item

func (h heap) init() {
	for i := (len(h) - 2) / 4; i >= 0 && len(h) > 1; i-- {
		h.down(i, h[i])
	}
}

func (h *heap) push(x item) {
	*h = append(*h, x)
	a := *h
	i := len(a) - 1
	for i > 0 {
		p := (i - 1) / 4
		if !x.less(a[p]) {
			break
		}
		a[i] = a[p]
		i = p
	}
	a[i] = x
}

func (h *heap) pop() item {
	a := *h
	top, last := a[0], a[len(a)-1]
	a = a[:len(a)-1]
	*h = a
	if len(a) > 0 {
		a.down(0, last)
	}
	return top
}

// down puts x into the hole at i, moving lesser children up.
func (h heap) down(i int, x item) {
	for {
		c := 4*i + 1
		if c >= len(h) {
			break
		}
		m := c
		for j := c + 1; j < min(c+4, len(h)); j++ {
			if h[j].less(h[m]) {
				m = j
			}
		}
		if !h[m].less(x) {
			break
		}
		h[i] = h[m]
		i = m
	}
	h[i] = x
}
