package neighbors

import (
	"context"
	"fmt"
	"sync"

	"pinfill/internal/points"
)

// Index answers queries about points that stay as they are. It is safe for many goroutines.
type Index struct {
	t       *tree
	finders sync.Pool
}

// NewIndex builds an index over pts, in O(n log n). pts must not change while the index is used.
func NewIndex(ctx context.Context, pts *points.Matrix, o Options) (*Index, error) {
	if err := check(pts, &o); err != nil {
		return nil, err
	}
	t, err := newTree(ctx, pts, o)
	if err != nil {
		return nil, err
	}
	x := &Index{t: t}
	x.finders.New = func() any { return t.finder() }
	return x, nil
}

// Nearest fills index and dist, both of length k <= N, with the k points nearest to query (which may be one of them),
// nearest first. query holds D finite coordinates. It allocates nothing once as many goroutines as ask have asked.
func (x *Index) Nearest(query []float64, index []int32, dist []float64) error {
	if len(query) != x.t.pts.D {
		return fmt.Errorf("query of %d coordinates among points of %d", len(query), x.t.pts.D)
	}
	if len(index) != len(dist) || len(index) > x.t.pts.N {
		return fmt.Errorf("%d nearest wanted, with %d distances, of %d points", len(index), len(dist), x.t.pts.N)
	}
	f := x.finders.Get().(*finder)
	f.nearest(query, dist, index)
	x.finders.Put(f)
	x.t.rename(index)
	distances(x.t.metric, dist)
	return nil
}
