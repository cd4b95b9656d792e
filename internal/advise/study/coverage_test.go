package study

import (
	"context"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pinfill/internal/choose"
	"pinfill/internal/trust"
)

const coverage = 0.9

var only = flag.String("table", "", "study this table of classes alone")

func tables() []string {
	if *only != "" {
		return []string{*only}
	}
	if quick() {
		return []string{"iris", "wine"}
	}
	return []string{"iris", "wine", "digits", "clips", "seabed"}
}

// fewer gives the number of drawings for a table: large ones cost more.
func fewer(name string, p float64) int {
	d := *drawings
	if name == "seabed" || name == "grain" || p != 2 {
		d = min(d, max(d/4, 4))
	}
	return d
}

// chance is how far the mean coverage of few drawings may lie off: three standard errors, one drawing of 40 labels
// having a standard deviation of sqrt(.9 .1 / 42) = .046 (Beta distribution of conformal coverage). With the hundreds
// of drawings that the documented figures take, nothing is granted.
func chance(drawings int) float64 {
	if drawings >= 100 {
		return 0
	}
	return 3 * .046 / math.Sqrt(float64(drawings))
}

// TestClassCoverage prints, for labels drawn at random: coverage and size of the sets, calibration error, Brier score
// and accuracy on the unlabelled rows.
func TestClassCoverage(t *testing.T) {
	if *drawings == 0 {
		t.Skip("a study: make coverage")
	}
	fmt.Printf("%-8s %3s %4s %-7s %8s %6s %6s %6s %6s %6s %6s %8s\n", "table", "l", "p", "balance", "covered", "size", "empty", "ECE", "Brier", "right", "lo-ECE", "lo-right")
	for _, name := range tables() {
		var size mean
		for _, count := range []int{40, 50, 60} {
			for _, mode := range []choose.Mode{choose.AutoBalance, choose.Uniform} {
				size.add(classCoverage(t, name, count, 2, mode))
			}
		}
		if size.value() > 1.6 {
			t.Errorf("%s: %.2f classes a set, want at most 1.6", name, size.value())
		}
		if name == "iris" || name == "wine" {
			classCoverage(t, name, 50, 4, choose.AutoBalance)
		}
	}
}

// classCoverage prints one row and gives the mean size of the sets.
func classCoverage(t *testing.T, name string, count int, p float64, mode choose.Mode) float64 {
	t.Helper()
	l := get(t, name)
	var covered, size, empty, ece, brier, right, leftECE, leftRight mean
	for d := range fewer(name, p) {
		at := l.draw(rand.New(rand.NewPCG(uint64(d), uint64(count))), count)
		a := l.solveClasses(t, l.labels(at, func(k int) int { return l.class[at[k]] }), p, mode)
		cal, err := trust.FitCalibration(trust.ClassEvidence{Classes: l.classes, LeftOut: a.leftOut, Given: a.given})
		if err != nil {
			t.Fatal(err)
		}
		sets, err := trust.NewSets(cal, trust.SetSettings{Coverage: coverage})
		if err != nil {
			t.Fatal(err)
		}
		var in [][]int32
		var prob [][]float64
		var truth []int
		for _, v := range l.free(at) {
			q := cal.Probabilities(make([]float64, l.classes), a.shares(nil, v))
			prob, truth = append(prob, q), append(truth, l.class[v])
			in = append(in, sets.Of(nil, q))
			if len(in[len(in)-1]) == 0 {
				empty.add(1)
			} else {
				empty.add(0)
			}
		}
		c := trust.MeasureSets(in, truth)
		covered.add(c.Covered.Value)
		size.add(c.Size)
		m := trust.MeasureClasses(prob, truth)
		ece.add(m.ECE)
		brier.add(m.Brier)
		right.add(m.Accuracy)
		leftECE.add(cal.Figures().ECE)
		leftRight.add(cal.Figures().Accuracy)
	}
	fmt.Printf("%-8s %3d %4g %-7s %.3f±%.3f %5.2f %6.3f %6.3f %6.3f %6.3f %6.3f %8.3f\n", name, count, p, mode,
		covered.value(), covered.se(), size.value(), empty.value(), ece.value(), brier.value(), right.value(), leftECE.value(), leftRight.value())
	slack := chance(covered.n)
	if v := covered.value(); v < .87-slack || v > .93+slack {
		t.Errorf("%s, %d labels, p=%g, %v: sets hold the truth at %.3f, want .87 to .93", name, count, p, mode, v)
	}
	limit := .07
	if name == "digits" {
		limit = .05
	}
	if mode == choose.AutoBalance && count == 50 && ece.value() > limit+3*ece.se() {
		t.Errorf("%s: calibration error %.3f, want at most %.2f", name, ece.value(), limit)
	}
	return size.value()
}

