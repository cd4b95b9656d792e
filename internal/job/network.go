package job

import (
	"context"
	"errors"
	"fmt"
	"math"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/graph"
	"pinfill/internal/neighbors"
	"pinfill/internal/sparse"
	"pinfill/internal/table"
)

// network is the neighbour graph before its weights: the lists of one search serve every number of neighbours asked.
type network struct {
	*vertices
	given  *sparse.CSR      // ln w of a graph from --edges, or nil
	lists  *neighbors.Lists // of the largest number of neighbours asked, or nil
	ragged *neighbors.Ragged
	search neighbors.Report
	built  map[int]*graph.Graph // by number of neighbours; 0 for a radius
}

// findNetwork builds the vertices and the neighbour lists, or reads the given edges, and puts the labels on.
func (r *run) findNetwork(ctx context.Context, d *data) (*network, error) {
	if r.Edges != "" {
		return r.givenNetwork(ctx, d)
	}
	v, err := r.findVertices(ctx, d)
	if err != nil {
		return nil, err
	}
	n := &network{vertices: v, built: map[int]*graph.Graph{}}
	o := r.searchOptions()
	err = r.stage(ctx, "neighbours", func() error {
		if r.Radius > 0 {
			var err error
			n.ragged, n.search, err = neighbors.WithinRadius(ctx, v.space.Points, r.Radius/v.space.Unit, o)
			return err
		}
		k, err := r.largestK(v.n)
		if err != nil {
			return err
		}
		d.memory = estimateMemory(v.n, k) + d.table.Bytes()
		if err := r.needMemory(d.memory, fmt.Sprintf("solving on %d rows with %d neighbours", v.n, k)); err != nil {
			return err
		}
		n.lists, n.search, err = neighbors.KNearest(ctx, v.space.Points, k, o)
		return err
	})
	if err != nil {
		return nil, err
	}
	if !n.search.Exact {
		r.warnf("", "the neighbour search was approximate: recall %.3f on a seeded sample; --search=exact searches fully", n.search.Recall)
	}
	return n, nil
}

func (r *run) searchOptions() neighbors.Options {
	return neighbors.Options{Search: neighbors.Search(r.Search), Metric: r.Metric, Workers: r.Workers, Seed: r.Seed, Progress: r.progressFor("neighbours")}
}

// inUnits gives a bandwidth in the units of the points. One beyond the range of float64 there stays at its end: it is
// the weights that it gives which are then refused.
func (r *run) inUnits(n *network, b graph.Bandwidth) graph.Bandwidth {
	if !b.Local {
		b.H = min(max(b.H/n.space.Unit, 0x1p-1022), math.MaxFloat64)
	}
	return b
}

// largestK is the number of neighbours to search for: the largest asked, and never fewer than the local bandwidth and
// the dimension estimate need. A number that the table cannot give is refused when asked for, cut when it is ours.
func (r *run) largestK(n int) (int, error) {
	k := graph.LocalRank
	for _, want := range r.Neighbors {
		if want >= n {
			return 0, fault.Usagef("G06", "--neighbors %d is too many for %d distinct rows; at most %d", want, n, n-1)
		}
		k = max(k, want)
	}
	if len(r.Neighbors) == 0 {
		k = max(k, choose.DefaultNeighbors)
		if k >= n {
			r.warnf("G06", "%d distinct rows give at most %d neighbours each", n, n-1)
		}
	}
	return min(k, n-1), nil
}

// at gives the graph of k neighbours, built once.
func (n *network) graph(k, workers int) (*graph.Graph, error) {
	if n.ragged != nil {
		k = 0
	}
	if g, ok := n.built[k]; ok {
		return g, nil
	}
	var g *graph.Graph
	var err error
	if n.ragged != nil {
		g, err = graph.FromRagged(n.ragged, nil, workers)
	} else {
		g, err = graph.FromLists(n.lists, min(k, n.lists.K), workers)
	}
	n.built[k] = g
	return g, err
}

// weighted gives ln w of each edge for one setting.
func (r *run) weighted(n *network, k int, kernel graph.Kernel, b graph.Bandwidth) (*sparse.CSR, error) {
	if n.given != nil {
		return n.given, nil
	}
	g, err := n.graph(k, r.Workers)
	if err != nil {
		return nil, err
	}
	w, err := g.LogWeights(kernel, r.inUnits(n, b), r.Workers)
	var under *graph.UnderflowError
	if errors.As(err, &under) {
		told := *under
		if !b.Local { // in the units of --bandwidth
			told.Bandwidth, told.Smallest, told.Usable = b, under.Smallest*n.space.Unit, under.Usable*n.space.Unit
		}
		refusal := fault.Inputf("P07", "%v; pass --bandwidth=%.3g or local", &told, told.Usable)
		refusal.Err = err
		return nil, refusal
	}
	return w, err
}

