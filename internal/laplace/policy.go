package laplace

import (
	"context"
	"math"
)

// The costs by which Auto chooses, in units of one multiplication and addition with an entry of A.
const (
	jacobiStep    = 1.3 // an iteration of Jacobi, per entry
	multigridCost = 90  // a multigrid solve with its set-up, per entry
	iterateCost   = 70  // a right-hand side by whichever iteration, per entry: for the choice of elimination
	smallChange   = 2e5 // work too small to weigh

	treeLike     = 3       // entries a row up to which elimination is planned whatever the size
	planAlways   = 2000    // rows up to which elimination is planned for a single right-hand side
	planMany     = 30_000  // and for many
	planRescue   = 300_000 // and where nothing else has converged
	manyColumns  = 4
	rescueWork   = 1e10
	rescueFactor = 1 << 28 // entries
)

// engines are what a system has built so far and what it has learnt of itself.
type engines struct {
	plan    *plan
	planned int // most entries the factor was allowed when a plan was last sought; 0: never sought
	factor  *factor
	grid    *hierarchy
	stale   bool   // the conductances have changed since grid was filled
	first   int    // iterations of the first solve on the grid's aggregates
	latest  int    // of the latest
	choice  Method // the iteration that Auto has settled on, or Auto
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
	rhs := len(jobs)
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
		st, err := s.solveBlock(ctx, k, len(now), rhs, tol)
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

// solveBlock solves the first used columns of k, of rhs right-hand sides in all.
func (s *System) solveBlock(ctx context.Context, k *block, used, rhs int, tol float64) (Stats, error) {
	method := s.options.Method
	var before [maxWidth]int // iterations spent on methods that were given up
	if method == Auto {
		cheap, err := s.eliminationPays(ctx, rhs)
		if err != nil {
			return Stats{}, err
		}
		method = s.choice
		switch {
		case cheap:
			method = Direct
		case method == Auto && s.a.deep():
			method, s.choice = Multigrid, Multigrid
		case method == Auto || method == Jacobi:
			columns, done, err := pcg(ctx, k, tol, jacobi{}, tooSlow)
			if err != nil {
				return Stats{}, err
			}
			if done {
				s.choice = Jacobi
				return s.rescue(ctx, k, used, tol, summary(columns[:used], before[:]))
			}
			for c := range before {
				before[c] = columns[c].stats.Iterations
			}
			method, s.choice = Multigrid, Multigrid
		}
	} else if method == Direct {
		if err := s.makePlan(ctx, math.MaxInt); err != nil {
			return Stats{}, err
		}
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
			s.latest = c.stats.Iterations
			if s.first == 0 {
				s.first = s.latest
			}
		}
	}
	st := summary(columns[:used], before[:])
	if s.options.Method == Auto {
		return s.rescue(ctx, k, used, tol, st)
	}
	return st, nil
}

// makePlan plans an elimination whose factor holds at most so many entries, if that can be, unless it was tried before.
func (s *System) makePlan(ctx context.Context, most int) error {
	if s.plan != nil || s.planned >= most {
		return nil
	}
	p, err := newPlan(ctx, &s.a.sddm, most)
	if err != nil {
		return err
	}
	s.plan, s.planned = p, most
	return nil
}

// eliminationPays says whether elimination is expected to be quicker than iterations for rhs right-hand sides.
func (s *System) eliminationPays(ctx context.Context, rhs int) (bool, error) {
	n, nnz := s.a.n, len(s.a.col)
	if nnz > treeLike*n && (n > planMany || n > planAlways && rhs < manyColumns) {
		return false, nil
	}
	if err := s.makePlan(ctx, iterateCost/2*nnz+n); err != nil {
		return false, err
	}
	if s.plan == nil {
		return false, nil
	}
	work := 2 * float64(len(s.plan.row)) * float64(rhs)
	if s.factor == nil {
		work += s.plan.work
	}
	return work <= iterateCost*float64(nnz)*float64(rhs)+smallChange, nil
}

// rescue eliminates where iterations have not converged and the factor is affordable.
func (s *System) rescue(ctx context.Context, k *block, used int, tol float64, st Stats) (Stats, error) {
	if st.Converged || s.a.n > planRescue {
		return st, nil
	}
	if err := s.makePlan(ctx, rescueFactor); err != nil {
		return st, err
	}
	if s.plan == nil || s.plan.work > rescueWork {
		return st, nil
	}
	better, err := s.solveDirect(ctx, k, used, tol)
	better.Iterations += st.Iterations
	return better, err
}

func summary(columns []column, before []int) Stats {
	total := Stats{Converged: true}
	for c := range columns {
		columns[c].stats.Iterations += before[c]
		total.merge(columns[c].stats)
	}
	return total
}

// tooSlow predicts from the fall of the residual so far whether Jacobi will take longer than multigrid. Conjugate
// gradients quicken once they have found the few smallest eigenvalues, so that an early forecast must be far worse.
func tooSlow(iteration int, c *column, rr, tol float64) bool {
	if iteration < 12 || iteration%4 != 0 {
		return false
	}
	margin := 1.0
	if iteration < 36 {
		margin = 3
	}
	fall := math.Log(c.first/rr) / float64(iteration)
	left := math.Log(rr / (tol * tol * c.bb))
	return left > 0 && !(fall > 0 && left/fall*jacobiStep <= margin*multigridCost)
}