// TestNumberCoverage prints coverage and width of intervals: Plus (jackknife+), At, and a split-conformal baseline that
// trains on half of the labels.
func TestNumberCoverage(t *testing.T) {
	if *drawings == 0 {
		t.Skip("a study: make coverage")
	}
	fmt.Printf("%-12s %3s  %-14s %-14s %-14s (width in standard deviations of the label)\n", "table", "l", "plus", "at", "split")
	names := []string{"petal width", "proline", "grain"}
	if quick() {
		names = names[:2]
	}
	for _, name := range names {
		for _, count := range []int{40, 60} {
			numberCoverage(t, name, count)
		}
	}
}

func numberCoverage(t *testing.T, name string, count int) {
	l := get(t, name)
	ctx := context.Background()
	var cover, width [3]mean
	spreadAll := 0.0
	for _, v := range l.value {
		spreadAll += v / float64(l.n)
	}
	var sd mean
	for _, v := range l.value {
		sd.add((v - spreadAll) * (v - spreadAll))
	}
	unit := math.Sqrt(sd.value())
	for d := range fewer(name, 2) {
		r := rand.New(rand.NewPCG(uint64(d), uint64(1000+count)))
		at := l.draw(r, count)
		y := make([]float64, count)
		for k, v := range at {
			y[k] = l.value[v]
		}
		var shift float64
		for _, v := range y {
			shift += v / float64(count)
		}
		measures := make([][]float64, 0, count)
		schur, _, err := l.system(t, at).Harmonic(ctx, 1e-8, func(_ int, h [][]float64) error {
			for _, c := range h {
				measures = append(measures, slices.Clone(c))
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		field, square := make([]float64, l.n), make([]float64, l.n)
		for k, h := range measures {
			for v, t := range h {
				field[v] += t * (y[k] - shift)
				square[v] += t * (y[k] - shift) * (y[k] - shift)
			}
		}
		spread, err := trust.Spread(field, square)
		if err != nil {
			t.Fatal(err)
		}
		leftSpread, err := trust.LeftOutSpread(schur, y)
		if err != nil {
			t.Fatal(err)
		}
		residual := make([]float64, count)
		leftOut := make([]float64, count)
		for k := range y {
			for j := range y {
				residual[k] += schur.At(k, j) * y[j] / schur.At(k, k)
			}
			leftOut[k] = y[k] - residual[k]
		}
		iv, err := trust.NewIntervals(trust.NumberEvidence{Given: y, LeftOut: leftOut, Spread: leftSpread}, trust.IntervalSettings{Coverage: coverage})
		if err != nil {
			t.Fatal(err)
		}
		// Split conformal: half to train, half to set the width.
		half := r.Perm(count)
		slices.Sort(half[:count/2])
		var train []int32
		var values []float64
		for _, k := range half[:count/2] {
			train, values = append(train, at[k]), append(values, y[k])
		}
		split := make([]float64, l.n)
		if _, err := l.system(t, train).SolveDirichlet(ctx, [][]float64{values}, [][]float64{split}, 1e-8); err != nil {
			t.Fatal(err)
		}
		var miss []float64
		for _, k := range half[count/2:] {
			miss = append(miss, math.Abs(y[k]-split[at[k]]))
		}
		slices.Sort(miss)
		wide := miss[int(math.Ceil(coverage*float64(len(miss)+1)))-1]

		var low, high [3][]float64
		var truth []float64
		without := make([]float64, count)
		for _, v := range l.free(at) {
			for k := range without {
				without[k] = field[v] + shift - residual[k]*measures[k][v]
			}
			add := func(i int, lo, hi float64) { low[i], high[i] = append(low[i], lo), append(high[i], hi) }
			lo, hi := iv.Plus(without, spread[v], nil)
			add(0, lo, hi)
			lo, hi = iv.At(field[v]+shift, spread[v])
			add(1, lo, hi)
			add(2, split[v]-wide, split[v]+wide)
			truth = append(truth, l.value[v])
		}
		for i := range cover {
			c := trust.MeasureIntervals(low[i], high[i], truth)
			cover[i].add(c.Covered.Value)
			width[i].add(c.Size / unit)
		}
	}
	fmt.Printf("%-12s %3d ", name, count)
	for i := range cover {
		fmt.Printf(" %.3f w %5.2f  ", cover[i].value(), width[i].value())
	}
	fmt.Println()
	slack := chance(cover[0].n)
	for i := range 2 {
		if v := cover[i].value(); v < .87-slack || v > .93+slack {
			t.Errorf("%s, %d labels: intervals hold the truth at %.3f, want .87 to .93", name, count, v)
		}
	}
	if width[0].value() > width[2].value() {
		t.Errorf("%s, %d labels: width %.3f, split conformal %.3f", name, count, width[0].value(), width[2].value())
	}
}
