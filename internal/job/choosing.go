package job

import (
	"context"

	"pinfill/internal/graph"
)

// ChoiceFigures say how settings that were not given were chosen.
type ChoiceFigures struct {
	Reason string `json:"reason"`
}

// chooseSetting settles what the user left open.
func (r *run) chooseSetting(ctx context.Context, l *labelled) error {
	l.setting = r.plainSetting(l.network)
	return nil
}

// plainSetting is what holds without a choice: the flags, or the middle of the road.
func (r *run) plainSetting(n *network) setting {
	s := setting{p: 2, neighbors: 10, kernel: graph.Gaussian, bandwidth: graph.Bandwidth{Local: true, H: 1}, balance: "none"}
	if len(r.P) > 0 {
		s.p = r.P[0]
	}
	if len(r.Neighbors) > 0 {
		s.neighbors = r.Neighbors[0]
	}
	if len(r.Kernels) > 0 {
		s.kernel = r.Kernels[0]
	}
	if len(r.Bandwidths) > 0 {
		s.bandwidth = r.Bandwidths[0]
	}
	if n.lists != nil {
		s.neighbors = min(s.neighbors, n.lists.K)
	}
	return s
}
