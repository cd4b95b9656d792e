package laplace

import (
	"context"
	"math"
)

const (
	directAlways = 300 // free vertices up to which a system is factorised at once
	deepNetwork  = 8   // edges from the ground beyond which Jacobi is not tried: it needs more iterations than that

	// In units of one product with A: an iteration of Jacobi, and what a multigrid solve takes with its set-up.
	jacobiStep    = 1.3
	multigridCost = 90
)

// engines are what a system has built so far and what it has learnt of itself.
type engines struct {
	factor *denseFactor
	grid   *hierarchy
	stale  bool   // the conductances have changed since grid was filled
	first  int    // iterations of the first solve on the grid's aggregates
	latest int    // of the latest
	choice Method // what Auto has settled on, or Auto
	depth  int    // edges from the ground to the farthest free vertex
}

func (e *engines) reweighted() {
	e.factor = nil
	e.stale = true
}

// hierarchy gives the multigrid for the present conductances: the old aggregates with new values as long as they
// serve, else a new one.
func (s *System) hierarchy() *hierarchy {
	switch {
	case s.grid == nil || s.stale && s.latest > s.first*3/2+4:
		s.grid = newHierarchy(&s.a.sddm, s.options.Workers)
		s.first, s.latest = 0, 0
	case s.stale:
		s.grid.refill(&s.a.sddm)
	}
	s.stale = false
	return s.grid
}

// run solves the jobs in blocks.
func (s *System) run(ctx context.Context, jobs []job, tol float64) (Stats, error) {
	total := Stats{Method: s.options.Method, Converged: true}
	var wide, single *block
	for len(jobs) > 0 {
		if err := ctx.Err(); err != nil {
			return total, err
		}
		k := single
		if len(jobs) > 1 {
			k = wide
		}
		if k == nil {
			width := 1
			if len(jobs) > 1 {
				width = maxWidth
			}
			k = newBlock(&s.a.sddm, s.options.Workers, width)
			if len(jobs) > 1 {
				wide = k
			} else {
				single = k
			}
		}
		now := jobs[:min(k.width, len(jobs))]
		jobs = jobs[len(now):]
		b, t := make([]float64, s.a.n), make([]float64, s.a.n)
		clear(k.b)
		clear(k.x)
		for c, j := range now {
			j.load(b, t)
			for i := range b {
				k.b[i*k.width+c], k.x[i*k.width+c] = b[i], t[i]
			}
			k.unit[c] = j.unit
		}
		st, err := s.solveBlock(ctx, k, len(now), tol)
		if err != nil {
			return total, err
		}
		for c, j := range now {
			for i := range t {
				t[i] = k.x[i*k.width+c]
			}
			j.store(t)
		}
		total.merge(st)
	}
	return total, nil
}

// solveBlock solves the first used columns of k.
func (s *System) solveBlock(ctx context.Context, k *block, used int, tol float64) (Stats, error) {
	method := s.options.Method
	if method == Auto {
		method = s.choice
	}
	var before [maxWidth]int // iterations spent on methods that were given up
	if method == Auto {
		switch {
		case s.a.n <= directAlways:
			method = Direct
		case s.depth > deepNetwork:
			method = Multigrid
		default:
			columns, done, err := pcg(ctx, k, tol, jacobi{}, tooSlow)
			if err != nil {
				return Stats{}, err
			}
			if done {
				return summary(columns[:used], before[:]), nil
			}
			for c := range before {
				before[c] = columns[c].stats.Iterations
			}
			method = Multigrid
		}
		s.choice = method
	}
	var m preconditioner
	switch method {
	case Direct:
		return s.solveDirect(ctx, k, used, tol)
	case Multigrid, Elimination:
		m = s.hierarchy()
	default:
		m = jacobi{}
	}
	columns, _, err := pcg(ctx, k, tol, m, nil)
	if err != nil {
		return Stats{}, err
	}
	if method == Multigrid {
		for _, c := range columns[:used] {
			s.latest = max(c.stats.Iterations, 0)
			if s.first == 0 {
				s.first = s.latest
			}
		}
	}
	return summary(columns[:used], before[:]), nil
}

func summary(columns []column, before []int) Stats {
	total := Stats{Converged: true}
	for c := range columns {
		columns[c].stats.Iterations += before[c]
		total.merge(columns[c].stats)
	}
	return total
}

// tooSlow predicts from the fall of the residual so far whether Jacobi will take longer than multigrid.
func tooSlow(iteration int, c *column, rr, tol float64) bool {
	if iteration < 20 || iteration%5 != 0 {
		return false
	}
	fall := math.Log(c.first/rr) / float64(iteration)
	left := math.Log(rr / (tol * tol * c.bb))
	return !(left <= 0) && !(left/fall*jacobiStep <= multigridCost) || fall <= 0
}
