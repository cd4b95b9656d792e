package choose

import (
	"math"
	"slices"
)

// Answers are what a setting says of the unlabelled vertices in reach, in order.
type Answers struct {
	Class []int32   // classes
	Value []float64 // numbers
}

// Answers gives what the setting says.
func (s *Score) Answers(l Labels) Answers {
	var a Answers
	for _, v := range freeOf(s.Fields, l) {
		if l.Task == Numbers {
			a.Value = append(a.Value, s.Fields[0][v])
		} else {
			a.Class = append(a.Class, int32(s.Weights.Decide(func(c int) float64 { return s.Fields[c][v] })))
		}
	}
	return a
}

// Agreement compares each two answers: the share of vertices that both give the same class; for numbers, one less the
// root mean square of their difference over the range of the labels. NaN where they are not of the same vertices.
func Agreement(answers []Answers, l Labels) [][]float64 {
	n := len(answers)
	agreement := make([][]float64, n)
	var size float64
	if l.Task == Numbers {
		size = slices.Max(l.Target[0]) - slices.Min(l.Target[0])
	}
	for i := range n {
		agreement[i] = make([]float64, n)
		agreement[i][i] = 1
		for j := range i {
			a := answers[i].agree(answers[j], size)
			agreement[i][j], agreement[j][i] = a, a
		}
	}
	return agreement
}

func (a Answers) agree(b Answers, size float64) float64 {
	if len(a.Class) != len(b.Class) || len(a.Value) != len(b.Value) || len(a.Class)+len(a.Value) == 0 {
		return math.NaN()
	}
	if a.Class != nil {
		same := 0
		for k, c := range a.Class {
			if c == b.Class[k] {
				same++
			}
		}
		return float64(same) / float64(len(a.Class))
	}
	if !(size > 0) {
		return math.NaN()
	}
	var s float64
	for k, v := range a.Value {
		s += float64((v - b.Value[k]) * (v - b.Value[k]))
	}
	return 1 - math.Sqrt(s/float64(len(a.Value)))/size
}
