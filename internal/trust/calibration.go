package trust

import (
	"math"
	"slices"
)

// Calibration turns the scores of a row into probabilities: a softmax of the scores at a temperature, averaged over
// the temperatures that the left-out answers leave plausible.
//
// With s the scores of a row, divided by their sum, the feature of class c is q_c = s_c / sqrt(max s + 0.02). Half of
// the level is kept, since a row far from every label has all its scores close together, and half is divided out,
// since the level also depends on how many labels there are. Then p_c = exp(beta q_c) / sum_k exp(beta q_k).
//
// A few dozen labels do not settle one number beta, and the best fit is overconfident, without bound where every label
// is answered rightly. So beta is not fitted but averaged: prior ln beta ~ N(ln(5/m), 0.5^2), m the mean advantage of
// the leading class over the mean class in q; likelihood the left-out probability of the given labels. The prior's
// centre says that a typical lead is worth e^5 to one; its width leaves a factor of e either way. Temperature
// scaling: Guo et al. (2017), equation 9; averaging instead of fitting is ours.
type Calibration struct {
	classes int
	evid    ClassEvidence
	nodes   []node // a few temperatures that stand for all
	figures ClassFigures
}

type node struct{ beta, weight float64 }

const (
	levelFloor  = 0.02 // keeps q finite for a row without any score
	priorLead   = 5.0  // prior logit of a typical leading class
	priorSpread = 0.5  // standard deviation of ln beta
	gridStep    = 0.15 // of ln beta
	gridHalf    = 24   // points on each side of the centre: a factor of e^3.6 both ways
	nodeCount   = 6    // nodes that replace the grid when rows are scored
)

// FitCalibration learns from the left-out answers. Labels without one are passed over; ErrNoEvidence if none has one.
func FitCalibration(e ClassEvidence) (*Calibration, error) {
	if err := e.validate(); err != nil {
		return nil, err
	}
	c := &Calibration{classes: e.Classes, evid: e}
	var q [][]float64
	var given []int
	for i, s := range e.LeftOut {
		if known(s) {
			q = append(q, feature(make([]float64, e.Classes), s))
			given = append(given, e.Given[i])
		}
	}
	if len(q) == 0 {
		return nil, ErrNoEvidence
	}
	grid, prior, like := weigh(q, given)
	post := slices.Clone(prior)
	for _, l := range like {
		for g := range grid {
			post[g] += l[g]
		}
	}
	c.nodes = condense(grid, normalise(post))
	c.figures = leaveOneOut(q, given, grid, post, like)
	return c, nil
}

// feature sets dst to the q of scores. Scores below zero count as zero.
func feature(dst, scores []float64) []float64 {
	var sum, top float64
	for _, s := range scores {
		s = max(s, 0)
		sum += s
		top = max(top, s)
	}
	if !(sum > 0) || math.IsInf(sum, 1) {
		clear(dst)
		return dst
	}
	scale := 1 / (sum * math.Sqrt(top/sum+levelFloor))
	for c, s := range scores {
		dst[c] = max(s, 0) * scale
	}
	return dst
}

// weigh lays the grid of beta and gives the log prior of each point and, for each label, the log likelihood there.
func weigh(q [][]float64, given []int) (grid, prior []float64, like [][]float64) {
	var lead float64
	for _, row := range q {
		var mean float64
		for _, v := range row {
			mean += v / float64(len(row))
		}
		lead += (slices.Max(row) - mean) / float64(len(q))
	}
	centre := math.Log(priorLead / max(lead, 1e-3))
	for g := -gridHalf; g <= gridHalf; g++ {
		t := float64(gridStep * float64(g))
		grid = append(grid, math.Exp(centre+t))
		prior = append(prior, -0.5*(t/priorSpread)*(t/priorSpread))
	}
	like = make([][]float64, len(q))
	for i, row := range q {
		like[i] = make([]float64, len(grid))
		for g, beta := range grid {
			like[i][g] = logSoftmax(row, beta, given[i])
		}
	}
	return grid, prior, like
}

// logSoftmax is ln p_c at beta.
func logSoftmax(q []float64, beta float64, c int) float64 {
	top := slices.Max(q)
	var sum float64
	for _, v := range q {
		sum += math.Exp(beta * (v - top))
	}
	return beta*(q[c]-top) - math.Log(sum)
}

// normalise turns log weights into weights of sum 1.
func normalise(log []float64) []float64 {
	top := slices.Max(log)
	w := make([]float64, len(log))
	var sum float64
	for g, v := range log {
		w[g] = math.Exp(v - top)
		sum += w[g]
	}
	for g := range w {
		w[g] /= sum
	}
	return w
}

// condense replaces the weighted grid by nodeCount nodes of equal weight, each the mean beta of its share.
func condense(grid, weight []float64) []node {
	const share = 1.0 / nodeCount
	nodes := make([]node, 0, nodeCount)
	at, left := 0, weight[0]
	for len(nodes) < nodeCount {
		var beta float64
		need := share
		for need > 0 {
			take := min(need, left)
			if at == len(grid)-1 {
				take = need
			}
			beta += float64(take * grid[at])
			need -= take
			left -= take
			if left <= 0 && at < len(grid)-1 {
				at++
				left = weight[at]
			}
		}
		nodes = append(nodes, node{beta: beta / share, weight: share})
	}
	return nodes
}

// Probabilities sets dst to the probability of each class, given the scores of a row (all classes, on the scale of
// ClassEvidence.LeftOut). They sum to 1. A row with NaN has no answer: dst is NaN. dst and scores may be the same.
func (c *Calibration) Probabilities(dst, scores []float64) []float64 {
	if !known(scores) {
		for k := range dst {
			dst[k] = math.NaN()
		}
		return dst
	}
	var space [2 * 32]float64
	q, p := space[:0:32], space[32:32]
	if c.classes > 32 {
		q, p = make([]float64, 0, c.classes), make([]float64, 0, c.classes)
	}
	q, p = q[:c.classes], p[:c.classes]
	feature(q, scores)
	top := slices.Max(q)
	for k := range dst {
		dst[k] = 0
	}
	for _, n := range c.nodes {
		var sum float64
		for k, v := range q {
			p[k] = math.Exp(n.beta * (v - top))
			sum += p[k]
		}
		for k := range p {
			dst[k] += n.weight / sum * p[k]
		}
	}
	return dst
}

// Temperature is the mean of 1/beta over the plausible temperatures.
func (c *Calibration) Temperature() float64 {
	var t float64
	for _, n := range c.nodes {
		t += n.weight / n.beta
	}
	return t
}

// Figures are measured by leave-one-out: each label's probability comes from temperatures weighed without it. They are
// honest about the temperature. They are honest about whatever else was chosen on the same labels only as far as the
// left-out scores are; see Nested.
func (c *Calibration) Figures() ClassFigures { return c.figures }
