package job

import "context"

// TrustFigures say how far the labels can be trusted.
type TrustFigures struct {
	Promise string `json:"promise"`
}

func (t *TrustFigures) sentence() string { return t.Promise }

// judge turns scores into labels with their confidence.
func (r *run) judge(_ context.Context, l *labelled) error {
	w, scores := l.chosen.Weights, l.field.scores
	l.result = r.newResult(l, func(x int32) int32 {
		return int32(w.Decide(func(c int) float64 { return scores[c][x] }))
	})
	return nil
}