// givenNetwork reads the graph of --edges.
func (r *run) givenNetwork(ctx context.Context, d *data) (*network, error) {
	var n *network
	err := r.stage(ctx, "edges", func() error {
		v, err := r.namedVertices(d)
		if err != nil {
			return err
		}
		t, err := r.readTable(ctx, "edges", r.Edges, d)
		if err != nil {
			return err
		}
		vertexOf := make(map[string]int32, v.n)
		for k, name := range v.names {
			vertexOf[name] = int32(k)
		}
		edges, err := encode.ReadEdges(t, vertexOf, r.Decimal)
		if err != nil {
			return err
		}
		n, err = r.fromEdges(t, v, edges)
		return err
	})
	return n, err
}

func (r *run) fromEdges(t *table.Table, v *vertices, edges []graph.Edge) (*network, error) {
	g, counts, err := graph.FromEdges(v.n, edges, r.Workers)
	var clash *graph.ConflictError
	if errors.As(err, &clash) {
		return nil, encode.PairFault(t, clash.First, clash.Second)
	}
	if err != nil {
		return nil, err
	}
	if counts.Edges == 0 {
		return nil, fault.Inputf("G07", "%s: no edge joins two rows", fault.Name(r.Edges))
	}
	if counts.Loops > 0 {
		r.warnf("", "%d edges from a row to itself were left out", counts.Loops)
	}
	if counts.Repeated > 0 {
		r.warnf("", "%d edges are given more than once with one weight and count once", counts.Repeated)
	}
	return &network{vertices: v, given: g}, nil
}

// reach settles the components without a label. It gives the graph to solve on and, by vertex, whether it was bridged.
func (r *run) reach(ctx context.Context, n *network, w *sparse.CSR, s choose.Setting, out *laid) (*sparse.CSR, []bool, error) {
	reach, err := graph.FindReach(w, n.fixed)
	if err != nil {
		return nil, nil, err
	}
	lost := reach.Blank()
	fig := &out.figures
	fig.Components, fig.UnlabelledParts = len(reach.Size), len(reach.Unlabelled())
	if lost == nil {
		return w, nil, nil
	}
	for _, x := range n.of {
		if x >= 0 && lost[x] {
			fig.UnlabelledRows++
		}
	}
	text := fmt.Sprintf("%d of %d components hold no label (%d rows)%s", fig.UnlabelledParts, fig.Components, fig.UnlabelledRows, n.connectHint(s))
	switch {
	case r.Unreachable == Stop:
		return nil, nil, fault.Inputf("G07", "%s; label a row of each, or pass --unreachable=bridge or --unreachable=blank", text)
	case r.Unreachable == Blank:
		out.warnings = append(out.warnings, encode.Warning{Code: "G07", Text: text + "; they are left blank"})
		return w, nil, nil
	case n.given != nil:
		return nil, nil, fault.Inputf("G07", "%s, and a given graph has no distances to bridge by; add edges, or pass --unreachable=blank", text)
	}
	g, err := n.graph(s.Neighbors, r.Workers)
	if err != nil {
		return nil, nil, err
	}
	joined, bridges, err := g.Join(ctx, w, reach, n.space.Points, s.Kernel, r.inUnits(n, s.Bandwidth), r.searchOptions())
	if err != nil {
		return nil, nil, err
	}
	fig.BridgedParts = len(bridges)
	out.warnings = append(out.warnings, encode.Warning{Code: "G07", Text: text + "; each was joined to the nearest labelled component, see pinfill_origin"})
	return joined, lost, nil
}

// connectHint says how many neighbours would connect every component to a label, where the search can tell.
func (n *network) connectHint(s choose.Setting) string {
	if n.lists == nil {
		return ""
	}
	labelled := make([]bool, n.n)
	for _, x := range n.fixed {
		labelled[x] = true
	}
	if k := graph.SmallestK(n.lists, labelled); k > s.Neighbors {
		return fmt.Sprintf("; --neighbors=%d would reach them", k)
	}
	return ""
}
