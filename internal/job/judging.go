package job

import "context"

// TrustFigures say how far the labels can be trusted.
type TrustFigures struct {
	Promise string `json:"promise"`
}

func (t *TrustFigures) sentence() string { return t.Promise }

// judge turns scores into labels with their confidence.
func (r *run) judge(_ context.Context, l *labelled) error {
	l.result = r.newResult(l, func(x int32) int32 { return argmax(l.field.scores, x) })
	return nil
}

// argmax is the class with the largest score at a vertex; the first in name order where several share it.
func argmax(scores [][]float64, x int32) int32 {
	best := int32(0)
	for c := range scores {
		if scores[c][x] > scores[best][x] {
			best = int32(c)
		}
	}
	return best
}
