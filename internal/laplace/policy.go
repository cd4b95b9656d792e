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
	closeEnough  = 1e-11 // figures that need no rescue
	rescueWork   = 1e10
	rescueFactor = 1 << 28 // entries
)

// engines are what a system has built so far and what it has learnt of itself.
type engines struct {
	plan    *plan
	planned int // most entries the factor was allowed when a plan was last sought; 0: never sought
	factor  *factor
	rough   *approximation
	grid    *hierarchy
	stale   bool   // the conductances have changed since grid was filled
	first   int    // iterations of the first solve on the grid's aggregates
	latest  int    // of the latest
	choice  Method // the iteration that Auto has settled on, or Auto
}

func (e *engines) reweighted() {
	e.factor, e.rough = nil, nil
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
		slot, width := &single, 1
		if len(jobs) > 2 { // a block costs more than two alone
			slot, width = &wide, maxWidth
		}
		if *slot == nil {
			*slot = newBlock(&s.a.sddm, s.options.Workers, width)
		}
		k := *slot
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
	switch s.options.Method {
	case Auto:
	case Direct:
		if err := s.makePlan(ctx, math.MaxInt); err != nil {
			return Stats{}, err
		}
		return s.solveDirect(ctx, k, used, tol)
	default:
		st, _, err := s.iterate(ctx, k, used, tol, s.options.Method, nil)
		return st, err
	}
	if pays, err := s.eliminationPays(ctx, rhs); err != nil {
		return Stats{}, err
	} else if pays {
		return s.solveDirect(ctx, k, used, tol)
	}
	if s.choice == Auto && s.a.deep() {
		s.choice = Multigrid
	}
	var st Stats
	spent := 0
	attempts := []struct {
		method Method
		quit   verdict
	}{{Jacobi, tooSlow}, {Multigrid, hopeless}, {Elimination, nil}}
	for _, try := range attempts {
		if try.method < s.choice {
			continue
		}
		var done bool
		var err error
		if st, done, err = s.iterate(ctx, k, used, tol, try.method, try.quit); err != nil {
			return st, err
		}
		spent += st.Iterations
		st.Iterations = spent
		s.choice = try.method
		if done && (st.good(tol) || try.method == Elimination) {
			break
		}
		if rescued, err := s.canEliminate(ctx, rescueWork/10); done && rescued || err != nil {
			break
		}
	}
	if st.good(tol) {
		return st, nil
	}
	can, err := s.canEliminate(ctx, rescueWork)
	if err != nil || !can {
		return st, err
	}
	better, err := s.solveDirect(ctx, k, used, tol)
	better.Iterations = spent
	return better, err
}

// good says that a solve converged, or came so close that elimination would not pay.
func (s *Stats) good(tol float64) bool {
	return s.Converged || max(s.Residual, s.Correction) <= max(tol, closeEnough)
}

// iterate runs one preconditioner on k; done is false if quit ended it.
func (s *System) iterate(ctx context.Context, k *block, used int, tol float64, method Method, quit verdict) (st Stats, done bool, err error) {
	var m preconditioner = jacobi{}
	switch method {
	case Multigrid:
		m = s.hierarchy()
	case Elimination:
		if s.rough == nil {
			if s.rough, err = newApproximation(ctx, k.a); err != nil {
				return st, false, err
			}
		}
		m = s.rough
	}
	columns, done, err := pcg(ctx, k, tol, m, quit)
	if err != nil {
		return st, false, err
	}
	st.Converged = true
	for c := range used {
		st.merge(columns[c].stats)
	}
	if method == Multigrid {
		s.latest = columns[0].stats.Iterations
		if s.first == 0 {
			s.first = s.latest
		}
	}
	return st, done, nil
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
	work := float64(2 * float64(len(s.plan.row)) * float64(rhs))
	if s.factor == nil {
		work += s.plan.work
	}
	return work <= float64(iterateCost*float64(nnz)*float64(rhs))+smallChange, nil
}

// canEliminate says whether an elimination of at most so much work is possible.
func (s *System) canEliminate(ctx context.Context, work float64) (bool, error) {
	if s.a.n > planRescue {
		return false, nil
	}
	if err := s.makePlan(ctx, rescueFactor); err != nil {
		return false, err
	}
	return s.plan != nil && s.plan.work <= work, nil
}

// hopeless predicts whether multigrid will take far longer than it should.
func hopeless(iteration int, c *column, rr, tol float64) bool {
	if iteration < 60 || iteration%20 != 0 {
		return false
	}
	fall := math.Log(c.first/rr) / float64(iteration)
	left := math.Log(rr / (tol * tol * c.bb))
	return left > 0 && !(fall > 0 && left/fall <= 60)
}

// tooSlow predicts from the fall of the residual so far whether Jacobi will take longer than multigrid, not before
// conjugate gradients have had the time to find the few smallest eigenvalues, after which they quicken.
func tooSlow(iteration int, c *column, rr, tol float64) bool {
	if iteration < 24 || iteration%4 != 0 {
		return false
	}
	fall := math.Log(c.first/rr) / float64(iteration)
	left := math.Log(rr / (tol * tol * c.bb))
	return left > 0 && !(fall > 0 && left/fall*jacobiStep <= multigridCost)
}
