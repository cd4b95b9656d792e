package lexmin

import (
	"math"
	"sync"
	"sync/atomic"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// held marks a vertex whose value is set; free vertices carry the positive number of the set they are in.
const held = 0

// solver is the state shared by all workers. Sets that are worked on at the same time share no vertex and no edge
// (they are components of the same set), so no two workers touch the same entry.
type solver struct {
	g      *sparse.CSR
	length []float64 // of each stored edge, positive, see scaleLengths
	f      []float64 // normalised values, final where set is held
	set    []int32

	// Bounds at the level alpha at which a vertex was last looked at. Signs are chosen so that both searches minimise:
	// upper.key = y_t + alpha d_t, lower.key = -(y_t - alpha d_t); their sum is below 0 where a steeper path may pass.
	upper, lower []bound
	slope        []float64 // (y_a - y_b)/(d_a + d_b) of the two held vertices behind the bounds

	ids    atomic.Int32
	stop   atomic.Bool
	tokens chan struct{} // one a running worker
	spare  sync.Pool     // of *worker

	paths, flat, searches, pops atomic.Int64
	settled                     atomic.Int64
	free                        int
	report                      sync.Mutex
	progress                    func(share float64)
}

// bound is one end of the bounds: the held vertex's value (signed), the distance to it, and the next vertex towards it.
type bound struct {
	key, dist, value float64
	parent           int32
	pass             int32 // the search that wrote it
}

// worker holds one goroutine's scratch memory.
type worker struct {
	*solver
	heap  heap
	path  []step
	stack []int32 // sets, allocated and released as the recursion goes
}

func newSolver(g *sparse.CSR, fixed []int32, values []float64, low, scale float64, o Options) *solver {
	n := g.N
	s := &solver{
		g: g, f: make([]float64, n), set: make([]int32, n),
		upper: make([]bound, n), lower: make([]bound, n), slope: make([]float64, n),
		tokens: make(chan struct{}, parallel.Workers(o.Workers)), progress: o.Progress,
		free: n - len(fixed),
	}
	for v := range s.set {
		s.set[v] = 1
		s.f[v] = math.NaN()
	}
	s.ids.Store(1)
	for i, v := range fixed {
		s.f[v] = (values[i] - low) * scale
		s.set[v] = held
	}
	s.spare.New = func() any { return &worker{solver: s} }
	return s
}

func (s *solver) stats() Stats {
	return Stats{int(s.paths.Load()), int(s.flat.Load()), int(s.searches.Load()), int(s.pops.Load())}
}

// settle counts vertices that got their value and reports progress at every thousandth.
func (s *solver) settle(count int) {
	after := s.settled.Add(int64(count))
	if s.progress == nil {
		return
	}
	step := int64(max(s.free/1000, 1))
	if after/step != (after-int64(count))/step && s.report.TryLock() {
		s.progress(float64(after) / float64(s.free))
		s.report.Unlock()
	}
}

// dig settles all paths steeper than alpha within q: a connected set of free vertices, all with number id and with
// bounds at level alpha that say a steeper path may pass.
func (w *worker) dig(q []int32, id int32, alpha float64) {
	base := len(w.stack)
	defer func() { w.stack = w.stack[:base] }()
	for !w.stop.Load() {
		if len(q) == 1 {
			w.star(q[0], alpha)
			return
		}
		best, beta := w.pivot(q)
		mark := len(w.stack)
		path := w.trace(best, q)
		above := w.steeper(q, id, beta)
		if len(above) == 0 {
			// Nothing is steeper than the path through best.
			w.fix(path)
		} else {
			w.digAll(above, beta)
		}
		w.stack = w.stack[:mark]

		rest := w.keep(q, id)
		if len(rest) == 0 {
			return
		}
		if alpha == 0 {
			w.fresh(rest)
			return
		}
		w.loosen(rest)
		left := w.steeper(rest, id, alpha)
		if len(left) == 0 {
			return
		}
		parts := w.components(left)
		if len(parts) > 1 {
			w.each(parts, alpha)
			return
		}
		w.stack = append(w.stack[:base], parts[0].vertices...)
		q = w.stack[base:]
		id = parts[0].id
	}
}

// part is a component of a set with its number.
type part struct {
	vertices []int32
	id       int32
}

// digAll digs in each component of a set whose bounds are at level alpha.
func (w *worker) digAll(above []int32, alpha float64) { w.each(w.components(above), alpha) }

// fork is the size from which a component is worth a goroutine of its own.
const fork = 500

// each digs in every part.
func (w *worker) each(parts []part, alpha float64) {
	w.forEach(parts, func(w *worker, p part) { w.dig(p.vertices, p.id, alpha) })
}

// forEach does something with every part, some of them on other workers when there are any to spare.
func (w *worker) forEach(parts []part, do func(*worker, part)) {
	var side aside
	for i, p := range parts {
		if i+1 < len(parts) && len(p.vertices) >= fork && side.run(w, func(w *worker) { do(w, p) }) {
			continue
		}
		do(w, p)
	}
	side.wait(w)
}

// keep gives the vertices of q that are still free, marked with id again.
func (w *worker) keep(q []int32, id int32) []int32 {
	from := len(w.stack)
	for _, v := range q {
		if w.set[v] != held {
			w.set[v] = id
			w.stack = append(w.stack, v)
		}
	}
	return w.stack[from:]
}

// fresh settles all that is left of a set, starting from level 0 in each of its components.
func (w *worker) fresh(rest []int32) {
	id := w.ids.Add(1)
	for _, v := range rest {
		w.set[v] = id
	}
	w.forEach(w.split(rest, id), func(w *worker, p part) { w.begin(p) })
}

// level is the difference of values, as a share of the label range, below which a component counts as flat.
const level = 1e-80

// begin settles a component: flat where it meets one value only, otherwise from the distances to the vertices of
// the greatest and of the least value, the bounds at level 0.
func (w *worker) begin(p part) {
	low, high := w.met(p.vertices)
	if high-low < level {
		for _, v := range p.vertices {
			w.f[v] = low
			w.set[v] = held
		}
		w.flat.Add(int64(len(p.vertices)))
		w.settle(len(p.vertices))
		return
	}
	pass := w.ids.Add(1)
	w.distances(p.vertices, p.id, low, 1, w.upper, pass)
	w.distances(p.vertices, p.id, high, -1, w.lower, pass)
	for _, v := range p.vertices {
		w.slope[v] = (high - low) / (w.upper[v].dist + w.lower[v].dist)
		w.upper[v].key, w.lower[v].key = low, -high
	}
	w.dig(p.vertices, p.id, 0)
}
